//! From wires and geometry to impedance and admittance matrices per metre.
