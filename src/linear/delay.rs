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

#[cfg(test)]
mod tests {
    use super::super::precision::{assert_complex_close, assert_near, assert_same_roots};
    use super::super::{Complex, Zpk};
    use super::*;

    /// Reference: the [3/3] approximant (120 − 60s + 12s² − s³)/(120 + 60s + 12s² + s³); Golub and Van Loan, Matrix Computations (from memory).
    #[test]
    fn order_three_is_the_known_quotient() {
        let delay = 2e-6;
        let system = pade_delay(delay, 3).unwrap();
        for f in [1.0, 1e4, 1e5, 3e5, 1e6] {
            let s = Complex::new(0.0, TAU * f * delay);
            let expected =
                (120.0 - 60.0 * s + 12.0 * s * s - s * s * s) / (120.0 + 60.0 * s + 12.0 * s * s + s * s * s);
            assert_complex_close(system.entry_at(0, 0, s / delay).unwrap(), expected, 1e-13);
        }
        let zpk = Zpk::from_state_space(&system, 0, 0).unwrap();
        let mirrored: Vec<Complex> = zpk.poles.iter().map(|p| -p).collect();
        assert_same_roots(&zpk.zeros, &mirrored, 1e-11);
        // Roots of s³ + 12s² + 60s + 120, from the cubic's closed form.
        let real = -4.644_370_709_252_17;
        let pair = Complex::new(-3.677_814_645_373_91, 3.508_761_919_567_44);
        assert_same_roots(&zpk.poles, &[real / delay + 0.0 * pair, pair / delay, pair.conj() / delay], 1e-12);
    }

    /// Definition: unit gain at every order and frequency, and a phase error no larger than stated.
    #[test]
    fn all_pass_with_the_stated_error() {
        let delay = 1e-6;
        for order in 1..=8 {
            let system = pade_delay(delay, order).unwrap();
            assert_eq!(system.order(), order);
            assert!(system.poles().unwrap().iter().all(|p| p.re < 0.0));
            for x in [0.03, 0.3, 1.0, 1.9] {
                let h = system.entry_at(0, 0, Complex::new(0.0, x / delay)).unwrap();
                assert_near(h.norm(), 1.0, 1e-13);
                let error = (h * Complex::cis(x)).arg().to_degrees().abs();
                let stated = pade_phase_error_deg(delay, order, x / delay / TAU);
                assert!(error <= 1.05 * stated + 1e-12, "order {order} at {x}: {error} against {stated}");
            }
        }
        // The figures of the header.
        assert!(pade_phase_error_deg(0.3e-5, 3, 0.5e5) < 0.01);
        assert_near(pade_phase_error_deg(1.0, 3, 1.95 / TAU).to_radians(), 1e-3, 1e-4);
    }

    #[test]
    fn no_delay_and_impossible_delays() {
        assert_eq!(pade_delay(0.0, 3).unwrap().order(), 0);
        assert!(pade_delay(-1e-6, 3).is_err() && pade_delay(1e-6, 0).is_err() && pade_delay(1e-6, 13).is_err());
        assert_eq!(pade_delay(f64::NAN, 3), Err(LinearError::NotFinite));
    }
}
