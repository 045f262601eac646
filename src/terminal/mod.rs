//! The command line: the same results as text and JSON.
