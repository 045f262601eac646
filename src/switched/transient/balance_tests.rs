//! Charge and volt-second balance of the running converter, on random designs: what every steady period must give back it gives back.
//!
//! *Definition*: over a steady period the mean current into every capacitor and the mean voltage across every inductor are zero, so every
//! state ends where it began; where the current rests, it does so once in each period, and the rectifier conducts once.

use super::super::{Configuration, Goal, Orbit, Start};
use super::run::machine;
use super::tests::Case;
use super::*;
use proptest::prelude::*;

/// Values near the defaults, over a decade each.
fn near() -> impl Strategy<Value = [f64; 6]> {
    prop::array::uniform6(-0.5_f64..0.5)
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(300))]

    #[test]
    fn a_steady_period_gives_back_what_it_took(
        topology in prop::sample::select(vec!["buck", "boost", "buck-boost", "flyback"]),
        mode in prop::sample::select(vec!["voltage", "peak-current", "valley-current", "average-current"]),
        rectifier in prop::sample::select(vec!["synchronous", "diode", "emulated"]),
        at in near(),
    ) {
        let [l, c, load, esr, r2, c1] = at.map(|x: f64| 10_f64.powf(x));
        let output = if topology == "buck" { 3.3 } else { 24.0 };
        let case = Case::new(
            topology,
            &[("stage.rectifier", rectifier), ("control.mode", mode), ("compensator.type", "2")],
            &[
                ("stage.input.nominal", 12.0),
                ("stage.load.nominal", load),
                ("stage.inductor.inductance", 10e-6 * l),
                ("stage.bank.1.capacitance", 47e-6 * c),
                ("stage.bank.1.esr", 0.01 * esr),
                ("compensator.reference", 2.5),
                ("compensator.divider.upper", 10e3 * (output / 2.5 - 1.0)),
                ("compensator.divider.lower", 10e3),
                ("compensator.r2", 1e3 * r2),
                ("compensator.c1", 10e-9 * c1),
                ("compensator.c2", 1e-9),
            ],
        );
        // What a limit keeps from a steady period is no case here.
        let Ok(orbit) = Orbit::find(&case.system, Start::of(&case.point), Goal::AsDriven) else { return Ok(()) };
        let mut scenario = case.scenario(8);
        scenario.amplifiers = Amplifiers::default();
        scenario.start = (orbit.starts[0].clone(), orbit.phases.last().unwrap().configuration);
        let mut machine = machine(&case.system, &scenario);
        let resting = orbit.phases.iter().filter(|p| p.configuration == Configuration::Resting).count();
        for _ in 0..3 {
            let (before, _) = machine.state();
            let period = machine.period().unwrap();
            let (after, _) = machine.state();
            for (k, name) in case.system.state_names.iter().enumerate() {
                let scale = orbit.starts.iter().chain(&orbit.ends).map(|x| x[k].abs()).fold(0.0, f64::max);
                prop_assert!((after[k] - before[k]).abs() <= 1e-9 * scale, "{name}: {} {}", before[k], after[k]);
            }
            prop_assert!((period.duty - orbit.duty).abs() < 1e-9, "{} {}", period.duty, orbit.duty);
            prop_assert_eq!(period.rested, resting > 0);
            // The rectifier opens once where it opens at all; nothing else happens between clock and comparator.
            prop_assert_eq!(machine.changes, usize::from(resting > 0));
        }
    }
}
