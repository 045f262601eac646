//! A checked design in, every result of its nine conditions out.
