//! One file per topology; each reads like its schematic.

pub(super) mod boost;
pub(super) mod buck;
pub(super) mod buck_boost;
pub(super) mod cuk;
pub(super) mod flyback;
pub(super) mod forward;
pub(super) mod four_switch;
pub(super) mod full_bridge;
pub(super) mod half_bridge;
pub(super) mod push_pull;
pub(super) mod sepic;
