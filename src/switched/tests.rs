//! Tests of the switched system: what every topology in the registry must give, under every law.

use super::*;
use crate::compensator::Compensator;
use crate::control::ControlLaw;
use crate::converter::{Conduction, OperatingPoint, Stage, StageCondition, registry};
use crate::quantity::{Choices, Values};
use nalgebra::{DMatrix, DVector};

/// The keys of the control modes.
const MODES: [&str; 4] = ["voltage", "peak-current", "valley-current", "average-current"];

/// The state that is set back as a period ends.
const MAGNETISING: &str = "magnetising current";

/// What a switched system is made of, at the nominal condition.
struct Case {
    stage: Stage,
    law: ControlLaw,
    compensator: Compensator,
    point: OperatingPoint,
}

impl Case {
    /// A topology with every entry at its default but these.
    fn new(topology: &str, chosen: &[(&str, &str)], entries: &[(&str, f64)]) -> Self {
        Self::try_new(topology, chosen, entries).unwrap()
    }

    /// The same; none where the stage has no operating point.
    fn try_new(topology: &str, chosen: &[(&str, &str)], entries: &[(&str, f64)]) -> Option<Self> {
        let (mut values, mut choices) = (Values::new(), Choices::new());
        choices.set("stage.topology", topology);
        for (path, key) in chosen {
            choices.set(path, key);
        }
        for (path, value) in entries {
            values.set(path, *value).unwrap();
        }
        let compensator = Compensator::from_values(&values, &choices).unwrap();
        let mut law = ControlLaw::from_values(&values, &choices).unwrap();
        let stage = Stage::from_values(&values, &choices).unwrap();
        let condition = StageCondition {
            input_voltage: stage.input_voltages[1],
            load_current: stage.load_currents[1],
            output_voltage: stage.output_voltage,
        };
        let point = stage.averaged(&condition).ok()?.operating_point;
        law = law.settled(&point, stage.switching_frequency.recip());
        Some(Case { stage, law, compensator, point })
    }

    fn open(&self) -> SwitchedSystem {
        let driven = Driven::Voltage(0.0);
        SwitchedSystem::at_point(&Joined { stage: &self.stage, law: &self.law, driven }, &self.point).unwrap()
    }

    fn system(&self) -> SwitchedSystem {
        let space = self.compensator.state_space().unwrap();
        let driven = Driven::Loop(Closing::new(&space, self.compensator.reference));
        SwitchedSystem::at_point(&Joined { stage: &self.stage, law: &self.law, driven }, &self.point).unwrap()
    }
}

/// Numbers drawn by a multiplicative congruence (Park & Miller, from memory): alike in every run.
struct Draw(u64);

impl Draw {
    fn between(&mut self, low: f64, high: f64) -> f64 {
        self.0 = self.0 * 48_271 % 2_147_483_647;
        low * (high / low).powf(self.0 as f64 / 2_147_483_647.0)
    }
}

/// An output voltage that a topology reaches from its default inputs.
fn reachable(topology: &crate::converter::Topology) -> f64 {
    match topology.reach {
        crate::converter::Reach::BelowInput => 3.3,
        _ => 24.0,
    }
}

/// Two routes: the configurations' equations, weighted by their shares of the period, rest where the averaged stage does and give
/// its output.
#[test]
fn every_topology_under_every_law_rests_on_average_at_its_operating_point() {
    for topology in registry() {
        for mode in MODES {
            let case = Case::new(
                topology.key,
                &[("control.mode", mode), ("stage.rectifier", "synchronous")],
                &[("stage.output.voltage", reachable(topology))],
            );
            let system = case.system();
            assert_ne!(case.point.conduction, Conduction::Discontinuous);
            let (n, m) = (system.order(), system.input_names.len());
            let shares = [case.point.duty, 1.0 - case.point.duty, 0.0];
            let mix = |part: fn(&Piece) -> &DMatrix<f64>| {
                system.pieces.iter().zip(shares).map(|(piece, share)| part(piece) * share).reduce(|a, b| a + b).unwrap()
            };
            let (a, b, c, d) = (mix(|p| &p.a), mix(|p| &p.b), mix(|p| &p.c), mix(|p| &p.d));
            assert_eq!((a.shape(), b.shape()), ((n, n), (n, m)));
            assert_eq!((c.shape(), d.shape()), ((system.probes.len(), n), (system.probes.len(), m)));
            // A magnetising current is set back as the period ends, not by its equations; nothing here depends on it.
            let mut a = a;
            if let Some(k) = system.state_names.iter().position(|name| name == MAGNETISING) {
                a[(k, k)] = -1.0;
            }
            // The compensator hangs on the stage, so the stage's own rest is that of the joint equations.
            let x: DVector<f64> = a.lu().solve(&-(b * &system.steady_inputs)).unwrap();
            let outputs = c * x + d * &system.steady_inputs;
            let output = outputs[system.places.stage.output_voltage];
            assert!((output / case.point.output_voltage - 1.0).abs() < 1e-6, "{} {mode}: {output}", topology.key);
            let current = outputs[system.places.switched_current];
            assert!(
                (current / case.point.switched_current.average - 1.0).abs() < 1e-6,
                "{} {mode}: {current}",
                topology.key
            );
            assert!(system.state_names.iter().all(|name| !name.is_empty()));
        }
    }
}

/// Definition: the orbit's states repeat, its comparator trips, and charge and volt-seconds balance: a mean capacitor current of
/// nothing, a mean output as wanted.
#[test]
fn every_topology_under_every_law_has_its_orbit() {
    for topology in registry() {
        for (mode, rectifier, load) in MODES
            .iter()
            .flat_map(|mode| ["synchronous", "diode"].map(|rectifier| (*mode, rectifier)))
            .flat_map(|(mode, rectifier)| [2.0, 0.05].map(|load| (mode, rectifier, load)))
        {
            let entries = [
                ("stage.output.voltage", reachable(topology)),
                ("stage.load.least", load),
                ("stage.load.nominal", load),
                ("stage.load.greatest", load),
                // Little ripple at the comparator.
                ("compensator.r2", 100.0),
                ("compensator.r3", 1e6),
            ];
            let case = Case::new(topology.key, &[("control.mode", mode), ("stage.rectifier", rectifier)], &entries);
            let what = format!("{} {mode} {rectifier} {load} A", topology.key);
            let system = case.open();
            let goal = Goal::Output(case.point.output_voltage);
            let orbit = Orbit::find(&system, Start::of(&case.point), goal).unwrap_or_else(|f| panic!("{what}: {f:?}"));
            assert_eq!(orbit.conduction, case.point.conduction, "{what}");
            assert!((orbit.duty / case.point.duty - 1.0).abs() < 0.02, "{what}: {}", orbit.duty);
        }
    }
}

/// Conservation: over a steady period every capacitor's charge and every inductor's volt-seconds balance, as the integral of all
/// rates shows beside the sum of what it is made of; on designs drawn at random, loop closed.
#[test]
fn charge_and_volt_seconds_balance_on_random_designs() {
    let mut draw = Draw(7);
    let mut found = 0;
    for topology in registry() {
        for k in 0..40 {
            let mode = MODES[k % 4];
            let output = reachable(topology) * draw.between(0.8, 1.2);
            let entries = [
                ("stage.output.voltage", output),
                ("stage.load.nominal", draw.between(0.02, 3.0)),
                ("stage.inductor.inductance", draw.between(2e-6, 40e-6)),
                ("stage.bank.1.capacitance", draw.between(20e-6, 500e-6)),
                ("stage.bank.1.esr", draw.between(1e-3, 20e-3)),
                ("compensator.divider.upper", 10e3 * (output / 2.5 - 1.0)),
                ("compensator.divider.lower", 10e3),
                ("compensator.reference", 2.5),
                ("compensator.r2", draw.between(500.0, 5e3)),
                ("control.ramp.amplitude", draw.between(1.0, 3.0)),
            ];
            let rectifier = ["diode", "synchronous", "emulated"][k % 3];
            let chosen = [("control.mode", mode), ("stage.rectifier", rectifier), ("compensator.type", "2")];
            let Some(case) = Case::try_new(topology.key, &chosen, &entries) else { continue };
            let Ok(orbit) = Orbit::find(&case.system(), Start::of(&case.point), Goal::AsDriven) else { continue };
            found += 1;
            let n = orbit.system.order();
            let (mut net, mut gross) = (DVector::zeros(n), DVector::zeros(n));
            for (phase, start) in orbit.phases.iter().zip(&orbit.starts) {
                let piece = orbit.system.piece(phase.configuration);
                let integral = orbit.integral(phase.length_s, piece, start).unwrap();
                let inputs = &orbit.inputs * phase.length_s;
                net += &piece.a * &integral + &piece.b * &inputs;
                gross += piece.a.abs() * integral.abs() + piece.b.abs() * inputs.abs();
            }
            // A core is reset by its winding, outside the equations.
            let balanced = orbit.system.state_names.iter().enumerate().filter(|(_, name)| *name != MAGNETISING);
            for (state, name) in balanced {
                let off = net[state].abs() / gross[state];
                assert!(off < 1e-9, "{} {mode}: {name} is off by {off:e}", topology.key);
            }
            let figures = orbit.figures().unwrap();
            for row in &orbit.system.places.stage.branch_currents {
                let current = figures[*row];
                assert!(current.mean.abs() < 1e-9 * current.peak(), "{} {mode}: {current:?}", topology.key);
            }
        }
    }
    assert!(found >= 60, "only {found} designs have an orbit");
}

/// Two routes: a linear compensator turns an injection at its input into one at its output, so the loop gain is the same read at either.
#[test]
fn the_loop_gain_is_the_same_at_either_end_of_the_compensator() {
    for topology in registry() {
        for mode in MODES {
            let output = reachable(topology);
            let entries = [
                ("stage.output.voltage", output),
                ("compensator.divider.upper", 10e3 * (output / 2.5 - 1.0)),
                ("compensator.divider.lower", 10e3),
                ("compensator.reference", 2.5),
                ("compensator.r2", 1e3),
            ];
            let chosen = [("control.mode", mode), ("compensator.type", "2")];
            let Some(case) = Case::try_new(topology.key, &chosen, &entries) else { continue };
            let Ok(orbit) = Orbit::find(&case.system(), Start::of(&case.point), Goal::AsDriven) else { continue };
            let response = Response::new(orbit).unwrap();
            let fs = response.orbit().system.period_s.recip();
            let mut behind = Reader::new(&response, Quantity::LoopGain).unwrap();
            let ahead =
                response.reading(inputs::INJECTED, &[response.orbit().system.places.stage.output_voltage]).unwrap();
            for share in [1e-3, 0.03, 0.31, 0.77, 1.7] {
                let returned = ahead.values(share * fs).unwrap()[0];
                let (first, second) = (-returned / (1.0 + returned), behind.at(share * fs).unwrap());
                let error = (first - second).norm() / second.norm();
                assert!(error < 1e-8, "{} {mode} at {share} fs: {first} and {second}", topology.key);
                // Definition: Lf/(1 + Ls − Lf).
                if let Some(both) = behind.sampled_loop(share * fs) {
                    let error = (both.read() - second).norm() / second.norm();
                    assert!(error < 1e-8, "{} {mode} at {share} fs: {both:?}", topology.key);
                }
            }
        }
    }
}
