//! Tests of discontinuous conduction: exact derivatives, the guarded solver beside Newton's, a stage of two inductors.

use super::cell::SwitchedCell;
use super::operating_point::Solution;
use super::pulse_point::Found;
use super::registry::{find, registry};
use super::stage::{Intervals, Stage, StageCondition};
use super::topology::{IN_TURN, Reach};
use crate::circuit::{Compiled, Netlist};
use crate::quantity::{Choices, Values};
use nalgebra::DVector;

/// The default stage of a topology with some losses, and a condition in continuous conduction.
fn stage(topology: &str, chosen: &[(&str, &str)]) -> (Stage, StageCondition) {
    let (mut values, mut choices) = (Values::new(), Choices::new());
    values.set("stage.source.resistance", 0.02).unwrap();
    choices.set("stage.topology", topology);
    choices.set("stage.input-capacitor", "fitted");
    choices.set("stage.bank", "2");
    for (path, key) in chosen {
        choices.set(path, key);
    }
    let reach = find(topology).unwrap().reach;
    let output = if reach == Reach::BelowInput { 5.0 } else { 24.0 };
    values.set("stage.output.voltage", output).unwrap();
    let condition = StageCondition { input_voltage: 12.0, load_current: 3.0, output_voltage: output };
    (Stage::from_values(&values, &choices).unwrap(), condition)
}

/// A point of a stage whose current rests, as the solver found it.
fn resting(stage: &Stage, condition: &StageCondition) -> Solution {
    let solution = stage.solve(condition).unwrap();
    assert!(solution.pulse.is_some());
    solution
}

/// The linear model against differences of the averaged equations themselves.
#[test]
fn derivatives_are_exact() {
    for topology in registry() {
        let (stage, nominal) = stage(topology.key, &[]);
        let load_current = 0.2 * stage.boundary_load(&nominal).unwrap();
        let solution = resting(&stage, &StageCondition { load_current, ..nominal });
        let period = stage.switching_frequency.recip();
        let model = stage.linearise(&solution).unwrap();
        let rows = stage.averaged_rows();
        // Rates, outputs, switched current, slope difference and slope at displaced states, inputs and duty ratio.
        let at = |x: &DVector<f64>, inputs: &DVector<f64>, duty: f64| {
            let i = Intervals { inputs: inputs.clone(), ..solution.intervals.clone() };
            let pulse = i.pulse(period, duty, x).unwrap();
            let [rates, outputs] = i.pulse_averages(period, duty, &pulse, &rows);
            let slope =
                |e: &crate::circuit::StateEquations| (&i.cell.c * (&e.a * &pulse.conducting + &e.b * inputs))[0];
            let own = [(&i.cell.c * x)[0], slope(&i.on) - slope(&i.off), pulse.on_slope];
            assert!((slope(&i.on) / pulse.on_slope - 1.0).abs() < 1e-12);
            (rates.value, DVector::from_iterator(8, outputs.value.iter().copied().chain(own)))
        };
        let (x, u, d) = (&solution.x, &solution.intervals.inputs, solution.duty);
        let compare = |up: (DVector<f64>, DVector<f64>),
                       down: (DVector<f64>, DVector<f64>),
                       step: f64,
                       column: [DVector<f64>; 2]| {
            for (found, wanted) in
                [((up.0 - down.0) / (2.0 * step), &column[0]), ((up.1 - down.1) / (2.0 * step), &column[1])]
            {
                for (f, w) in found.iter().zip(wanted.iter()) {
                    assert!((f - w).abs() <= 1e-5 * wanted.amax(), "{}: {f} against {w}", topology.key);
                }
            }
        };
        for k in 0..x.len() {
            let step = 1e-6 * x[k].abs().max(x.amax() * 1e-3);
            let by = |sign: f64| {
                let mut x = x.clone();
                x[k] += sign * step;
                x
            };
            let column = [model.a.column(k).into_owned(), model.c.column(k).into_owned()];
            compare(at(&by(1.0), u, d), at(&by(-1.0), u, d), step, column);
        }
        for k in 0..2 {
            let by = |sign: f64| {
                let mut u = u.clone();
                u[k] += sign * 1e-5;
                u
            };
            let column = [model.b.column(k + 1).into_owned(), model.d.column(k + 1).into_owned()];
            compare(at(x, &by(1.0), d), at(x, &by(-1.0), d), 1e-5, column);
        }
        let step = 1e-6 * d;
        let column = [model.b.column(0).into_owned(), model.d.column(0).into_owned()];
        compare(at(x, u, d + step), at(x, u, d - step), step, column);
    }
}

/// Newton's steps and the brackets find the same point, down to loads of nothing, for every topology, rectifier that blocks and
/// load kind.
#[test]
fn brackets_and_newton_find_the_same_point() {
    for topology in registry() {
        for (rectifier, load) in [("diode", "resistor"), ("emulated", "current"), ("diode", "power")] {
            let chosen = [("stage.rectifier", rectifier), ("stage.bank", "1"), ("stage.load", load)];
            let (stage, nominal) = stage(topology.key, &chosen);
            let boundary = stage.boundary_load(&nominal).unwrap();
            let near = stage.solve(&StageCondition { load_current: boundary, ..nominal }).unwrap().duty;
            for share in [0.999, 0.3, 1e-2, 1e-4, 1e-8, 1e-12] {
                let solution = resting(&stage, &StageCondition { load_current: share * boundary, ..nominal });
                let (target, row) = (nominal.output_voltage, stage.rows.output_voltage);
                let loaded = solution.intervals.with_resistor();
                let bracketed = loaded.bracket_pulse(near, stage.switching_frequency.recip(), target, row).unwrap();
                let off = (bracketed.duty / solution.duty - 1.0).abs();
                let mut tolerance: f64 = if load == "resistor" { 1e-9 } else { 1e-7 };
                if stage.second_inductance > 0.0 {
                    // The current round through two inductors hangs on what rounding leaves across their windings: it does not
                    // shrink with the load.
                    tolerance = tolerance.max(1e-15 / share);
                }
                if stage.magnetising > 0.0 {
                    // What rounding leaves between the windings does not shrink with the load either.
                    tolerance = tolerance.max(1e-20 / share);
                }
                assert!(off < tolerance, "{} {load} {share}: {} and {}", topology.key, bracketed.duty, solution.duty);
            }
        }
    }
}

/// Load kinds share the operating point in discontinuous conduction too: constant power is its tangent. (A resistor takes a little
/// more while the pulse lifts the output by its ESR step, less at rest.)
#[test]
fn load_kinds_share_the_operating_point() {
    for topology in registry() {
        let duties: Vec<f64> = ["resistor", "current", "power"]
            .map(|kind| {
                let (stage, nominal) = stage(topology.key, &[("stage.load", kind)]);
                let load_current = 0.05;
                resting(&stage, &StageCondition { load_current, ..nominal }).duty
            })
            .into();
        for duty in &duties {
            assert!((duty / duties[0] - 1.0).abs() < 1e-6, "{}: {duties:?}", topology.key);
        }
    }
}

/// A stage of two inductors, drawn by hand: supply – L1 – switch node – C1 – second node, L2 from ground to the second node, the
/// rectifier from there to the output. Without losses.
fn two_inductors(l: [f64; 2], load: f64, vin: f64) -> (Intervals, [usize; 2]) {
    let mut n = Netlist::new();
    let (g, supply, a, b, out) = (n.ground(), n.node("supply"), n.node("a"), n.node("b"), n.node("out"));
    let (u, _, drop) = (n.input("input voltage"), n.input("load current"), n.input("drop"));
    let names = ["l1", "l2", "c1", "c2", "load", "zero"];
    let s = names.map(|name| n.slot(name));
    n.voltage_source("source", supply, g, u);
    let first = n.inductor("L1", supply, a, s[0]);
    let switch = n.switch("switch", a, g, s[5]);
    n.capacitor("C1", a, b, s[2]);
    n.inductor("L2", g, b, s[1]);
    let rectifier = n.diode("rectifier", b, out, s[5], drop);
    n.capacitor("C2", out, g, s[3]);
    n.resistor("load", out, g, s[4]);
    n.voltage_output("output voltage", out, g);
    n.current_output("rectifier current", rectifier);
    n.current_output("inductor current", first);
    n.current_output("switch current", switch);
    let values = [l[0], l[1], 10e-6, 470e-6, load, 0.0];
    let equations = |closed: &str| Compiled::new(&n, |p| p == closed, &values).unwrap().equations(&values).unwrap();
    let (on, off) = (equations("switch"), equations("rectifier"));
    let cell = SwitchedCell::new(equations("neither"), (&on, 3), (&off, 1)).unwrap();
    // The switch carries the sum of both currents, as the rectifier does.
    assert!((cell.sense - 1.0).abs() < 1e-12);
    let inputs = DVector::from_vec(vec![vin, 0.0, 0.0]);
    (Intervals { on, off, cell, sets: &IN_TURN[0], natural: None, inputs, to_resistor: (0, 0.0) }, [0, 2])
}

/// In a stage of two inductors the diode's rest ties both currents: what stops is their sum, over L1 ∥ L2. Such a stage converts as
/// the buck-boost does with that inductance: M = D/√K, K = 2·(L1 ∥ L2)/(R·T), Gd0 = V/D (Erickson & Maksimovic 3rd ed., problem 5
/// of ch. 5 and Table 15.3; memory).
#[test]
fn two_inductors_rest_together() {
    let (l, vin, vout, period) = ([47e-6, 22e-6], 12.0, 9.0, 5e-6);
    let parallel = l[0] * l[1] / (l[0] + l[1]);
    let m = vout / vin;
    let boundary_duty: f64 = m / (1.0 + m);
    let critical = 2.0 * parallel / (period * (1.0 - boundary_duty).powi(2));
    for share in [1.000_001, 3.0, 1e3, 1e6] {
        let load = critical * share;
        let (i, [row, inductor]) = two_inductors(l, load, vin);
        for (k, inductance) in l.iter().enumerate() {
            let state = [0, 2][k];
            assert!((i.cell.c[state] - 1.0).abs() < 1e-12);
            assert!((i.cell.v[state] - parallel / inductance).abs() < 1e-12);
        }
        let (duty, x) = i.solve_duty(vout, row).unwrap();
        let found = i.solve_pulse(&Found { duty, x, pulse: None }, period, vout, row).unwrap();
        let k = 2.0 * parallel / (load * period);
        assert!((found.duty / (m * k.sqrt()) - 1.0).abs() < 1e-6, "{} against {}", found.duty, m * k.sqrt());
        let bracketed = i.bracket_pulse(duty, period, vout, row).unwrap();
        assert!((bracketed.duty / found.duty - 1.0).abs() < 1e-9);
        let pulse = found.pulse.clone().unwrap();
        assert!((pulse.second_duty / (found.duty / m) - 1.0).abs() < 1e-6);
        let duty = found.duty;
        let model = i
            .linearise_pulse(
                &Solution::from_found(i.clone(), found),
                &pulse,
                &[row, inductor, inductor, row, row],
                period,
            )
            .unwrap();
        let gain = model.dc_gain(0, 0).unwrap();
        assert!((gain / (vout / duty) - 1.0).abs() < 1e-6, "{gain} against {}", vout / duty);
        assert_eq!(model.order(), 4);
        // Near the boundary both modes hold the same duty ratio.
        assert!(share > 2.0 || (duty / boundary_duty - 1.0).abs() < 1e-6);
    }
}
