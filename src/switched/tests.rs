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
