//! Findings: what is wrong or remarkable about a design, how grave, at which entry, what would mend it.
