//! Tests of interleaved phases against a circuit in which every phase is drawn, and against closed forms.

use super::tests::stage;
use super::*;
use crate::circuit::{Compiled, Netlist, StateEquations};
use crate::linear::{Complex, StateSpace, Zpk, expm};
use nalgebra::{DMatrix, DVector};

/// Values of one phase of the stages below: inductance, winding, switch and rectifier resistance.
const PHASE: [f64; 4] = [4.7e-6, 0.012, 0.009, 0.006];
const CAPACITANCE: f64 = 220e-6;
const FREQUENCY: f64 = 300e3;

/// A stage with every one of its phases drawn: switch and rectifier of each close in turn, a share of the period later each.
struct Explicit {
    phases: usize,
    duty: f64,
    /// Each constellation of a period with its share of it.
    intervals: Vec<(StateEquations, f64)>,
    /// Change of constellation as each switch opens.
    opening: Vec<(StateEquations, StateEquations)>,
    inputs: DVector<f64>,
}

fn closes(part: &str, on: &dyn Fn(usize) -> bool) -> bool {
    let number = |prefix: &str| part.strip_prefix(prefix).and_then(|k| k.trim().parse::<usize>().ok());
    number("switch ").is_some_and(on) || number("rectifier ").is_some_and(|k| !on(k))
}

impl Explicit {
    fn new(topology: &str, phases: usize, esr: f64, condition: &StageCondition, duty: f64) -> Self {
        let mut n = Netlist::new();
        let input = n.input("input voltage");
        n.input("load current");
        let (supply, ground, output, inner) = (n.node("supply"), n.ground(), n.node("output"), n.node("capacitor"));
        let source = n.voltage_source("source", supply, ground, input);
        let slots = ["L", "RL", "RS", "RR", "C", "ESR", "R"].map(|name| n.slot(name));
        let mut inductors = Vec::new();
        for k in 0..phases {
            let (switch, winding) = (n.node("switch node"), n.node("winding"));
            let (inductor, switched, rectified) = match topology {
                "buck" => ((switch, output), (supply, switch), (ground, switch)),
                "boost" => ((supply, switch), (switch, ground), (switch, output)),
                _ => ((switch, ground), (supply, switch), (output, switch)),
            };
            inductors.push(n.inductor("inductor", inductor.0, winding, slots[0]));
            n.resistor("winding", winding, inductor.1, slots[1]);
            n.switch(&format!("switch {k}"), switched.0, switched.1, slots[2]);
            n.switch(&format!("rectifier {k}"), rectified.0, rectified.1, slots[3]);
        }
        let (plus, minus) = if topology == "buck-boost" { (ground, output) } else { (output, ground) };
        let bank = n.resistor("ESR", plus, inner, slots[5]);
        n.capacitor("capacitor", inner, minus, slots[4]);
        n.resistor("load", plus, minus, slots[6]);
        n.voltage_output("output voltage", plus, minus);
        n.current_output("input current", source);
        n.current_output("bank current", bank);
        for inductor in inductors {
            n.current_output("inductor current", inductor);
        }
        let load = condition.output_voltage / condition.load_current;
        let values = [PHASE[0], PHASE[1], PHASE[2], PHASE[3], CAPACITANCE, esr, load];
        let constellation = |time: f64| {
            let on = |k: usize| (time - k as f64 / phases as f64).rem_euclid(1.0) < duty;
            let compiled = Compiled::new(&n, |part| closes(part, &on), &values).unwrap();
            compiled.equations(&values).unwrap().independent().0
        };
        let mut corners = vec![0.0, 1.0];
        for k in 0..phases {
            let start = k as f64 / phases as f64;
            corners.extend([start, (start + duty).rem_euclid(1.0)]);
        }
        corners.sort_by(f64::total_cmp);
        let pairs = corners.windows(2).filter(|pair| pair[1] - pair[0] > 1e-9);
        let intervals = pairs.map(|pair| (constellation(f64::midpoint(pair[0], pair[1])), pair[1] - pair[0])).collect();
        let opens = |k: usize| k as f64 / phases as f64 + duty;
        let opening = (0..phases).map(|k| (constellation(opens(k) - 1e-6), constellation(opens(k) + 1e-6))).collect();
        let inputs = DVector::from_vec(vec![condition.input_voltage, 0.0]);
        Explicit { phases, duty, intervals, opening, inputs }
    }

    fn mean(&self, part: impl Fn(&StateEquations) -> &DMatrix<f64>) -> DMatrix<f64> {
        let mut sum = part(&self.intervals[0].0) * 0.0;
        for (equations, share) in &self.intervals {
            sum += part(equations) * *share;
        }
        sum
    }

    /// Output voltage from the duty ratio of all phases alike, averaged.
    fn vout_from_duty(&self) -> Zpk {
        let (a, b) = (self.mean(|e| &e.a), self.mean(|e| &e.b));
        let (c, d) = (self.mean(|e| &e.c), self.mean(|e| &e.d));
        let x = a.clone().lu().solve(&-(b * &self.inputs)).unwrap();
        let mut push = DVector::zeros(a.nrows());
        let mut jump = 0.0;
        for (before, after) in &self.opening {
            push += (&before.a - &after.a) * &x + (&before.b - &after.b) * &self.inputs;
            jump +=
                ((before.c.row(0) - after.c.row(0)) * &x)[0] + ((before.d.row(0) - after.d.row(0)) * &self.inputs)[0];
        }
        let _ = d;
        let (b, d) = (DMatrix::from_column_slice(a.nrows(), 1, push.as_slice()), DMatrix::from_element(1, 1, jump));
        let system = StateSpace::new(a, b, c.rows(0, 1).into_owned(), d, &["duty"], &["output voltage"]).unwrap();
        Zpk::from_state_space(&system, 0, 0).unwrap()
    }

    /// Samples of an output row over the exact periodic orbit: value and share of the period.
    fn orbit(&self, rows: &[usize]) -> Vec<(f64, f64)> {
        const PARTS: usize = 40;
        let n = self.intervals[0].0.a.nrows();
        let period = FREQUENCY.recip();
        let steps: Vec<(DMatrix<f64>, DVector<f64>)> = self
            .intervals
            .iter()
            .map(|(e, share)| {
                let time = share * period / PARTS as f64;
                let push = &e.b * &self.inputs;
                let whole = DMatrix::from_fn(n + 1, n + 1, |r, c| match (r < n, c < n) {
                    (true, true) => e.a[(r, c)] * time,
                    (true, false) => push[r] * time,
                    _ => 0.0,
                });
                let whole = expm(&whole).unwrap();
                (whole.view((0, 0), (n, n)).into_owned(), whole.view((0, n), (n, 1)).column(0).into_owned())
            })
            .collect();
        let (mut map, mut offset) = (DMatrix::identity(n, n), DVector::zeros(n));
        for (transition, push) in steps.iter().flat_map(|step| std::iter::repeat_n(step, PARTS)) {
            (map, offset) = (transition * map, transition * offset + push);
        }
        let mut x = (DMatrix::identity(n, n) - map).lu().solve(&offset).unwrap();
        let mut samples = Vec::new();
        for ((transition, push), (e, share)) in steps.iter().zip(&self.intervals) {
            for k in 0..=PARTS {
                let value =
                    rows.iter().map(|row| (e.c.row(*row) * &x)[0] + (e.d.row(*row) * &self.inputs)[0]).sum::<f64>();
                let weight = if k == 0 || k == PARTS { 0.5 } else { 1.0 };
                samples.push((value, weight * share / PARTS as f64));
                if k < PARTS {
                    x = transition * x + push;
                }
            }
        }
        samples
    }
}

fn further(point: &OperatingPoint, key: &str) -> f64 {
    match point.further.iter().find(|figure| figure.key == key).unwrap().value {
        FurtherValue::Number(value, _) => value,
        FurtherValue::Word(word) => panic!("{word} is no number"),
    }
}

fn swing(samples: &[(f64, f64)]) -> f64 {
    let values = || samples.iter().map(|(value, _)| *value);
    values().fold(f64::NEG_INFINITY, f64::max) - values().fold(f64::INFINITY, f64::min)
}

fn rms(samples: &[(f64, f64)]) -> f64 {
    samples.iter().map(|(value, share)| value * value * share).sum::<f64>().sqrt()
}

fn interleaved(topology: &str, phases: usize, esr: f64, output: f64) -> Stage {
    let entries = [
        ("stage.output.voltage", output),
        ("stage.phases", phases as f64),
        ("stage.inductor.inductance", PHASE[0]),
        ("stage.inductor.resistance", PHASE[1]),
        ("stage.switch.resistance", PHASE[2]),
        ("stage.synchronous.resistance", PHASE[3]),
        ("stage.bank.1.capacitance", CAPACITANCE),
        ("stage.bank.1.esr", esr),
        ("stage.switching-frequency", FREQUENCY),
    ];
    stage(topology, &entries, &[("stage.rectifier", "synchronous")])
}

/// Topology, input and output voltage.
const CASES: [(&str, f64, f64); 3] = [("buck", 12.0, 3.3), ("boost", 9.0, 24.0), ("buck-boost", 12.0, 15.0)];

/// The plant of N phases is that of the circuit with every phase drawn: exact without ESR, and with one to the share of it that
/// the other phases drop.
#[test]
fn the_plant_is_that_of_a_circuit_with_every_phase_drawn() {
    for (topology, input_voltage, output_voltage) in CASES {
        for phases in [1, 2, 3, 4] {
            for (esr, within) in [(0.0, 1e-8), (2e-3, if topology == "buck" || phases == 1 { 1e-8 } else { 5e-2 })] {
                let stage = interleaved(topology, phases, esr, output_voltage);
                let condition = StageCondition { input_voltage, load_current: 6.0, output_voltage };
                let model = stage.averaged(&condition).unwrap();
                let explicit = Explicit::new(topology, phases, esr, &condition, model.operating_point.duty);
                let (plant, expected) = (Zpk::from_state_space(&model.stage, 0, 0).unwrap(), explicit.vout_from_duty());
                for f in [10.0, 1e3, 5e3, 2e4, 1e5] {
                    let (one, other): (Complex, Complex) = (plant.at_hz(f), expected.at_hz(f));
                    assert!((one / other - 1.0).norm() < within, "{topology} {phases} {esr}: {one} {other} at {f} Hz");
                }
            }
        }
    }
}

/// Ripple of the sum, input and bank current against the exact periodic orbit of the circuit with every phase drawn.
#[test]
fn ripple_is_that_of_the_sum_of_the_phases() {
    for (topology, input_voltage, output_voltage) in CASES {
        for phases in [2, 3, 4] {
            let stage = interleaved(topology, phases, 0.0, output_voltage);
            let condition = StageCondition { input_voltage, load_current: 12.0, output_voltage };
            let point = stage.averaged(&condition).unwrap().operating_point;
            let explicit = Explicit::new(topology, phases, 0.0, &condition, point.duty);
            let inductors: Vec<usize> = (3..3 + explicit.phases).collect();
            let one = explicit.orbit(&[3]);
            let scale = swing(&one);
            let close = |what: &str, value: f64, expected: f64, scale: f64| {
                assert!(
                    (value - expected).abs() < 0.02 * scale,
                    "{topology} × {phases} {what}: {value} against {expected}"
                );
            };
            close("phase", point.inductors[0].current.ripple, scale, scale);
            close("sum", further(&point, "phases-together-ripple"), swing(&explicit.orbit(&inductors)), scale);
            close("phase RMS", point.inductors[0].current.rms, rms(&one), rms(&one));
            let bank = rms(&explicit.orbit(&[2]));
            close("bank", point.output_bank_rms, bank, bank.max(scale / 4.0));
            let input = swing(&explicit.orbit(&[1]));
            close("input", further(&point, "input-ripple"), input, input);
            assert!((explicit.duty - point.duty).abs() < 1e-15);
        }
    }
}

/// Ripple of the sum of N lossless buck phases over that of one: with m the whole part of N·D,
/// N·(D − m/N)·((m + 1)/N − D) / (D·(1 − D)) (common closed form of ripple cancellation; from memory), and none at D = m/N.
#[test]
fn ripple_cancels_as_the_closed_form_says() {
    for phases in [2_usize, 3, 4, 6] {
        for output_voltage in [0.9, 1.8, 3.3, 4.0, 5.0, 6.0, 7.2, 9.0, 10.8] {
            let entries = [
                ("stage.output.voltage", output_voltage),
                ("stage.phases", phases as f64),
                ("stage.inductor.inductance", 1e-6),
                ("stage.bank.1.capacitance", 1e-2),
            ];
            let stage = stage("buck", &entries, &[("stage.rectifier", "synchronous")]);
            let condition = StageCondition { input_voltage: 12.0, load_current: 20.0, output_voltage };
            let point = stage.averaged(&condition).unwrap().operating_point;
            let (n, d) = (phases as f64, output_voltage / 12.0);
            let m = (n * d + 1e-9).floor();
            let expected = n * (d - m / n) * ((m + 1.0) / n - d) / (d * (1.0 - d));
            let ratio = further(&point, "phases-together-ripple") / point.inductors[0].current.ripple;
            assert!((ratio - expected).abs() < 1e-6, "{phases} phases at D {d}: {ratio} against {expected}");
        }
    }
}

/// A number of phases that is not whole is named at its entry; below one it never gets here.
#[test]
fn half_a_phase_is_a_finding() {
    let mut values = crate::quantity::Values::new();
    values.set("stage.phases", 1.5).unwrap();
    let findings = Stage::from_values(&values, &crate::quantity::Choices::new()).unwrap_err();
    assert_eq!(findings.len(), 1);
    assert_eq!(findings[0].place, "stage.phases");
    assert!(findings[0].message.contains("1.5 is not a whole number") && findings[0].hint.is_some());
    assert!(phases::PHASES.check(0.0).is_err() && phases::PHASES.check(17.0).is_err());
}
