//! The registry of topologies: one line each.

use super::topologies;
use super::topology::Topology;
use crate::quantity::{ChoiceOption, Choices, Values};

/// All topologies, in the order shown.
#[rustfmt::skip]
static REGISTRY: &[&Topology] = &[
    &topologies::buck::TOPOLOGY,
    &topologies::boost::TOPOLOGY,
    &topologies::buck_boost::TOPOLOGY,
    &topologies::four_switch::TOPOLOGY,
    &topologies::sepic::TOPOLOGY,
    &topologies::cuk::TOPOLOGY,
    &topologies::flyback::TOPOLOGY,
    &topologies::forward::TOPOLOGY,
    &topologies::push_pull::TOPOLOGY,
    &topologies::half_bridge::TOPOLOGY,
    &topologies::full_bridge::TOPOLOGY,
    #[cfg(test)] &super::made_up::TOPOLOGY,
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

/// Frequency of the pulses of the stage that these values and choices describe [Hz]: of each switch, times the switches that take turns.
/// None without a usable one.
pub fn pulse_frequency(values: &Values, choices: &Choices) -> Option<f64> {
    let pulses = choices.get("stage.topology").and_then(find).map_or(1, |topology| topology.pulses);
    let frequency = values.get("stage.switching-frequency")? * f64::from(pulses);
    (frequency.is_finite() && frequency > 0.0).then_some(frequency)
}

/// The topology with this key.
pub fn find(key: &str) -> Option<&'static Topology> {
    registry().iter().copied().find(|topology| topology.key == key)
}
