//! Command line of fourwire.

fn main() {}
