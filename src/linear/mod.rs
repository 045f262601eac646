//! Linear systems: state space, zeros-poles-gain, margins, stability, exact time response.
