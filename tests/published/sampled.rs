//! Peak and valley current mode against the exact small-signal response of the switched stage.
//!
//! *Source*: interval matrices written by hand, the exact periodic orbit, and the exact response to a small sine of the control
//! voltage: a linear map from period to period with a jump where the comparator's instant moves, and the Fourier integral of
//! the output. Sampled-data modelling, Brown & Middlebrook 1981 (method from memory). Nothing of it knows averaging.

use crate::common::{assert_absolute, assert_relative, at_one_condition, lossless, nominal};
use nalgebra::{DMatrix, DVector, RowDVector};
use polewright::linear::{Complex, expm};
use std::f64::consts::{PI, TAU};
use std::fmt::Write as _;

/// States: inductor current, capacitor voltage, filtered current.
struct Interval {
    a: DMatrix<f64>,
    b: DVector<f64>,
}

#[derive(Clone, Copy)]
struct Case {
    name: &'static str,
    topology: &'static str,
    valley: bool,
    vin: f64,
    duty: f64,
    inductance: f64,
    capacitance: f64,
    load: f64,
    ramp: f64,
    /// Time constant of the sense filter over the period.
    filter: f64,
    delay: f64,
}

const PERIOD: f64 = 1.0 / 300e3;
const WINDING: f64 = 0.02;

impl Case {
    /// Switch interval and rectifier interval.
    fn intervals(&self) -> [Interval; 2] {
        let (l, c, r) = (self.inductance, self.capacitance, self.load);
        let tau = if self.filter > 0.0 { self.filter * PERIOD } else { 1e-4 * PERIOD };
        let stage = |coupled: f64, from_input: f64| Interval {
            a: DMatrix::from_row_slice(
                3,
                3,
                &[-WINDING / l, -coupled / l, 0.0, coupled / c, -1.0 / (r * c), 0.0, 1.0 / tau, 0.0, -1.0 / tau],
            ),
            b: DVector::from_row_slice(&[from_input * self.vin / l, 0.0, 0.0]),
        };
        match self.topology {
            "buck" => [stage(1.0, 1.0), stage(1.0, 0.0)],
            _ => [stage(0.0, 1.0), stage(1.0, 1.0)],
        }
    }

    fn output_voltage(&self) -> f64 {
        let [on, off] = self.intervals();
        let a = on.a * self.duty + off.a * (1.0 - self.duty);
        let b = on.b * self.duty + off.b * (1.0 - self.duty);
        -a.lu().solve(&b).expect("a steady state")[1]
    }

    fn model(&self, frequencies_hz: &[f64]) -> polewright::analysis::Detail {
        let vout = self.output_voltage();
        let mut design = lossless(self.topology, &[]);
        let mode = if self.valley { "valley-current" } else { "peak-current" };
        for (path, key) in [("control.mode", mode), ("control.sense", "gain"), ("control.slope", "rate")] {
            design.set_from_text(path, key).expect("an option");
        }
        for (path, value) in [
            ("stage.output.voltage", vout),
            ("compensator.reference", vout / 2.0),
            ("compensator.divider.upper", 10e3),
            ("compensator.divider.lower", 10e3),
            ("stage.switching-frequency", PERIOD.recip()),
            ("stage.inductor.inductance", self.inductance),
            ("stage.inductor.resistance", WINDING),
            ("stage.bank.1.capacitance", self.capacitance),
            ("control.sense.gain", 1.0),
            ("control.sense.divider", 1.0),
            ("control.sense.offset", 0.0),
            ("control.sense.filter", self.filter * PERIOD),
            ("control.slope.rate", self.ramp),
            ("control.blanking", 0.0),
            ("control.delay", self.delay),
        ] {
            design.values.set(path, value).expect("finite");
        }
        at_one_condition(&mut design, self.vin, vout / self.load);
        nominal(&design, frequencies_hz)
    }

    /// Exact: response of the output at each frequency, steady control voltage, multipliers of the map.
    fn exact(&self, frequencies_hz: &[f64]) -> (Vec<Complex>, f64, Vec<Complex>) {
        let [on, off] = self.intervals();
        let (first, second, share, sign) =
            if self.valley { (off, on, 1.0 - self.duty, -1.0) } else { (on, off, self.duty, 1.0) };
        let sensed = RowDVector::from_row_slice(if self.filter > 0.0 { &[0.0, 0.0, 1.0] } else { &[1.0, 0.0, 0.0] });
        let (first_s, second_s) = (share * PERIOD, (1.0 - share) * PERIOD);
        let (start, switching) = orbit(&first, &second, first_s, second_s);
        let rate = |i: &Interval, x: &DVector<f64>| &i.a * x + &i.b;
        let seen = affine(&first, first_s - self.delay, &start);
        let jump = rate(&first, &switching) - rate(&second, &switching);
        let slope = (&sensed * rate(&first, &seen))[0] + sign * self.ramp;
        let to_seen = step(&first.a, first_s - self.delay);
        let (to_switching, to_end) = (step(&first.a, first_s), step(&second.a, second_s));
        let look = &sensed * &to_seen / -slope;
        let map = &to_end * (&to_switching + &jump * &look);
        let control = (&sensed * &seen)[0] + sign * self.ramp * (first_s - self.delay);
        let lift = |m: &DMatrix<f64>| m.map(|x| Complex::new(x, 0.0));
        let response = |f: &f64| {
            let s = Complex::new(0.0, TAU * f);
            let command = (s * (first_s - self.delay)).exp() / slope;
            let n = map.nrows();
            let eye = DMatrix::<Complex>::identity(n, n);
            let drive = lift(&DMatrix::from_column_slice(n, 1, (&to_end * &jump).as_slice())) * command;
            let x = (&eye * (s * PERIOD).exp() - lift(&map)).lu().solve(&drive).expect("no pole there");
            let moved = command + (lift(&DMatrix::from_row_slice(1, n, look.as_slice())) * &x)[0];
            let integral = |i: &Interval, time: f64| {
                let shifted = lift(&i.a) - &eye * s;
                let grown = lift(&step(&i.a, time)) * (-s * time).exp() - &eye;
                shifted.lu().solve(&grown).expect("no pole there")
            };
            let after = lift(&to_switching) * &x + lift(&DMatrix::from_column_slice(n, 1, jump.as_slice())) * moved;
            let sum = integral(&first, first_s) * &x + integral(&second, second_s) * after * (-s * first_s).exp();
            sum[1] / PERIOD
        };
        let multipliers = map.complex_eigenvalues().iter().map(|z| Complex::new(z.re, z.im)).collect();
        (frequencies_hz.iter().map(response).collect(), control, multipliers)
    }
}

fn step(a: &DMatrix<f64>, time: f64) -> DMatrix<f64> {
    expm(&(a * time)).expect("finite")
}

/// State after a time in one interval.
fn affine(interval: &Interval, time: f64, start: &DVector<f64>) -> DVector<f64> {
    let n = interval.a.nrows();
    let mut grown = DMatrix::zeros(n + 1, n + 1);
    grown.view_mut((0, 0), (n, n)).copy_from(&interval.a);
    grown.view_mut((0, n), (n, 1)).copy_from(&interval.b);
    let mut state = start.clone().insert_row(n, 1.0);
    state = step(&grown, time) * state;
    state.remove_row(n)
}

/// The periodic orbit: state at the clock, state at the switching instant.
fn orbit(first: &Interval, second: &Interval, first_s: f64, second_s: f64) -> (DVector<f64>, DVector<f64>) {
    let n = first.a.nrows();
    let period = |x: &DVector<f64>| affine(second, second_s, &affine(first, first_s, x));
    let constant = period(&DVector::zeros(n));
    let map = step(&second.a, second_s) * step(&first.a, first_s);
    let start = (DMatrix::identity(n, n) - map).lu().solve(&constant).expect("a periodic orbit");
    let switching = affine(first, first_s, &start);
    (start, switching)
}

fn cases() -> Vec<Case> {
    let boost = |name, valley, duty, ramp, filter, delay| Case {
        name,
        topology: "boost",
        valley,
        vin: 9.0,
        duty,
        inductance: 10e-6,
        capacitance: 94e-6,
        load: 24.0,
        ramp,
        filter,
        delay,
    };
    let buck = |name, valley, duty, ramp, filter, delay| Case {
        topology: "buck",
        vin: 12.0,
        capacitance: 40e-6,
        load: 2.0,
        ..boost(name, valley, duty, ramp, filter, delay)
    };
    vec![
        boost("boost", false, 0.63, 500e3, 0.0, 0.0),
        boost("boost, delay", false, 0.4, 0.0, 0.0, 100e-9),
        boost("boost, filter", false, 0.63, 500e3, 0.05, 0.0),
        boost("boost, filter and delay", false, 0.63, 800e3, 0.1, 100e-9),
        boost("boost, slow filter", false, 0.5, 1200e3, 0.5, 50e-9),
        boost("boost, valley", true, 0.63, 0.0, 0.0, 0.0),
        boost("boost, valley, ramp, filter, delay", true, 0.4, 500e3, 0.08, 60e-9),
        buck("buck", false, 0.3, 0.0, 0.0, 0.0),
        buck("buck, ramp, filter, delay", false, 0.6, 600e3, 0.05, 80e-9),
        buck("buck, slow filter", false, 0.3, 500e3, 1.0, 0.0),
        buck("buck, valley, delay", true, 0.7, 0.0, 0.0, 100e-9),
        buck("buck, valley, ramp, filter", true, 0.4, 600e3, 0.1, 0.0),
    ]
}

/// Gain and phase up to half the switching frequency; the averaged model and z's rational form cost a decibel at a third of it.
#[test]
fn control_to_output_is_that_of_the_switched_stage() {
    let shares = [0.001, 0.003, 0.01, 0.03, 0.1, 0.2, 0.33, 0.45, 0.49];
    let decibels = [0.02, 0.02, 0.02, 0.03, 0.15, 0.5, 1.3, 2.2, 1.8];
    let degrees = [0.1, 0.1, 0.1, 0.1, 0.5, 2.0, 5.0, 12.0, 12.0];
    let frequencies: Vec<f64> = shares.iter().map(|share| share / PERIOD).collect();
    for case in cases() {
        let (exact, control, _) = case.exact(&frequencies);
        let detail = case.model(&frequencies);
        let mut worst = String::new();
        // Where the program says that the sampling effect is approximate.
        let loose = if case.filter > 0.1 { 2.5 } else { 1.0 };
        for (k, exact) in exact.iter().enumerate() {
            let gain = detail.curves.plant_db[k] - 20.0 * exact.norm().log10();
            let phase = (detail.curves.plant_deg[k] - exact.arg().to_degrees() + 180.0).rem_euclid(360.0) - 180.0;
            let _ = write!(worst, " {}: {gain:+.3} dB {phase:+.2}°;", shares[k]);
            assert!(gain.abs() < loose * decibels[k] && phase.abs() < loose * degrees[k], "{}:{worst}", case.name);
        }
        assert_relative(case.name, detail.control.control_voltage, control, 0.004);
    }
}

/// What a deviation of the current is multiplied by, and with it the subharmonic boundary.
#[test]
fn fast_multiplier_is_that_of_the_switched_stage() {
    for case in cases() {
        // A large capacitor holds the voltages still, as the multiplier takes them.
        let case = Case { capacitance: 10e-3, ..case };
        let (_, _, multipliers) = case.exact(&[]);
        let found = case.model(&[1e3]).control.sampling.expect("continuous conduction");
        let exact = multipliers.iter().filter(|z| z.re < 0.9).max_by(|a, b| a.norm().total_cmp(&b.norm()));
        let exact = exact.expect("a fast one");
        // Of a pair the magnitude is told.
        let wanted = if exact.im == 0.0 { exact.re } else { exact.norm().copysign(exact.re) };
        assert_absolute(case.name, found.fast_multiplier, wanted, 0.012);
        assert_eq!(found.subharmonic(), wanted < -1.0, "{}: {exact}", case.name);
    }
}

/// At the boundary ramp the model's pair stands on the imaginary axis at half the switching frequency.
#[test]
fn the_sampling_pair_is_unstable_where_the_current_is() {
    for case in cases() {
        let frequencies = [0.5 / PERIOD];
        let boundary = case.model(&frequencies).control.sampling.expect("continuous").boundary_ramp;
        for (factor, growing) in [(0.9, true), (1.1, false)] {
            if boundary < 1.0 {
                continue;
            }
            let case = Case { ramp: factor * boundary, capacitance: 1e-3, ..case };
            let (_, _, multipliers) = case.exact(&[]);
            let exact = multipliers.iter().any(|z| z.norm() > 1.0);
            let model = case.model(&frequencies).control.sampling.expect("continuous");
            assert_eq!((exact, model.subharmonic()), (growing, growing), "{} {factor}", case.name);
            assert!((model.damping * PI).abs() < 1.0);
        }
    }
}
