//! The registry of topologies: one line each.

use super::drawing::Topology;
use super::topologies::{boost, buck, buck_boost};
use crate::quantity::ChoiceOption;

static REGISTRY: [&Topology; 3] = [&buck::TOPOLOGY, &boost::TOPOLOGY, &buck_boost::TOPOLOGY];

/// The topologies as options of a choice, in registry order.
pub(super) static OPTIONS: &[ChoiceOption] =
    &[option(&buck::TOPOLOGY), option(&boost::TOPOLOGY), option(&buck_boost::TOPOLOGY)];

const fn option(topology: &'static Topology) -> ChoiceOption {
    ChoiceOption { key: topology.key, name: topology.name, help: topology.line }
}

/// All topologies, in the order shown.
pub fn registry() -> &'static [&'static Topology] {
    &REGISTRY
}

/// The topology with this key.
pub fn find(key: &str) -> Option<&'static Topology> {
    registry().iter().copied().find(|topology| topology.key == key)
}
