//! One file per topology; each reads like its schematic.

pub(super) mod boost;
pub(super) mod buck;
pub(super) mod buck_boost;
pub(super) mod cuk;
pub(super) mod flyback;
pub(super) mod sepic;
