//! Chooses between the window and the terminal.
fn main() {}
