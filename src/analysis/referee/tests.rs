//! The referee on whole designs: definitions, what every sample must give, and what must be remarked.

use super::*;
use crate::analysis::{Level, Request, Shown, analyse};
use crate::design::{CheckedDesign, sample};
use crate::finding::Severity;

const NOMINAL: Shown = Shown::Levels(Level::Nominal, Level::Nominal);

fn request(design: &CheckedDesign, frequencies_hz: &[f64]) -> Request {
    Request {
        frequencies_hz: frequencies_hz.to_vec(),
        ..Request::spanning(NOMINAL, design.stage.switching_frequency, 20)
    }
}

/// The result, where the exact side follows what a sample is made of; else the reason names what it does not follow.
fn told<T>(file: &str, result: Result<T, crate::finding::Finding>) -> Option<T> {
    let refused = |message: &str| message.contains("difference equation");
    match result {
        Ok(found) => Some(found),
        Err(why) if refused(&why.message) => None,
        Err(why) => panic!("{file}: {why}"),
    }
}

/// Definitions, on every sample: at each crossover the curve reads 0 dB and its phase is the margin less 180°; at each phase crossing it
/// reads the gain margin; the greatest multiplier decides; the reach lies where the two models part.
#[test]
fn margins_put_back_into_their_definitions() {
    for sample in sample::all() {
        let design = sample.design().expect("read").check().expect("usable");
        let Some(exact) = told(sample.file, referee(&design, &request(&design, &[1e3]))) else { continue };
        for crossover in &exact.margins.crossovers {
            let there = referee(&design, &request(&design, &[crossover.frequency_hz])).expect("as before").curves;
            assert!(there.loop_db[0].abs() < 1e-6, "{}: {} dB", sample.file, there.loop_db[0]);
            let turns = (there.loop_deg[0] + 180.0 - crossover.phase_margin_deg) / 360.0;
            assert!(
                (turns - turns.round()).abs() < 1e-8,
                "{}: {} against {crossover:?}",
                sample.file,
                there.loop_deg[0]
            );
        }
        for crossing in &exact.margins.phase_crossovers {
            let there = referee(&design, &request(&design, &[crossing.frequency_hz])).expect("as before").curves;
            let undefined = there.loop_db[0].is_nan();
            assert!(undefined || (there.loop_db[0] + crossing.gain_margin_db).abs() < 1e-6, "{}", sample.file);
        }
        let greatest = exact.greatest_multiplier().expect("there are states");
        assert_eq!(exact.stability.is_stable(), greatest < 1.0, "{}", sample.file);
        assert!(exact.multipliers.windows(2).all(|pair| pair[0].norm() >= pair[1].norm()));
        assert!(exact.reach.looked_to_hz < design.stage.switching_frequency / 2.0);
        if let (Some(hz), Some(_)) = (exact.reach.frequency_hz, exact.reach.by) {
            let asked = request(&design, &[hz * 0.999, hz * 1.001]);
            let (here, averaged) = (referee(&design, &asked).expect("as before").curves, analyse(&design, &asked));
            let averaged = averaged.shown.expect("as before").curves;
            let apart = |k: usize| {
                let pairs = [
                    (here.loop_db[k] - averaged.loop_db[k], here.loop_deg[k] - averaged.loop_deg[k]),
                    (here.plant_db[k] - averaged.plant_db[k], here.plant_deg[k] - averaged.plant_deg[k]),
                ];
                pairs.iter().map(|(db, deg)| db.abs().max(deg.abs() / 5.0)).fold(0.0, f64::max)
            };
            assert!((apart(0) - 1.0).abs() < 0.02 && (apart(1) - 1.0).abs() < 0.02, "{}: {hz} Hz", sample.file);
        }
    }
}

/// Two routes: the steady period's means are those of the averaged operating point but for what averaging leaves out; charge balances.
#[test]
fn a_steady_period_rests_about_the_operating_point() {
    for sample in sample::all() {
        let design = sample.design().expect("read").check().expect("usable");
        let Some(steady) = told(sample.file, steady(&design, NOMINAL)) else { continue };
        let averaged = analyse(&design, &request(&design, &[1e3])).shown.expect("as before");
        let point = &averaged.operating_point;
        let of = |begin: &str| steady.stress.iter().find(|stress| stress.name.starts_with(begin)).expect(begin);
        let near = |one: f64, other: f64, share: f64| {
            assert!((one - other).abs() <= share * other.abs(), "{}: {one} against {other}", sample.file);
        };
        near(of("input current").average, point.input_current, 0.01);
        near(of("load voltage").average, point.load_voltage, 0.01);
        near(of("inductor current").average, point.inductors[0].current.average, 0.02);
        near(of("inductor current").peak, point.inductors[0].current.peak, 0.04);
        let balanced = steady.stress.iter().filter(|stress| stress.name.starts_with("output capacitor"));
        for stress in balanced {
            assert!(stress.average.abs() <= 1e-9 * stress.peak.abs(), "{}: {}", sample.file, stress.average);
        }
        for wave in &steady.waves {
            assert_eq!(wave.times_s.len(), wave.values.len());
            // To rounding: a phase ends where the next begins.
            assert!(wave.times_s.windows(2).all(|pair| pair[0] <= pair[1] + 1e-12 * steady.period_s));
            let last = wave.times_s.last().expect("there are samples");
            assert!((last / steady.period_s - 1.0).abs() < 1e-9, "{}", sample.file);
        }
        let [whole, capacitive, resistive] = steady.ripple_v;
        // Two parts of one sum: it is no greater than both together, and no smaller than their difference.
        assert!(whole <= (capacitive + resistive) * (1.0 + 1e-6), "{}", sample.file);
        assert!(whole >= (capacitive - resistive).abs() * (1.0 - 1e-6), "{}", sample.file);
    }
}

/// Common practice: a buck in peak current mode without a ramp doubles its period above half the duty ratio, whatever its margins say.
#[test]
fn period_doubling_is_named_with_its_multiplier() {
    let mut design = sample::built_in();
    for (path, text) in [
        ("stage.topology", "buck"),
        ("control.mode", "peak-current"),
        ("stage.output.voltage", "7.2"),
        ("compensator.divider.upper", "10.1k"),
        ("compensator.divider.lower", "2.02k"),
        ("control.slope", "rate"),
        ("control.slope.rate", "0"),
        ("compensator.r2", "200"),
    ] {
        design.set_from_text(path, text).unwrap_or_else(|finding| panic!("{path}: {finding}"));
    }
    let checked = design.check().expect("usable");
    let exact = referee(&checked, &request(&checked, &[1e3])).expect("it has a steady period");
    assert_eq!(exact.stability, SwitchedStability::PeriodDoubling, "{:?}", exact.multipliers);
    let told = exact.findings.first().expect("it is told");
    assert!(told.severity == Severity::Problem && told.message.contains("period doubling"), "{told}");
    assert!(told.message.contains('\u{2212}'), "the multiplier is negative: {told}");
}

/// Near half the switching frequency a reading depends on the phase of the injected sine: there is none, and the curve has a gap.
#[test]
fn curves_have_gaps_where_a_reading_is_undefined() {
    let design = sample::built_in().check().expect("usable");
    let half = design.stage.switching_frequency / 2.0;
    let asked = [0.5, 0.985, 0.995, 1.0, 1.005, 1.015, 1.5, 1.995].map(|share| share * half);
    let curves = referee(&design, &request(&design, &asked)).expect("examined").curves;
    let defined: Vec<bool> = curves.loop_db.iter().map(|db| db.is_finite()).collect();
    assert_eq!(defined, [true, true, false, false, false, true, true, false]);
    assert_eq!(curves.plant_db.iter().map(|db| db.is_finite()).collect::<Vec<_>>(), defined);
}
