//! Brute force: a small sine in series with the compensator's input while the converter runs, period by period, and the component that
//! returns at its frequency, against the linearised orbit.
//!
//! The sine is two states of an oscillator, and the components are read by two resonators fed by the signals: their states are exact
//! Fourier integrals, so nothing is sampled. Nothing here knows what the other side does to perturb an orbit.

use super::super::{Goal, Orbit, Quantity, Reader, Response, Stability, Start, SwitchedSystem, inputs};
use super::flow::whole;
use super::run::machine;
use super::tests::Case;
use super::*;
use crate::converter::Conduction;
use crate::linear::Complex;
use nalgebra::DMatrix;
use std::f64::consts::TAU;

/// States added: an oscillator, and a resonator for each of two signals.
const ADDED: usize = 6;

/// The system with a sine added to its injected input, and resonators fed by the output and by what the compensator sees.
fn listened(system: &SwitchedSystem, omega: f64) -> SwitchedSystem {
    let mut system = system.clone();
    let (n, input) = (system.order(), system.input(inputs::INJECTED).unwrap());
    for piece in &mut system.pieces {
        let mut a = piece.a.clone().resize(n + ADDED, n + ADDED, 0.0);
        let mut b = piece.b.clone().resize_vertically(n + ADDED, 0.0);
        let mut c = piece.c.clone().resize_horizontally(n + ADDED, 0.0);
        a.view_mut((0, n), (n, 1)).copy_from(&piece.b.column(input));
        c.column_mut(n).copy_from(&piece.d.column(input));
        (a[(n, n + 1)], a[(n + 1, n)]) = (omega, -omega);
        for (k, injected) in [(n + 2, 0.0), (n + 4, 1.0)] {
            (a[(k, k + 1)], a[(k + 1, k)]) = (-omega, omega);
            let row = c.row(system.places.stage.output_voltage).into_owned();
            let direct = piece.d.row(system.places.stage.output_voltage).into_owned();
            let sum = a.row(k) + row;
            a.row_mut(k).copy_from(&sum);
            a[(k, n)] += injected;
            b.row_mut(k).copy_from(&direct);
        }
        (piece.a, piece.b, piece.c) = (a, b, c);
    }
    let mut projector = DMatrix::identity(n + ADDED, n + ADDED);
    projector.view_mut((0, 0), (n, n)).copy_from(&system.rest_projector);
    system.rest_projector = projector;
    system.rest = system.rest.map(|row| row.resize_horizontally(n + ADDED, 0.0));
    system.state_names.extend((0..ADDED).map(|k| format!("listener {k}")));
    system
}

/// The loop gain that is read at `turns` turns of the sine in `window` periods, after so many periods of settling.
fn heard(case: &Case, orbit: &Orbit, (turns, window): (usize, usize), settling: usize) -> Complex {
    let omega = TAU * turns as f64 / (window as f64 * case.system.period_s);
    let system = listened(&case.system, omega);
    let n = case.system.order();
    let mut start = orbit.starts[0].clone().resize_vertically(n + ADDED, 0.0);
    // Small enough for what is not linear, large enough for rounding.
    start[n + 1] = 1e-4 * case.point.output_voltage;
    let mut scenario = case.scenario(settling + window);
    scenario.amplifiers = Amplifiers::default();
    scenario.start = (start, orbit.phases.last().unwrap().configuration);
    let mut machine = machine(&system, &scenario);
    let mut read = |periods: usize| {
        for _ in 0..periods {
            machine.period().unwrap();
        }
        let (state, _) = machine.state();
        let turn = Complex::from_polar(1.0, -omega * machine.time_s());
        [n + 2, n + 4].map(|k| Complex::new(state[k], state[k + 1]) * turn)
    };
    let (before, after) = (read(settling), read(window));
    -(after[0] - before[0]) / (after[1] - before[1])
}

/// Frequencies as turns in so many periods: from fs/500 to 0.48 fs.
const FREQUENCIES: [(usize, usize); 8] = [(1, 500), (1, 200), (1, 50), (1, 20), (1, 10), (1, 5), (7, 20), (12, 25)];

fn agree(topology: &str, mode: &str, rectifier: &str, load: f64) {
    let title = format!("{topology} {mode} {rectifier} {load} A");
    // In voltage mode the loop crosses below the LC resonance, where there is one.
    let (r2, c1) = match (mode, rectifier) {
        ("voltage", "synchronous") => (10.0, 1e-6),
        ("voltage", _) => (300.0, 30e-9),
        _ => (1e3, 10e-9),
    };
    let output = if topology == "buck" { 3.3 } else { 24.0 };
    let case = Case::new(
        topology,
        &[
            ("stage.rectifier", rectifier),
            ("control.mode", mode),
            ("compensator.type", "2"),
            ("stage.input-capacitor", "none"),
        ],
        &[
            ("stage.output.voltage", output),
            ("stage.input.nominal", 12.0),
            ("stage.load.nominal", load),
            ("compensator.reference", 2.5),
            ("compensator.divider.upper", 10e3 * (output / 2.5 - 1.0)),
            ("compensator.divider.lower", 10e3),
            ("compensator.r2", r2),
            ("compensator.c1", c1),
            ("compensator.c2", 1e-9),
            ("stage.inductor.inductance", if rectifier == "diode" { 2e-6 } else { 10e-6 }),
            ("stage.bank.1.capacitance", 22e-6),
            ("stage.bank.1.count", 1.0),
            ("stage.bank.1.esr", 0.02),
            ("control.duty.greatest", 1.0),
        ],
    );
    let orbit =
        Orbit::find(&case.system, Start::of(&case.point), Goal::AsDriven).unwrap_or_else(|e| panic!("{title}: {e:?}"));
    assert_eq!(orbit.conduction == Conduction::Discontinuous, rectifier == "diode", "{title}");
    let response = Response::new(orbit.clone()).unwrap();
    let slowest = Stability::new(&response).unwrap().multipliers.iter().map(|m| m.norm()).fold(0.0, f64::max);
    assert!(slowest < 1.0, "{title} is not stable: {slowest}");
    // Until what the sine's begin set off has died to some millionths.
    let settling = whole((1e-5_f64.ln() / slowest.ln()).ceil().min(8000.0));
    let mut reader = Reader::new(&response, Quantity::LoopGain).unwrap();
    for frequency in FREQUENCIES {
        let f = frequency.0 as f64 / (frequency.1 as f64 * case.system.period_s);
        let (exact, heard) = (reader.at(f).unwrap(), heard(&case, &orbit, frequency, settling));
        let ratio = heard / exact;
        let (db, degrees) = (20.0 * ratio.norm().log10(), ratio.arg().to_degrees());
        assert!(db.abs() < 0.05 && degrees.abs() < 0.3, "{title} at {f} Hz: {db} dB {degrees}°, exact {exact}");
    }
}

#[test]
fn a_sine_in_the_running_converter_returns_as_the_linearised_orbit_says() {
    for topology in ["buck", "boost", "flyback"] {
        for mode in ["voltage", "peak-current"] {
            agree(topology, mode, "synchronous", 2.0);
            agree(topology, mode, "diode", 0.2);
        }
    }
}
