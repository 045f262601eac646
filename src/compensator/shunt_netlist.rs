//! The netlist of isolated feedback: regulator with its network, LED and its resistors, optocoupler, pull-up.

use super::netlist::{Driven, FAST, ValuedNetlist};
use super::network::{Compensator, Kind, Part};
use super::shunt::{LedSupply, ShuntRegulator};
use crate::circuit::Node;

/// Inputs that hold still: fixed supply of the LED, its drop, supply of the pull-up.
const LED_SUPPLY: &str = "led supply";
const LED_DROP: &str = "led drop";
const SUPPLY: &str = "supply";

impl Compensator {
    /// Fits regulator, LED, optocoupler and pull-up between reference, tap of the divider and control voltage: reads like the
    /// schematic. Gives where regulator and transistor drive it.
    pub(super) fn fit_isolated(
        &self,
        regulator: &ShuntRegulator,
        circuit: &mut ValuedNetlist,
        [vref, tap, vc]: [Node; 3],
    ) -> Driven {
        let ground = circuit.netlist.ground();
        let [feed, anode, cathode, supply] =
            ["feed", "anode", "cathode", "supply"].map(|name| circuit.netlist.node(name));
        circuit.source(if regulator.has_fast_path() { FAST } else { LED_SUPPLY }, feed, ground);
        circuit.source(SUPPLY, supply, ground);
        let node = circuit.buffered("shunt", (regulator.dc_gain, regulator.gain_bandwidth_hz), [vref, tap, cathode]);
        self.fit_slow_path(circuit, cathode, tap);
        circuit.fit(self, Part::Led, feed, anode);
        if self.has(Part::C3) {
            self.fit_branch(circuit, feed, anode);
        }
        circuit.fit(self, Part::Bias, anode, cathode);
        let junction = circuit.netlist.node("junction");
        let resistance = circuit.slot("opto.led-resistance", regulator.led_resistance);
        let led = circuit.netlist.resistor("opto.led", anode, junction, resistance);
        circuit.source(LED_DROP, junction, cathode);
        let ratio = circuit.slot("opto.transfer-ratio", regulator.ratio());
        let transistor = circuit.netlist.copied_current("opto.transistor", vc, ground, ratio, led);
        let own = circuit.slot("opto.capacitance", regulator.capacitance);
        circuit.netlist.capacitor("opto.capacitance", vc, ground, own);
        circuit.fit(self, Part::PullUp, supply, vc);
        if self.kind != Kind::One {
            circuit.fit(self, Part::C2, vc, ground);
        }
        Driven { node, transistor: Some((transistor, vc)) }
    }

    /// C1, with R2 in series where one is fitted, from the cathode back to the tap.
    fn fit_slow_path(&self, circuit: &mut ValuedNetlist, cathode: Node, tap: Node) {
        let mut from = cathode;
        if self.has(Part::R2) {
            from = circuit.netlist.node("r2-c1");
            circuit.fit(self, Part::R2, cathode, from);
        }
        circuit.fit(self, Part::C1, from, tap);
    }

    /// Inputs of the state equations that hold still, with their values: the reference, and the constants of isolated feedback.
    pub fn steady_inputs(&self) -> Vec<(&'static str, f64)> {
        let mut inputs = vec![("vref", self.reference)];
        if let Some(regulator) = self.isolated() {
            inputs.extend([(SUPPLY, regulator.supply), (LED_DROP, regulator.led_drop)]);
            if let LedSupply::Fixed(volts) = regulator.led_supply {
                inputs.push((LED_SUPPLY, volts));
            }
        }
        inputs
    }
}
