//! Numbers as engineers write them, and the rows of the table of entries.
