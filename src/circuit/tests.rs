//! Tests of netlist extraction against hand-written equations.

use super::*;
use nalgebra::DMatrix;

fn close(a: &DMatrix<f64>, b: &[f64]) {
    let b = DMatrix::from_row_slice(a.nrows(), a.ncols(), b);
    let scale = b.amax();
    assert!((a - &b).amax() <= 1e-11 * scale, "{a} against {b}");
}

/// A boost's interval equations written by hand (any text, e.g. Erickson & Maksimovic 3rd ed., 7.3; memory).
#[test]
fn boost_intervals_match_hand_written_equations() {
    let mut n = Netlist::new();
    let (g, vin, mid, sw, out, cap) =
        (n.ground(), n.node("in"), n.node("mid"), n.node("sw"), n.node("out"), n.node("cap"));
    let (uv, ud) = (n.input("vin"), n.input("drop"));
    let names = ["l", "rl", "ron", "rd", "c", "esr", "load"];
    let s: Vec<Slot> = names.iter().map(|name| n.slot(name)).collect();
    n.voltage_source("Vin", vin, g, uv);
    n.inductor("L", vin, mid, s[0]);
    n.resistor("RL", mid, sw, s[1]);
    n.switch("Q", sw, g, s[2]);
    n.diode("D", sw, out, s[3], ud);
    n.capacitor("C", out, cap, s[4]);
    n.resistor("ESR", cap, g, s[5]);
    n.resistor("load", out, g, s[6]);
    n.voltage_output("vout", out, g);
    let v = [10e-6, 0.02, 0.01, 0.03, 100e-6, 0.005, 8.0];
    let (l, rl, ron, rd, c, esr, r) = (v[0], v[1], v[2], v[3], v[4], v[5], v[6]);
    let on = Compiled::new(&n, |p| p == "Q", &v).unwrap().equations(&v).unwrap();
    let off = Compiled::new(&n, |p| p == "D", &v).unwrap().equations(&v).unwrap();
    let k = r / (r + esr);
    close(&on.a, &[-(rl + ron) / l, 0.0, 0.0, -1.0 / (c * (r + esr))]);
    close(&on.b, &[1.0 / l, 0.0, 0.0, 0.0]);
    close(&on.c, &[0.0, k]);
    close(&off.a, &[-(rl + rd + k * esr) / l, -k / l, k / c, -1.0 / (c * (r + esr))]);
    close(&off.b, &[1.0 / l, -1.0 / l, 0.0, 0.0]);
    close(&off.c, &[k * esr, k]);
}

/// Both switches of a boost open: the inductor is cut off, its current is constrained to zero and stays there.
#[test]
fn cut_off_inductor_is_constrained() {
    let mut n = Netlist::new();
    let (g, a, sw) = (n.ground(), n.node("a"), n.node("sw"));
    let u = n.input("vin");
    let (l, r) = (n.slot("l"), n.slot("r"));
    n.voltage_source("V", a, g, u);
    n.inductor("L", a, sw, l);
    n.switch("Q", sw, g, r);
    n.voltage_output("v", sw, g);
    let eq = Compiled::new(&n, |_| false, &[1e-6, 0.1]).unwrap().equations(&[1e-6, 0.1]).unwrap();
    let p = eq.projector.clone().unwrap();
    close(&p, &[0.0]);
    close(&eq.a, &[0.0]);
    // The switch node floats up to the input: no voltage across the idle inductor.
    close(&eq.d, &[1.0]);
    assert_eq!(eq.independent().0.a.nrows(), 0);
}

/// A source that copies the current of a branch: with the branch's resistance zero, too, where no voltage could tell the current.
#[test]
fn a_copied_current_follows_its_branch() {
    let mut n = Netlist::new();
    let (g, a, b, out) = (n.ground(), n.node("a"), n.node("b"), n.node("out"));
    let (u, w) = (n.input("v"), n.input("w"));
    let (r, straight, gain, load) = (n.slot("r"), n.slot("straight"), n.slot("gain"), n.slot("load"));
    n.voltage_source("V", a, g, u);
    n.resistor("R", a, b, r);
    let inner = n.node("inner");
    let branch = n.resistor("straight", b, inner, straight);
    n.voltage_source("W", inner, g, w);
    let copy = n.copied_current("copy", out, g, gain, branch);
    n.resistor("load", out, g, load);
    n.voltage_output("v", out, g);
    n.current_output("i", copy);
    for straight in [0.0, 30.0] {
        let v = [100.0, straight, 2.5, 40.0];
        let eq = Compiled::new(&n, |_| true, &v).unwrap().equations(&v).unwrap();
        let current = 2.5 / (100.0 + straight);
        close(&eq.d, &[-40.0 * current, 40.0 * current, current, -current]);
    }
}

/// Two capacitors in parallel act as one of the summed capacitance.
#[test]
fn capacitor_loop_acts_as_their_sum() {
    let mut n = Netlist::new();
    let (g, a) = (n.ground(), n.node("a"));
    let u = n.input("i");
    let (c1, c2, r) = (n.slot("c1"), n.slot("c2"), n.slot("r"));
    n.current_source("I", g, a, u);
    n.capacitor("C1", a, g, c1);
    n.capacitor("C2", a, g, c2);
    n.resistor("R", a, g, r);
    n.voltage_output("v", a, g);
    let v = [3e-6, 7e-6, 50.0];
    let eq = Compiled::new(&n, |_| true, &v).unwrap().equations(&v).unwrap();
    let (reduced, basis) = eq.independent();
    close(&reduced.a, &[-1.0 / (50.0 * 10e-6)]);
    close(&reduced.b, &[1.0 / 10e-6]);
    close(&reduced.c, &[1.0]);
    close(&basis, &[1.0, 1.0]);
}

/// A capacitor from a source into a resistor beside another capacitor straight across the source.
#[test]
fn source_capacitor_loop_is_legal_unless_its_current_is_wanted() {
    let mut n = Netlist::new();
    let (g, a, b) = (n.ground(), n.node("a"), n.node("b"));
    let u = n.input("v");
    let (c1, c2, r) = (n.slot("c1"), n.slot("c2"), n.slot("r"));
    let source = n.voltage_source("V", a, g, u);
    n.capacitor("C1", a, b, c1);
    n.capacitor("C2", b, g, c2);
    n.resistor("R", b, g, r);
    n.voltage_output("v", b, g);
    let v = [1e-6, 3e-6, 1000.0];
    let eq = Compiled::new(&n, |_| true, &v).unwrap().equations(&v).unwrap().independent().0;
    // H(s) = s·R·C1/(1 + s·R·(C1 + C2)): pole at −1/(R(C1+C2)), high-frequency gain C1/(C1+C2).
    close(&eq.a, &[-1.0 / (1000.0 * 4e-6)]);
    assert!((eq.d[(0, 0)] - 0.25).abs() < 1e-12);
    assert!((eq.d[(0, 0)] - (&eq.c * eq.a.clone().try_inverse().unwrap() * &eq.b)[(0, 0)]).abs() < 1e-12);
    n.current_output("i", source);
    let err = Compiled::new(&n, |_| true, &v).unwrap().equations(&v).unwrap_err();
    assert_eq!(err, CircuitError::Improper { outputs: vec!["i".to_owned()] });
}

#[test]
fn clashing_sources_and_floating_nodes_are_named() {
    let mut n = Netlist::new();
    let (g, a) = (n.ground(), n.node("a"));
    let (u, w) = (n.input("v"), n.input("w"));
    n.voltage_source("V1", a, g, u);
    n.voltage_source("V2", a, g, w);
    let Err(CircuitError::SourcesClash { parts }) = Compiled::new(&n, |_| true, &[]).map(|_| ()) else { panic!() };
    assert!(parts.contains(&"V1".to_owned()) && parts.contains(&"V2".to_owned()), "{parts:?}");

    let mut n = Netlist::new();
    let (g, a, b) = (n.ground(), n.node("a"), n.node("lonely"));
    let (u, r) = (n.input("v"), n.slot("r"));
    n.voltage_source("V1", a, g, u);
    n.resistor("R1", b, b, r);
    assert!(matches!(Compiled::new(&n, |_| true, &[1.0]), Err(CircuitError::Floating { .. })));
}

/// Transformer: v2 = n·v1, and a load on the second winding looks like R/n² at the first.
#[test]
fn transformer_reflects_impedance() {
    let mut n = Netlist::new();
    let (g, a, b) = (n.ground(), n.node("a"), n.node("b"));
    let u = n.input("v");
    let (ratio, r) = (n.slot("ratio"), n.slot("r"));
    let source = n.voltage_source("V", a, g, u);
    n.transformer("T", (a, g), (b, g), ratio);
    n.resistor("R", b, g, r);
    n.voltage_output("v2", b, g);
    n.current_output("i1", source);
    let v = [3.0, 9.0];
    let eq = Compiled::new(&n, |_| true, &v).unwrap().equations(&v).unwrap();
    close(&eq.d, &[3.0, -1.0]);
}

/// Coupled inductors in series act as L1 + L2 ± 2M, M = k·√(L1·L2) (any circuits text; memory); a coupling of one is refused.
#[test]
fn coupled_inductors_in_series_add_their_mutual_inductance() {
    let series = |k: f64| {
        let mut n = Netlist::new();
        let (g, a, b, c) = (n.ground(), n.node("a"), n.node("b"), n.node("c"));
        let u = n.input("v");
        let s: Vec<Slot> = ["l1", "l2", "k", "r"].iter().map(|name| n.slot(name)).collect();
        n.voltage_source("V", a, g, u);
        let first = n.inductor("L1", a, b, s[0]);
        let second = n.inductor("L2", b, c, s[1]);
        n.couple(first, second, s[2]);
        n.resistor("R", c, g, s[3]);
        let values = [4e-6, 9e-6, k, 2.0];
        Compiled::new(&n, |_| true, &values).and_then(|c| c.equations(&values)).map(|e| e.independent().0)
    };
    for k in [0.0, 0.5, -0.5] {
        let inductance = 13e-6 + 2.0 * k * 6e-6;
        let eq = series(k).unwrap();
        close(&eq.a, &[-2.0 / inductance]);
        close(&eq.b, &[1.0 / inductance]);
    }
    assert!(matches!(series(1.0), Err(CircuitError::Degenerate { .. })));
}

/// Replay at other values equals a fresh elimination there.
#[test]
fn replay_equals_fresh_elimination() {
    let mut n = Netlist::new();
    let (g, a, b, c) = (n.ground(), n.node("a"), n.node("b"), n.node("c"));
    let u = n.input("v");
    let s: Vec<Slot> = ["r1", "r2", "r3", "c1", "c2", "gm", "l"].iter().map(|name| n.slot(name)).collect();
    n.voltage_source("V", a, g, u);
    n.resistor("R1", a, b, s[0]);
    n.resistor("R2", b, g, s[1]);
    n.controlled_current("G", g, c, s[5], b, g);
    n.resistor("R3", c, g, s[2]);
    n.capacitor("C1", b, c, s[3]);
    n.capacitor("C2", c, g, s[4]);
    n.inductor("L", a, c, s[6]);
    n.voltage_output("v", c, g);
    let v = [1e3, 2e3, 5e4, 1e-9, 2e-9, 1e-3, 1e-6];
    let base = Compiled::new(&n, |_| true, &v).unwrap();
    for (k, factor) in [0.1, 0.3, 3.0, 10.0, 0.2, 7.0, 1e5].into_iter().enumerate() {
        let mut w = v;
        w[k] *= factor;
        let replayed = base.equations(&w).unwrap();
        let fresh = Compiled::new(&n, |_| true, &w).unwrap().equations(&w).unwrap();
        close(&replayed.a, fresh.a.transpose().as_slice());
        close(&replayed.c, fresh.c.transpose().as_slice());
    }
}
