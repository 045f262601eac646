//! Tests of the closed loop in time.

use super::super::{Cancel, Closing, Configuration, Driven, Joined, Progress, Rule, SwitchedSystem};
use super::*;
use crate::compensator::{Compensator, Limited};
use crate::control::{ControlLaw, Mode};
use crate::converter::{OperatingPoint, Stage, StageCondition};
use crate::quantity::{Choices, Values};
use nalgebra::DVector;

/// A closed loop at its nominal condition.
pub(super) struct Case {
    pub(super) system: SwitchedSystem,
    outer: Limited,
    inner: Option<Limited>,
    pub(super) point: OperatingPoint,
    reference: f64,
    nothing: (usize, f64),
}

impl Case {
    pub(super) fn new(topology: &str, chosen: &[(&str, &str)], entries: &[(&str, f64)]) -> Self {
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

    pub(super) fn scenario(&self, periods: usize) -> Scenario<'_> {
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
            recorded: vec![places.stage.load_voltage, places.control_voltage, places.inductor_currents[0]],
            times_s: Vec::new(),
        }
    }

    fn run(&self, scenario: &Scenario<'_>) -> Run {
        simulate(&self.system, scenario, &Cancel::new(), &Progress::new(), &mut |_| {})
    }
}

/// A boost whose loop is closed well.
const BOOST: [(&str, f64); 12] = [
    ("stage.bank.1.capacitance", 33e-6),
    ("stage.bank.1.count", 5.0),
    ("stage.bank.1.esr", 18e-3),
    ("control.ramp.valley", 0.3),
    ("compensator.reference", 1.2),
    ("compensator.divider.upper", 38.3e3),
    ("compensator.divider.lower", 2.02e3),
    ("compensator.r2", 2.32e3),
    ("compensator.c1", 56e-9),
    ("compensator.c2", 470e-12),
    ("compensator.r3", 845.0),
    ("compensator.c3", 3.3e-9),
];

/// Two routes: from zero the switched loop comes to the averaged operating point, and stays there to rounding.
#[test]
fn starts_from_zero_and_comes_to_the_operating_point() {
    let case = Case::new("boost", &[], &BOOST);
    let run = case.run(&case.scenario(3000));
    assert!(run.stopped.is_none() && !run.cancelled);
    let [.., before, last] = run.cycles[..] else { panic!("periods") };
    assert!((last.mean_v - before.mean_v).abs() < 1e-10 * last.mean_v, "{before:?} {last:?}");
    assert!((last.mean_v - case.point.load_voltage).abs() < 2e-3 * last.mean_v, "{last:?}");
    assert!((last.duty - case.point.duty).abs() < 2e-3, "{last:?} {}", case.point.duty);
    assert!(run.limited.iter().any(|(name, _)| *name == "amplifier output"), "{:?}", run.limited);
    // The amplifier never left its limits by more than rounding.
    assert!(run.extremes[1].0 > 0.05 - 1e-9 && run.extremes[1].1 < 4.5 + 1e-9, "{:?}", run.extremes[1]);
}

/// The cancel flag is read at least every thousand periods: counted by the periods run after it.
#[test]
fn a_cancelled_run_ends_within_a_thousand_periods() {
    let case = Case::new("boost", &[], &BOOST);
    let cancel = Cancel::new();
    let mut shown_at = None;
    let run = simulate(&case.system, &case.scenario(1_000_000), &cancel, &Progress::new(), &mut |waveforms| {
        cancel.cancel();
        shown_at.get_or_insert(waveforms.filled);
    });
    assert!(run.cancelled);
    // It is shown first after a thirtieth of the run.
    assert!(run.cycles.len() <= 1_000_000 / 30 + 1000, "{}", run.cycles.len());
    assert!(shown_at.is_some_and(|filled| filled > 0 && filled <= run.waveforms.filled));
}
