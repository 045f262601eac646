//! The registry of topologies: one line each.

use super::topologies::{boost, buck, buck_boost, cuk, flyback, sepic};
use super::topologies::{forward, four_switch, full_bridge, half_bridge, push_pull};
use super::topology::Topology;
use crate::quantity::ChoiceOption;

/// All topologies, in the order shown.
#[rustfmt::skip]
static REGISTRY: &[&Topology] = &[
    &buck::TOPOLOGY,
    &boost::TOPOLOGY,
    &buck_boost::TOPOLOGY,
    &four_switch::TOPOLOGY,
    &sepic::TOPOLOGY,
    &cuk::TOPOLOGY,
    &flyback::TOPOLOGY,
    &forward::TOPOLOGY,
    &push_pull::TOPOLOGY,
    &half_bridge::TOPOLOGY,
    &full_bridge::TOPOLOGY,
];

const COUNT: usize = REGISTRY.len();

/// The topologies as options of a choice, in registry order.
pub(super) static OPTIONS: [ChoiceOption; COUNT] = {
    let mut options = [ChoiceOption { key: "", name: "", help: "" }; COUNT];
    let mut k = 0;
    while k < COUNT {
        let topology = REGISTRY[k];
        options[k] = ChoiceOption { key: topology.key, name: topology.name, help: topology.line };
        k += 1;
    }
    options
};

/// All topologies, in the order shown.
pub fn registry() -> &'static [&'static Topology] {
    REGISTRY
}

/// The topology with this key.
pub fn find(key: &str) -> Option<&'static Topology> {
    registry().iter().copied().find(|topology| topology.key == key)
}
