//! Tests of the closed loop in time.

use super::super::{Cancel, Closing, Configuration, Driven, Joined, Progress, Rule, SwitchedSystem};
use super::*;
use crate::compensator::{Compensator, Limited};
use crate::control::{ControlLaw, Mode};
use crate::converter::{OperatingPoint, Stage, StageCondition};
use crate::quantity::{Choices, Values};
use nalgebra::DVector;

/// A closed loop at its nominal condition.
struct Case {
    system: SwitchedSystem,
    outer: Limited,
    inner: Option<Limited>,
    point: OperatingPoint,
    reference: f64,
    nothing: (usize, f64),
}

impl Case {
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
        values.set("stage.output.voltage", compensator.dc_output_voltage()).unwrap();
        let law = ControlLaw::from_values(&values, &choices).unwrap();
        let stage = Stage::from_values(&values, &choices).unwrap();
        let condition = StageCondition {
            input_voltage: stage.input_voltages[1],
            load_current: stage.load_currents[1],
            output_voltage: stage.output_voltage,
        };
        let point = stage.averaged(&condition).unwrap().operating_point;
        let law = law.settled(&point, stage.switching_frequency.recip());
        let outer = compensator.limited().unwrap();
        let inner = match &law.mode {
            Mode::Average(average) => Some(average.inner.limited().unwrap()),
            _ => None,
        };
        let driven = Driven::Loop(Closing::new(&outer.space, compensator.reference));
        let system = SwitchedSystem::at_point(&Joined { stage: &stage, law: &law, driven }, &point).unwrap();
        let Rule::Compared(comparator) = &system.rule else { panic!("a comparator") };
        let nothing = match &law.mode {
            Mode::Current(_, sense) => (system.places.control_voltage, sense.offset),
            _ => (system.places.compared, comparator.valley_v),
        };
        Case { system, outer, inner, point, reference: compensator.reference, nothing }
    }

    fn scenario(&self, periods: usize) -> Scenario<'_> {
        let places = &self.system.places;
        Scenario {
            amplifiers: Amplifiers {
                outer: &self.outer.limits,
                inner: self.inner.as_ref().map_or(&[], |inner| &inner.limits),
            },
            input_voltage: Signal::constant(self.point.input_voltage),
            reference: Signal::constant(self.reference),
            sink: Signal::constant(0.0),
            load: Load::AsItStands,
            load_voltage: self.point.load_voltage,
            current_limit: None,
            nothing: Some(self.nothing),
            from_s: 0.0,
            to_s: periods as f64 * self.system.period_s,
            start: (DVector::zeros(self.system.order()), Configuration::Freewheeling),
            columns: 1000,
            recorded: vec![places.load_voltage, places.control_voltage, places.inductor_currents[0]],
            times_s: Vec::new(),
        }
    }

    fn run(&self, scenario: &Scenario<'_>) -> Run {
        simulate(&self.system, scenario, &Cancel::new(), &Progress::new(), &mut |_| {})
    }
}

#[test]
fn starts_from_zero_and_comes_to_the_operating_point() {
    for mode in ["voltage", "peak-current", "valley-current", "average-current"] {
        let case = Case::new("boost", &[("control.mode", mode)], &[]);
        let begun = std::time::Instant::now();
        let run = case.run(&case.scenario(5000));
        eprintln!("{mode}: {:?} {:?}", begun.elapsed(), run.stopped);
        eprintln!(
            "{:?} {:?} {:?}",
            run.limited,
            run.extremes,
            run.cycles.iter().step_by(500).map(|c| (c.mean_v, c.duty)).collect::<Vec<_>>()
        );
        eprintln!("{} {}", case.point.load_voltage, case.point.duty);
    }
}
