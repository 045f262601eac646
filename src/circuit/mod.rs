//! Ideal parts, netlists, and the state equations of a netlist for one set of closed switches.
