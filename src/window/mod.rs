//! The desktop window: shows an analysis, edits a design, computes no electronics.
