//! Checks against published and independently computed values, one module per room.

mod compensator;
