//! Where the amplifier's limits act: the network's equations with the forces by which limits hold it.
//!
//! *Model.* A limit acts by an input that is zero while nothing is limited. A voltage that cannot pass a level is held there by a
//! current into its node, until the drive turns inward: an op amp at the node ahead of its buffer, so nothing winds up inside it; a
//! transconductance amplifier at its output. A transconductance amplifier's current saturates: what is missing of gm times the error
//! comes from that input. A shunt regulator's cathode is held like an op amp's output, above its least voltage; the optocoupler's transistor
//! cannot give current, so a dark LED saturates it at none, and its collector is held above saturation.

use super::netlist::{NetworkError, ValuedNetlist};
use super::network::{Amplifier, Compensator};
use super::shunt::ShuntRegulator;
use crate::circuit::{Compiled, Node, PartId};
use crate::linear::StateSpace;

/// How a limit acts.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum LimitKind {
    /// The signal, a state, is held at the limit by the force until its own drive turns inward.
    Hold,
    /// The signal enters where the force does; the force makes up the difference between the signal and the limit.
    Saturate,
}

/// A limit of the network.
#[derive(Clone, Debug, PartialEq)]
pub struct Limit {
    /// How it acts.
    pub kind: LimitKind,
    /// What is limited, for people.
    pub name: &'static str,
    /// Output that is limited.
    pub signal: &'static str,
    /// Input by which the limit acts.
    pub force: &'static str,
    /// Least value of the signal; may be infinite.
    pub least: f64,
    /// Greatest value of the signal; may be infinite.
    pub greatest: f64,
}

/// The network with its limits.
#[derive(Clone, Debug)]
pub struct Limited {
    /// Over the states of [`Compensator::state_space`]: its inputs and the forces; outputs `vc`, `error` and what is limited.
    pub space: StateSpace,
    /// The limits, saturating ones first.
    pub limits: Vec<Limit>,
}

/// Input by which the limits act [A].
const FORCE: &str = "amplifier force";
/// Current of a transconductance amplifier if nothing limited it [A].
const DRIVE: &str = "amplifier current";
/// Input by which the limits of an optocoupler's transistor act [A].
const COLLECTOR_FORCE: &str = "collector force";
/// Cathode voltage of a shunt regulator [V].
const CATHODE: &str = "cathode voltage";
/// Current that the transistor gives into its collector's node, never above zero [A].
const COLLECTOR: &str = "transistor current";

impl Compensator {
    /// The network with the limits of its amplifier.
    ///
    /// # Errors
    /// As [`Compensator::state_space`].
    pub fn limited(&self) -> Result<Limited, NetworkError> {
        if self.digital().is_some() {
            return Err(NetworkError::Sampled);
        }
        let (mut circuit, driven) = self.drawn();
        if let (Some(regulator), Some(transistor)) = (self.isolated(), driven.transistor) {
            return isolated(circuit, regulator, driven.node, transistor);
        }
        let driven = driven.node;
        let (ground, force) = (circuit.netlist.ground(), circuit.netlist.input(FORCE));
        circuit.netlist.current_source(FORCE, ground, driven, force);
        let compiled = Compiled::new(&circuit.netlist, |_| true, &circuit.values)?;
        let (e, _) = compiled.equations(&circuit.values)?.independent();
        let (least, greatest) = self.output_limits();
        let mut limits = vec![Limit {
            kind: LimitKind::Hold,
            name: "amplifier output",
            signal: "vc",
            force: FORCE,
            least,
            greatest,
        }];
        // The last row, unused by an op amp, is the error's again.
        let mut gain = 1.0;
        if let Amplifier::Transconductance(amplifier) = self.amplifier {
            gain = amplifier.gm;
            let most = amplifier.output_current;
            let name = "amplifier current";
            let current =
                Limit { kind: LimitKind::Saturate, name, signal: DRIVE, force: FORCE, least: -most, greatest: most };
            limits.insert(0, current);
        }
        let outputs = e.c.nrows();
        let error = outputs.saturating_sub(1);
        let extended = |m: &nalgebra::DMatrix<f64>| {
            let mut rows = m.clone().resize_vertically(outputs + 1, 0.0);
            let row = m.row(error) * gain;
            rows.row_mut(outputs).copy_from(&row);
            rows
        };
        let (c, d) = (extended(&e.c), extended(&e.d));
        let space = StateSpace::new(e.a, e.b, c, d, &["vout", "vref", FORCE], &["vc", "error", DRIVE])?;
        Ok(Limited { space, limits })
    }
}

/// The network of isolated feedback with the limits of regulator and transistor.
fn isolated(
    mut circuit: ValuedNetlist,
    regulator: &ShuntRegulator,
    cathode: Node,
    (transistor, collector): (PartId, Node),
) -> Result<Limited, NetworkError> {
    let netlist = &mut circuit.netlist;
    let ground = netlist.ground();
    for (name, node) in [(FORCE, cathode), (COLLECTOR_FORCE, collector)] {
        let force = netlist.input(name);
        netlist.current_source(name, ground, node, force);
    }
    netlist.voltage_output(CATHODE, cathode, ground);
    let row = netlist.current_output(COLLECTOR, transistor).index();
    let compiled = Compiled::new(&circuit.netlist, |_| true, &circuit.values)?;
    let (mut e, _) = compiled.equations(&circuit.values)?.independent();
    // Counted into the collector's node, as the force is.
    e.c.row_mut(row).neg_mut();
    e.d.row_mut(row).neg_mut();
    let inputs: Vec<&str> = circuit.netlist.input_names().iter().map(String::as_str).collect();
    let space = StateSpace::new(e.a, e.b, e.c, e.d, &inputs, &["vc", "error", CATHODE, COLLECTOR])?;
    let limit = |kind, name, signal, force, least, greatest| Limit { kind, name, signal, force, least, greatest };
    let limits = vec![
        limit(LimitKind::Saturate, "LED dark", COLLECTOR, COLLECTOR_FORCE, f64::NEG_INFINITY, 0.0),
        limit(LimitKind::Hold, "regulator", CATHODE, FORCE, regulator.least_voltage, f64::INFINITY),
        limit(LimitKind::Hold, "optocoupler saturated", "vc", COLLECTOR_FORCE, regulator.saturation, f64::INFINITY),
    ];
    Ok(Limited { space, limits })
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::quantity::{Choices, Values};

    /// The same with isolated feedback: forces add to the linear network, the cathode is a state, and a dark LED's current comes back.
    #[test]
    fn limits_of_isolated_feedback() {
        for (kind, fast) in [("1", "none"), ("2", "load"), ("3", "none")] {
            let mut choices = Choices::new();
            for (path, key) in [
                ("compensator.amplifier", "shunt-regulator"),
                ("compensator.type", kind),
                ("compensator.opto.fast-path", fast),
            ] {
                choices.set(path, key);
            }
            let compensator = Compensator::from_values(&Values::new(), &choices).unwrap();
            let (plain, limited) = (compensator.state_space().unwrap(), compensator.limited().unwrap());
            assert_eq!(plain.a, limited.space.a);
            assert_eq!(plain.inputs[..], limited.space.inputs[..plain.inputs.len()]);
            for limit in limited.limits.iter().filter(|limit| limit.kind == LimitKind::Hold) {
                let (row, column) =
                    (limited.space.output(limit.signal).unwrap(), limited.space.input(limit.force).unwrap());
                assert!((limited.space.c.row(row) * limited.space.b.column(column))[0] > 0.0, "{}", limit.name);
                assert!(limited.space.d.row(row).iter().all(|d| d.abs() < 1e-12));
            }
            // A force of what the transistor lacks moves its collector as that current would.
            let (dark, vc) = (limited.space.output(COLLECTOR).unwrap(), limited.space.input(COLLECTOR_FORCE).unwrap());
            assert!(limited.space.d[(dark, vc)].abs() < 1e-12);
        }
    }

    /// Definition: without forces the network is the linear one, and a force moves the limited voltage at once.
    #[test]
    fn limits_are_added_to_the_same_network() {
        for amplifier in ["op-amp", "transconductance"] {
            for kind in ["1", "2", "3"] {
                for feedforward in ["none", "fitted"] {
                    let mut choices = Choices::new();
                    choices.set("compensator.amplifier", amplifier);
                    choices.set("compensator.type", kind);
                    choices.set("compensator.feedforward-capacitor", feedforward);
                    let compensator = Compensator::from_values(&Values::new(), &choices).unwrap();
                    let (plain, limited) = (compensator.state_space().unwrap(), compensator.limited().unwrap());
                    assert_eq!(plain.a, limited.space.a, "{amplifier} {kind} {feedforward}");
                    assert_eq!(plain.c, limited.space.c.rows(0, 2).into_owned());
                    assert_eq!(plain.b, limited.space.b.columns(0, 2).into_owned());
                    let hold = limited.limits.last().unwrap();
                    assert_eq!((hold.kind, hold.signal), (LimitKind::Hold, "vc"));
                    let moved = (limited.space.c.row(0) * limited.space.b.column(2))[0];
                    assert!(moved > 0.0, "{amplifier} {kind} {feedforward}: {moved}");
                    assert!(limited.space.d.row(0).iter().all(|d| d.abs() < 1e-12), "{}", limited.space.d);
                }
            }
        }
    }
}
