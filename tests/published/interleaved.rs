//! Interleaved phases followed switch by switch, against independent calculations and closed forms.
//!
//! *Source*: `tests/reference/interleaved.py` (hand-written equations of N phases, in Python); a boost of three phases written out here over
//! the whole switching period; the ripple cancellation of a buck and the multiplier of a current loop in closed form, from memory.

use crate::common::{
    assert_absolute, assert_relative, at_one_condition, checked, exact_loop, lossless, try_exact_loop,
};
use crate::exact::current_loop;
use crate::reference::{complex, designs, number, numbers};
use nalgebra::{DMatrix, DVector};
use polewright::design::Design;
use polewright::switched::{Figures, Instability, Orbit, Quantity, Stability};

const TOPOLOGIES: &str = include_str!("../reference/topologies.json");

fn figures_of(orbit: &Orbit, probe: &str) -> Figures {
    orbit.figures().expect("figures")[orbit.system.probe(probe).expect(probe)]
}

/// A lossless stage of so many phases at one condition.
fn phases(topology: &str, count: f64, (input, output): (f64, f64), load: f64, further: &[(&str, f64)]) -> Design {
    let mut design = lossless(
        topology,
        &[
            ("stage.output.voltage", output),
            ("stage.switching-frequency", 200e3),
            ("compensator.reference", 0.6),
            ("compensator.divider.upper", 10e3 * (output / 0.6 - 1.0)),
            ("compensator.divider.lower", 10e3),
        ],
    );
    design.values.set("stage.phases", count).expect("finite");
    for (path, value) in further {
        design.values.set(path, *value).expect("finite");
    }
    at_one_condition(&mut design, input, load);
    design.title = format!("{topology} of {count}, {input} V to {output} V");
    design
}

/// Plant to 1e-7, multiplier to 1e-6, as of one phase. The multipliers told are those of the whole period, there those of an N-th of it.
#[test]
fn plants_and_multipliers_are_those_of_the_reference() {
    let several = |row: &serde_json::Value| row["values"]["stage.phases"].as_f64().is_some_and(|n| n > 1.0);
    let found: Vec<_> = designs(TOPOLOGIES, |row| row["switched"].is_object() && several(row));
    assert!(found.len() >= 2);
    for (design, row) in found {
        let wanted = &row["switched"];
        let exact = exact_loop(&design, None);
        assert_relative(&design.title, exact.open.orbit().duty, number(&wanted["duty"]), 1e-9);
        let mut plant = exact.reader(Quantity::Plant).expect("a plant");
        for (f, value) in numbers(&wanted["frequencies_hz"]).into_iter().zip(complex(&wanted["plant"])) {
            let error = (plant.at(f).expect("a value") - value).norm() / value.norm();
            assert!(error < 1e-7, "{} at {f} Hz: off by {error:e}", design.title);
        }
        let count = design.values.get("stage.phases").expect("entered");
        let growth = Stability::new(&exact.closed).expect("multipliers").growth_per_period();
        assert_absolute(&design.title, growth.powf(count.recip()), number(&wanted["greatest_closed_multiplier"]), 1e-6);
    }
}

/// Ripple of the sum over that of one: N·(D − m/N)·((m + 1)/N − D) / (D·(1 − D)) with m the whole part of N·D.
#[test]
fn ripple_cancels_as_the_closed_form_says() {
    for count in [2.0, 3.0, 4.0, 6.0] {
        for duty in [0.1, 0.28, 0.45, 0.55, 0.72, 0.9] {
            let further = [("stage.inductor.inductance", 2e-6), ("stage.bank.1.capacitance", 1e-1)];
            let design = phases("buck", count, (12.0, 12.0 * duty), 20.0, &further);
            let orbit = exact_loop(&design, None).open.orbit().clone();
            let m = (count * duty).floor();
            let wanted = count * (duty - m / count) * ((m + 1.0) / count - duty) / (duty * (1.0 - duty));
            let (sum, one) = (figures_of(&orbit, "inductor currents together"), figures_of(&orbit, "inductor current"));
            assert_absolute(&design.title, sum.swing() / one.swing(), wanted, 1e-5);
            assert_relative(&design.title, sum.mean, 20.0, 1e-9);
            assert_relative(&design.title, one.mean, 20.0 / count, 1e-9);
        }
    }
}

/// The waveforms of a period hold one phase throughout it: it begins where it ends, and its swing is that of the figures.
#[test]
fn waveforms_follow_one_phase_through_the_period() {
    let design = phases("boost", 3.0, (10.0, 24.0), 6.0, &[("stage.bank.1.esr", 5e-3)]);
    let orbit = exact_loop(&design, None).closed.orbit().clone();
    let waves = orbit.waveforms(900).expect("waveforms");
    assert_relative("length", *waves.times_s.last().expect("a time"), 5e-6, 1e-9);
    assert!(waves.times_s.windows(2).all(|pair| pair[1] >= pair[0] - 1e-15));
    for probe in ["inductor current", "inductor currents together"] {
        let trace = &waves.values[orbit.system.probe(probe).expect(probe)];
        let (first, last) = (trace[0], trace[trace.len() - 1]);
        let figures = figures_of(&orbit, probe);
        assert!((last - first).abs() < 1e-9 * figures.greatest, "{probe}: {first} to {last}");
        // Continuous as phases are renamed.
        let steps = trace.windows(2).map(|pair| (pair[1] - pair[0]).abs()).fold(0.0, f64::max);
        assert!(steps < 0.05 * figures.swing(), "{probe} jumps by {steps}");
    }
}

/// A boost of three phases on R, C and ESR, written out over the whole period: currents as each switch opens and closes, mean output.
#[test]
fn three_boosts_written_out_over_the_whole_period() {
    let (vin, l, c, esr, load, period) = (10.0, 5e-6, 100e-6, 8e-3, 4.0, 5e-6);
    for output in [13.0, 18.0, 40.0] {
        let further = [("stage.inductor.inductance", l), ("stage.bank.1.capacitance", c), ("stage.bank.1.esr", esr)];
        let design = phases("boost", 3.0, (vin, output), load, &further);
        let orbit = exact_loop(&design, None).open.orbit().clone();
        let r = output / load;
        let conducts = |k: usize, time: f64| (time - k as f64 / 3.0).rem_euclid(1.0) < orbit.duty;
        let mut corners: Vec<f64> = (0..3).map(|k| f64::from(k) / 3.0).collect();
        corners.extend((0..3).map(|k| (f64::from(k) / 3.0 + orbit.duty).rem_euclid(1.0)));
        corners.push(1.0);
        corners.sort_by(f64::total_cmp);
        // States: three currents, the capacitor's voltage, one, the integral of the output voltage.
        let map = |from: f64, to: f64| {
            let mut a = DMatrix::zeros(6, 6);
            let share = r / (r + esr);
            let off: Vec<usize> = (0..3).filter(|k| !conducts(*k, f64::midpoint(from, to))).collect();
            let mut out = DVector::zeros(6);
            out[3] = share;
            for k in &off {
                out[*k] = share * esr;
            }
            for k in 0..3 {
                a[(k, 4)] = vin / l;
                if off.contains(&k) {
                    for column in 0..4 {
                        a[(k, column)] -= out[column] / l;
                    }
                    a[(3, k)] = r / (r + esr) / c;
                }
            }
            a[(3, 3)] = -1.0 / (c * (r + esr));
            for column in 0..4 {
                a[(5, column)] = out[column];
            }
            (a * ((to - from) * period)).exp()
        };
        let steps: Vec<DMatrix<f64>> = corners.windows(2).map(|pair| map(pair[0], pair[1])).collect();
        let whole = steps.iter().fold(DMatrix::identity(6, 6), |sum, step| step * sum);
        let own = whole.view((0, 0), (4, 4)).into_owned();
        let start = (DMatrix::identity(4, 4) - own).lu().solve(&whole.view((0, 4), (4, 1)).into_owned()).expect("one");
        let mut x = DVector::zeros(6);
        x.rows_mut(0, 4).copy_from(&start.column(0));
        x[4] = 1.0;
        let (mut one, mut sum) = (vec![x[0]], vec![x[0] + x[1] + x[2]]);
        for step in &steps {
            x = step * x;
            one.push(x[0]);
            sum.push(x[0] + x[1] + x[2]);
        }
        let extent = |values: &[f64]| {
            let greatest = values.iter().copied().fold(f64::NEG_INFINITY, f64::max);
            (values.iter().copied().fold(f64::INFINITY, f64::min), greatest)
        };
        assert_relative(&design.title, x[5] / period, output, 1e-9);
        for (probe, values) in [("inductor current", one), ("inductor currents together", sum)] {
            let (least, greatest) = extent(&values);
            let found = figures_of(&orbit, probe);
            assert_relative(&format!("{} {probe}", design.title), found.least, least, 1e-8);
            assert_relative(&format!("{} {probe}", design.title), found.greatest, greatest, 1e-8);
        }
    }
}

/// With a stiff output every phase is a current loop by itself: −D/(1 − D) without a ramp, for all of them at once.
#[test]
fn every_phase_doubles_its_period_by_itself() {
    for (output, doubles) in [(4.2, false), (6.1, true)] {
        let mut design = current_loop("buck", (10.0, output), 0.0);
        design.values.set("stage.phases", 3.0).expect("finite");
        let exact = exact_loop(&design, None);
        let stability = Stability::new(&exact.open).expect("multipliers");
        let duty: f64 = output / 10.0;
        let alpha = -duty / (1.0 - duty);
        let near = stability.multipliers.iter().filter(|m| (*m - alpha).norm() < 1e-5).count();
        assert_eq!(near, 3, "{alpha}: {:?}", stability.multipliers);
        let named = matches!(stability.instability, Some(Instability::PeriodDoubling { .. }));
        assert_eq!(named, doubles, "{:?}", stability.instability);
    }
}

/// What phases do alike is what one phase of an N-th does, where ripple does not matter.
#[test]
fn at_low_frequency_the_phases_are_one_of_an_nth() {
    let further = [("stage.inductor.inductance", 6e-6), ("stage.bank.1.esr", 2e-3)];
    let several = exact_loop(&phases("buck", 3.0, (12.0, 3.3), 20.0, &further), None);
    let further = [("stage.inductor.inductance", 2e-6), ("stage.bank.1.esr", 2e-3)];
    let one = exact_loop(&phases("buck", 1.0, (12.0, 3.3), 20.0, &further), None);
    let (mut several, mut one) =
        (several.reader(Quantity::Plant).expect("it"), one.reader(Quantity::Plant).expect("it"));
    for f in [50.0, 500.0, 5e3] {
        let apart = several.at(f).expect("a value") / one.at(f).expect("a value") - 1.0;
        assert!(apart.norm() < 1e-3, "{apart} at {f} Hz");
    }
}

/// What is not followed says so.
#[test]
fn what_is_not_followed_is_a_finding() {
    let refused = |design: &Design, why: &str| {
        let finding = try_exact_loop(design, None).expect_err("a finding");
        assert!(finding.message.contains(why) && finding.place == "stage.phases", "{finding:?}");
    };
    let mut design = phases("buck", 2.0, (12.0, 6.0), 20.0, &[]);
    refused(&design, "just as that of another");
    design = phases("buck", 2.0, (12.0, 3.3), 0.02, &[]);
    design.set_from_text("stage.rectifier", "diode").expect("an option");
    refused(&design, "come to rest");
    design = phases("buck", 2.0, (12.0, 3.3), 20.0, &[]);
    design.set_from_text("control.mode", "valley-current").expect("an option");
    assert!(checked(&design).stage.phases() > 1.0);
    refused(&design, "peak current mode only");
}
