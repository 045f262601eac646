//! Tests of the switched system: what every topology in the registry must give, under every law.

use super::*;
use crate::compensator::Compensator;
use crate::control::ControlLaw;
use crate::converter::{Conduction, OperatingPoint, Stage, StageCondition, registry};
use crate::quantity::{Choices, Values};
use nalgebra::{DMatrix, DVector};

/// The keys of the control modes.
const MODES: [&str; 4] = ["voltage", "peak-current", "valley-current", "average-current"];

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
        let point = stage.averaged(&condition).unwrap().operating_point;
        law = law.settled(&point, stage.switching_frequency.recip());
        Case { stage, law, compensator, point }
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
            // The compensator hangs on the stage, so the stage's own rest is that of the joint equations.
            let x: DVector<f64> = a.lu().solve(&-(b * &system.steady_inputs)).unwrap();
            let outputs = c * x + d * &system.steady_inputs;
            let output = outputs[system.places.output_voltage];
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
