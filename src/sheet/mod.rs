//! What leaves the program: pictures, tables, curves.
