//! A pure delay as a rational all-pass, for poles and time responses.
//!
//! The diagonal Padé approximant of `exp(−s·delay)` is a lossless ladder seen through a resistor: with `z = s·delay/2`,
//! `tanh z = 1/(1/z + 1/(3/z + 1/(5/z + …)))` cut off after n elements, and `exp(−2z) = (1 − tanh z)/(1 + tanh z)`. The ladder's inductor
//! currents and capacitor voltages are the states, scaled so that every state holds energy in the same measure; no polynomial
//! is formed.
//!
//! Valid for: the phase errs by about `(n!)²/((2n)!·(2n+1)!)·(ω·delay)^(2n+1)` rad and the gain not at all. For order 3 that is under
//! 0.01° at half the switching frequency for a delay of 0.3 periods, 0.001 rad at ω·delay = 1.95.
//!
//! Source: Lambert's continued fraction of tanh (from memory); the tests check the result against the Padé coefficients.

use std::f64::consts::TAU;

use nalgebra::DMatrix;

use super::{LinearError, StateSpace};

/// Highest order offered: beyond it the states only chase rounding.
const HIGHEST_ORDER: usize = 12;

/// `exp(−s·delay)` [delay in s] as a stable all-pass of the given order, from input `u` to output `y`. A delay of zero has no states.
///
/// # Errors
/// [`LinearError::NotFinite`] for a delay that is not finite, [`LinearError::Shape`] for a negative one or an order of 0 or above 12.
pub fn pade_delay(delay_s: f64, order: usize) -> Result<StateSpace, LinearError> {
    if !delay_s.is_finite() {
        return Err(LinearError::NotFinite);
    }
    if delay_s < 0.0 || order == 0 || order > HIGHEST_ORDER {
        return Err(LinearError::Shape(format!("delay {delay_s} s of order {order}")));
    }
    let rate = 2.0 / delay_s;
    if delay_s == 0.0 || !rate.is_finite() {
        return StateSpace::constant(DMatrix::from_element(1, 1, 1.0), &["u"], &["y"]);
    }
    // States in ladder order: shunt inductor currents (even places) and series capacitor voltages (odd places); element k is 1/(2k + 1).
    let element = |k: usize| 1.0 / (2 * k + 1) as f64;
    let inductor = |k: usize| k.is_multiple_of(2);
    let odd = !order.is_multiple_of(2);
    let mut a = DMatrix::zeros(order, order);
    let mut b = DMatrix::zeros(order, 1);
    let mut c = DMatrix::zeros(1, order);
    for i in 0..order {
        // What drives element i, as a sum over the states and the incident wave: an inductor sees the port voltage less the capacitors before it, a capacitor
        // the port current less the inductors before it. An odd ladder ends open (port current = sum of the inductors'), an even one shorted.
        let from_wave = if inductor(i) == odd { 1.0 } else { 0.0 };
        for j in 0..order {
            let before = if j < i { 1.0 } else { 0.0 };
            let drive = match (inductor(i), inductor(j)) {
                (true, true) => {
                    if odd {
                        -1.0
                    } else {
                        0.0
                    }
                }
                (true, false) => (if odd { 0.0 } else { 1.0 }) - before,
                (false, true) => (if odd { 1.0 } else { 0.0 }) - before,
                (false, false) => {
                    if odd {
                        0.0
                    } else {
                        -1.0
                    }
                }
            };
            a[(i, j)] = rate * drive / (element(i) * element(j)).sqrt();
        }
        b[(i, 0)] = rate.sqrt() * from_wave / element(i).sqrt();
        // Reflected wave: twice the port current less the incident wave, or the incident wave less twice the port voltage.
        let to_output = if inductor(i) == odd { if odd { 2.0 } else { -2.0 } } else { 0.0 };
        c[(0, i)] = rate.sqrt() * to_output / element(i).sqrt();
    }
    StateSpace::new(a, b, c, DMatrix::from_element(1, 1, if odd { -1.0 } else { 1.0 }), &["u"], &["y"])
}

/// Largest phase error [°] of the approximant of that order up to a frequency [Hz], by its leading term.
pub fn pade_phase_error_deg(delay_s: f64, order: usize, f_hz: f64) -> f64 {
    let x = TAU * f_hz * delay_s;
    let mut error = x;
    for k in 1..=order {
        let k = k as f64;
        // Ratio of the leading coefficients of orders k and k − 1: k²/((2k)(2k − 1)(2k + 1)(2k)) = 1/(4(4k² − 1)).
        error *= x * x / (4.0 * (4.0 * k * k - 1.0));
    }
    error.abs().to_degrees()
}
