//! Tables of wires and cables with the source of every row; lookup that forgives spelling.
