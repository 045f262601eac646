//! Flyback, SEPIC and Ćuk against closed forms: a thousand random lossless stages each, inductors separate and coupled.
//!
//! *Source*: flyback: the buck-boost of Erickson & Maksimovic, Fundamentals of Power Electronics, 3rd ed., Table 8.2 with the input
//! and the inductance as the secondary sees them (form from memory). SEPIC and Ćuk: numerators and denominator of the averaged
//! equations by Cramer's rule, expanded with `SymPy` 1.13 from
//! L1·i1' + M·i2' = vg − D'·(v1 + v), M·i1' + L2·i2' = D·v1 − D'·v, Cc·v1' = D'·i1 − D·i2, C·v' = D'·(i1 + i2) − v/R (SEPIC) and
//! L1·i1' + M·i2' = vg − D'·v1, M·i1' + L2·i2' = D·v1 − v, Cc·v1' = D'·i1 − D·i2, C·v' = i2 − v/R (Ćuk).
//! The polynomials are held against the derived zeros and poles by evaluating them, never by finding their roots.

use crate::common::{assert_relative, at_one_condition, checked, lossless};
use crate::random::Random;
use polewright::converter::{Conduction, StageCondition};
use polewright::design::Design;
use polewright::linear::{Complex, Zpk};

/// A random lossless stage.
#[derive(Clone, Copy, Debug)]
struct Case {
    vin: f64,
    vout: f64,
    load: f64,
    l1: f64,
    l2: f64,
    coupling: f64,
    cc: f64,
    c: f64,
}

impl Case {
    fn random(random: &mut Random) -> Self {
        let l1 = random.log(200e-9, 2e-3);
        let c = random.log(1e-6, 10e-3);
        let vin = random.log(2.0, 150.0);
        Case {
            vin,
            vout: vin * random.log(0.15, 6.0),
            load: random.log(0.03, 30.0),
            l1,
            l2: l1 * random.log(0.2, 5.0),
            coupling: *random.pick(&[0.0, 0.3, 0.8, 0.97]),
            cc: c * random.log(3e-3, 3.0),
            c,
        }
    }

    fn duty(&self) -> f64 {
        self.vout / (self.vin + self.vout)
    }

    fn resistance(&self) -> f64 {
        self.vout / self.load
    }

    fn mutual(&self) -> f64 {
        self.coupling * (self.l1 * self.l2).sqrt()
    }

    fn design(&self, topology: &str) -> Design {
        let mut design = lossless(
            topology,
            &[
                ("stage.output.voltage", self.vout),
                ("stage.inductor.inductance", self.l1),
                ("stage.second-inductor.inductance", self.l2),
                ("stage.second-inductor.resistance", 0.0),
                ("stage.inductors.coupling", self.coupling),
                ("stage.coupling-capacitor.capacitance", self.cc),
                ("stage.coupling-capacitor.esr", 0.0),
                ("stage.bank.1.capacitance", self.c),
                ("compensator.reference", self.vout / 2.0),
                ("compensator.divider.upper", 10e3),
                ("compensator.divider.lower", 10e3),
            ],
        );
        if self.coupling > 0.0 {
            design.set_from_text("stage.inductors", "coupled").expect("an option");
            design.values.set("stage.inductors.coupling", self.coupling).expect("finite");
        }
        at_one_condition(&mut design, self.vin, self.load);
        design
    }

    fn condition(&self) -> StageCondition {
        StageCondition { input_voltage: self.vin, load_current: self.load, output_voltage: self.vout }
    }

    /// Denominator, numerator from duty ratio [V] and from input voltage; coefficients from the constant one upward.
    fn polynomials(&self, topology: &str) -> [Vec<f64>; 3] {
        let Case { l1, l2, cc, c, vin, .. } = *self;
        let (m, d, r) = (self.mutual(), self.duty(), self.resistance());
        let off = 1.0 - d;
        let (inner, round) = (l1 * l2 - m * m, l1 + l2 - 2.0 * m);
        let seen = l1 * d * d + l2 * off * off + 2.0 * m * d * off;
        let lag = d * (l1 * d + m * off) / (r * off * off);
        let second = c * seen + if topology == "sepic" { cc * round * off * off } else { cc * l1 };
        let denominator = vec![off * off, seen / r, second, cc * inner / r, c * cc * inner];
        let from_duty = if topology == "sepic" {
            vec![vin, -vin * lag, vin * cc * round, -vin * cc * d * inner / (r * off * off)]
        } else {
            vec![vin, -vin * lag, vin * cc * (l1 - m) / off]
        };
        let from_input =
            if topology == "sepic" { vec![d * off, 0.0, cc * off * (l2 - m)] } else { vec![d * off, 0.0, -cc * m] };
        [denominator, from_duty, from_input]
    }
}

/// A polynomial at s over the sum of its terms' magnitudes: zero at a root, whatever the scale.
fn relative_value(coefficients: &[f64], s: Complex) -> f64 {
    let mut power = Complex::new(1.0, 0.0);
    let (mut sum, mut magnitude) = (Complex::new(0.0, 0.0), 0.0);
    for coefficient in coefficients {
        let term = power * *coefficient;
        sum += term;
        magnitude += term.norm();
        power *= s;
    }
    sum.norm() / magnitude
}

/// Coefficients without those at the top that are none.
fn trimmed(coefficients: &[f64]) -> &[f64] {
    let degree = coefficients.iter().rposition(|x| *x != 0.0).unwrap_or(0);
    &coefficients[..=degree]
}

fn agree(topology: &str, seed: u64) {
    const TOLERANCE: f64 = 1e-6;
    let mut random = Random::new(seed);
    for _ in 0..1000 {
        let case = Case::random(&mut random);
        let stage = checked(&case.design(topology)).stage;
        let averaged = stage.averaged(&case.condition()).expect("an operating point");
        assert_relative("duty", averaged.operating_point.duty, case.duty(), TOLERANCE);
        let model = averaged.stage;
        let [denominator, from_duty, from_input] = case.polynomials(topology);
        for (input, numerator) in [("duty", &from_duty), ("input voltage", &from_input)] {
            let (row, column) = (model.output("output voltage").expect("named"), model.input(input).expect("named"));
            let derived = Zpk::from_state_space(&model, row, column).expect("roots");
            let told = || format!("{input}, {case:?}: {derived:?}");
            assert_relative(topology, derived.dc_gain().expect("finite"), numerator[0] / denominator[0], TOLERANCE);
            assert_eq!(derived.poles.len(), 4, "{}", told());
            let numerator = trimmed(numerator);
            assert_eq!(derived.zeros.len(), numerator.len() - 1, "{}", told());
            for pole in &derived.poles {
                assert!(relative_value(&denominator, *pole) < TOLERANCE, "pole {pole}, {}", told());
            }
            for zero in &derived.zeros {
                assert!(relative_value(numerator, *zero) < TOLERANCE, "zero {zero}, {}", told());
            }
            // A double root would satisfy the polynomial twice; the highest coefficients count the roots.
            let top = numerator.last().expect("not empty") / denominator[4];
            assert_relative(topology, derived.gain, top, TOLERANCE);
        }
        let condition = case.condition();
        let plant = Zpk::from_state_space(&model, model.output("output voltage").expect("named"), 0).expect("roots");
        for mark in stage.landmarks(&condition, Conduction::ForcedContinuous, &plant) {
            // Without load the damping terms go, and the landmarks are exact roots.
            let at = Complex::new(0.0, std::f64::consts::TAU * mark.frequency_hz);
            let without_load = |coefficients: &[f64]| -> Vec<f64> {
                coefficients.iter().enumerate().map(|(k, x)| if k % 2 == 0 { *x } else { 0.0 }).collect()
            };
            let off = match mark.key {
                "lc-resonance" | "second-resonance" => relative_value(&without_load(&denominator), at),
                "zero-pair" => relative_value(&without_load(&from_duty), at),
                _ => 0.0,
            };
            assert!(off < TOLERANCE, "{}: {off}, {case:?}", mark.key);
        }
    }
}

#[test]
fn sepic_equals_its_symbolic_form() {
    agree("sepic", 11);
}

#[test]
fn cuk_equals_its_symbolic_form() {
    agree("cuk", 12);
}

/// With one inductor hardly felt the SEPIC's right-half-plane zero is the textbook's.
#[test]
fn sepic_right_half_plane_zero_lies_where_the_landmark_says() {
    let mut random = Random::new(13);
    let mut seen = 0;
    for _ in 0..1000 {
        let case = Case::random(&mut random);
        let stage = checked(&case.design("sepic")).stage;
        let model = stage.averaged(&case.condition()).expect("an operating point").stage;
        let plant = Zpk::from_state_space(&model, model.output("output voltage").expect("named"), 0).expect("roots");
        let marks = stage.landmarks(&case.condition(), Conduction::ForcedContinuous, &plant);
        let of = |key: &str| marks.iter().find(|mark| mark.key == key).expect("marked").frequency_hz;
        let (zero, pair) = (of("right-half-plane-zero"), of("zero-pair"));
        // The cubic's real root is the landmark's where it stands far above the pair.
        if zero > 30.0 * pair {
            let real = plant.zeros.iter().find(|z| z.im == 0.0 && z.re > 0.0).expect("a real zero");
            assert_relative("RHP zero", real.re / std::f64::consts::TAU, zero, 0.01);
            seen += 1;
        }
    }
    assert!(seen > 100, "{seen}");
}

/// Flyback: Gd0 = Vout/(D·D'), Gg0 = n·D/D', ω0 = D'/√(n²·L·C), Q = D'·R·√(C/(n²·L)), ωz = D'²·R/(D·n²·L).
#[test]
fn flyback_equals_the_closed_forms() {
    const TOLERANCE: f64 = 1e-6;
    let mut random = Random::new(14);
    for _ in 0..1000 {
        let case = Case::random(&mut random);
        let ratio = random.log(0.02, 2.0);
        let vout = case.vout * ratio;
        let case = Case { vout, coupling: 0.0, ..case };
        let mut design = case.design("flyback");
        design.values.set("stage.transformer.ratio", ratio).expect("finite");
        let stage = checked(&design).stage;
        let averaged = stage.averaged(&case.condition()).expect("an operating point");
        let duty = vout / (vout + ratio * case.vin);
        let (off, seen, resistance) = (1.0 - duty, ratio * ratio * case.l1, case.resistance());
        assert_relative("duty", averaged.operating_point.duty, duty, TOLERANCE);
        assert_relative("sense ratio", averaged.operating_point.sense_ratio, ratio, 1e-12);
        // The magnetising current is the secondary's by the turns ratio, which the rectifier carries in D'.
        let magnetising = averaged.operating_point.inductors[0].current.average;
        assert_relative("magnetising current", magnetising, ratio * case.load / off, TOLERANCE);
        let model = averaged.stage;
        let zpk = |input: &str| {
            let (row, column) = (model.output("output voltage").expect("named"), model.input(input).expect("named"));
            Zpk::from_state_space(&model, row, column).expect("roots")
        };
        let (control, line) = (zpk("duty"), zpk("input voltage"));
        assert_relative("Gd0", control.dc_gain().expect("finite"), vout / (duty * off), TOLERANCE);
        assert_relative("Gg0", line.dc_gain().expect("finite"), ratio * duty / off, TOLERANCE);
        let [one, other] = control.poles.as_slice() else { panic!("two poles") };
        let squared = (one * other).re;
        assert_relative("resonance", squared.sqrt(), off / (seen * case.c).sqrt(), TOLERANCE);
        let quality = off * resistance * (case.c / seen).sqrt();
        assert_relative("Q", squared.sqrt() / -(one + other).re, quality, TOLERANCE);
        let [zero] = control.zeros.as_slice() else { panic!("one zero") };
        let textbook = off * off * resistance / (duty * seen);
        assert_relative("RHP zero", zero.re, textbook, TOLERANCE);
        let marks = stage.landmarks(&case.condition(), Conduction::ForcedContinuous, &control);
        let mark = |key: &str| marks.iter().find(|mark| mark.key == key).expect("marked").frequency_hz;
        assert_relative("landmark", mark("right-half-plane-zero"), textbook / std::f64::consts::TAU, TOLERANCE);
        assert_relative("landmark", mark("lc-resonance"), squared.sqrt() / std::f64::consts::TAU, TOLERANCE);
    }
}

/// Discontinuous conduction: D = M·√K with K = 2·Le·fs/R; Le is the magnetising inductance of the flyback (Erickson & Maksimovic,
/// ch. 11, from memory), both inductors in parallel for SEPIC and Ćuk (Simonetti, Sebastián & Uceda 1997, from memory), and what
/// the sum of coupled currents sees.
#[test]
fn discontinuous_conduction_has_the_textbook_duty_ratio() {
    let mut random = Random::new(15);
    for topology in ["flyback", "sepic", "cuk"] {
        for _ in 0..1000 {
            let case = Case::random(&mut random);
            let ratio = if topology == "flyback" { random.log(0.05, 10.0) } else { 1.0 };
            let case = if topology == "flyback" { Case { coupling: 0.0, ..case } } else { case };
            let le = if topology == "flyback" {
                case.l1
            } else {
                let m = case.mutual();
                (case.l1 * case.l2 - m * m) / (case.l1 + case.l2 - 2.0 * m)
            };
            let m = case.vout / case.vin;
            let fs = 300e3;
            // At the boundary D + D2 = 1 with D2 = D·n/M: K = 1/(M/n + 1)²/n². Well below it the current rests.
            let boundary = (m + ratio).powi(-2);
            let k = boundary * random.between(0.02, 0.8);
            let load = k * case.vout / (2.0 * le * fs);
            let case = Case { load, ..case };
            let mut design = case.design(topology);
            design.set_from_text("stage.rectifier", "emulated").expect("an option");
            let values = [
                ("stage.transformer.ratio", ratio),
                ("stage.switching-frequency", fs),
                ("stage.synchronous.resistance", 0.0),
            ];
            for (path, value) in values {
                design.values.set(path, value).expect("finite");
            }
            // Little ripple of the capacitors, as the textbook has it.
            design.values.set("stage.bank.1.capacitance", 1.0).expect("finite");
            design.values.set("stage.coupling-capacitor.capacitance", 1.0).expect("finite");
            let stage = checked(&design).stage;
            let point = stage.averaged(&case.condition()).expect("an operating point").operating_point;
            let told = format!("{topology} {case:?} {ratio}");
            assert_eq!(point.conduction, Conduction::Discontinuous, "{told}");
            assert_relative(&told, point.duty, m * k.sqrt(), 1e-6);
            assert_relative(&told, point.second_duty.expect("rests"), point.duty * ratio / m, 1e-6);
            let on = stage.landmarks(&case.condition(), Conduction::Discontinuous, &Zpk::constant(1.0));
            let low = on.iter().find(|mark| mark.key == "low-pole").expect("marked").frequency_hz;
            assert_relative(&told, low, 1.0 / (std::f64::consts::PI * case.resistance()), 1e-9);
        }
    }
}
