//! The verdict on a closed loop: its poles, checked by the encirclement count on the exact delay.
//!
//! The count is a proof, not a plot: the imaginary axis is cut into intervals until on each of them one of three things is certain
//! from bounds on the distances of the roots: |T| stays above one (then 1 + T turns with T), |T| stays below one (then it stays
//! right of the origin), or T moves less than its distance from −1 (then it cannot go around). Nothing is read off a grid.
//!
//! Conventions: the contour passes poles on the imaginary axis on their right, so they count as stable open-loop poles; the loop
//! has Z = N + P closed-loop poles in the right half-plane, N clockwise turns around −1 and P open-loop poles there.
//!
//! Source: the argument principle; Nyquist, Bell System Technical Journal 11 (1932), 126 (from memory).
//!
//! Valid for: proper loops; with a delay the gain must fall below one at high frequency.

use std::f64::consts::{FRAC_PI_2, PI, TAU};

use super::margins::{Margins, crosses_above_unity};
use super::{Complex, FactoredResponse, FrequencyResponse, LogPoint};

/// Intervals looked at before giving up; a loop of ten roots needs some tens.
const INTERVALS_AT_MOST: usize = 20_000;

/// Width in ln ω below which an undecided interval means that the loop passes through −1.
const NARROWEST: f64 = 1e-12;

/// Room left for rounding in each bound.
const SLACK: f64 = 1e-9;

/// What closing the loop leads to.
#[derive(Clone, Debug, PartialEq)]
pub enum Verdict {
    /// All closed-loop poles lie in the left half-plane, and the encirclement count agrees.
    Stable {
        /// Whether a lower gain would make the loop unstable.
        conditionally: bool,
    },
    /// There are closed-loop poles in the right half-plane, and the encirclement count agrees.
    Unstable {
        /// Frequency of the fastest growing pole [Hz].
        frequency_hz: f64,
        /// Its growth [1/s].
        growth_per_s: f64,
        /// Closed-loop poles in the right half-plane, by the encirclement count.
        poles: usize,
    },
    /// Poles and count disagree, or the loop passes through the critical point.
    Undecided {
        /// Why, in words.
        reason: String,
    },
}

/// The verdict from the closed-loop poles [rad/s], which may rest on a rational form of the delay, and the open loop with its exact delay.
pub fn closed_loop_verdict(closed_loop_poles: &[Complex], open: &FactoredResponse) -> Verdict {
    judge(closed_loop_poles, open, || conditionally_stable(open))
}

/// The same where the margins are known already: conditional stability is then read off their band, which saves half the work.
pub fn closed_loop_verdict_knowing(
    closed_loop_poles: &[Complex],
    open: &FactoredResponse,
    margins: &Margins,
) -> Verdict {
    judge(closed_loop_poles, open, || negative_at_rest(open) || margins.gain_margin_down_db().is_some())
}

fn judge(closed_loop_poles: &[Complex], open: &FactoredResponse, conditionally: impl Fn() -> bool) -> Verdict {
    let count = match encirclement_count(open) {
        Ok(count) => count,
        Err(reason) => return Verdict::Undecided { reason },
    };
    let growing = closed_loop_poles.iter().filter(|p| p.re >= 0.0 || p.re.is_nan()).count();
    if (growing == 0) != (count == 0) {
        return Verdict::Undecided {
            reason: format!(
                "{growing} closed-loop poles are not in the left half-plane, but the encirclement count finds {count}"
            ),
        };
    }
    match closed_loop_poles.iter().max_by(|p, q| p.re.total_cmp(&q.re)) {
        Some(fastest) if count > 0 => {
            Verdict::Unstable { frequency_hz: fastest.im.abs() / TAU, growth_per_s: fastest.re, poles: count }
        }
        _ => Verdict::Stable { conditionally: conditionally() },
    }
}

/// Whether a stable loop would become unstable with less gain: its phase passes −180° − k·360° somewhere at a gain above one.
fn conditionally_stable(open: &FactoredResponse) -> bool {
    if negative_at_rest(open) {
        return true;
    }
    match Contour::new(open) {
        Ok(contour) => crosses_above_unity(open, contour.low.exp() / TAU, contour.high.exp() / TAU),
        Err(_) => false,
    }
}

/// A gain below −1 at zero frequency: less gain takes a pole through the origin.
fn negative_at_rest(open: &FactoredResponse) -> bool {
    let (ln_scale, negative) = open.scale();
    open.origin() == 0 && negative && ln_scale > 0.0
}

/// Number of closed-loop poles in the right half-plane by the encirclement count, with the exact delay.
///
/// # Errors
/// The reason in words when the count does not exist: the loop passes through −1, is improper, or has a delay and a gain of one or
/// more at infinite frequency.
pub fn encirclement_count(open: &FactoredResponse) -> Result<usize, String> {
    let unstable_open = open.zpk().poles.iter().filter(|p| p.re > 0.0).count();
    if open.scale().0 == f64::NEG_INFINITY {
        return Ok(unstable_open);
    }
    let contour = Contour::new(open)?;
    let half_turns = (contour.start_angle - contour.end_angle()?) / PI;
    let whole = half_turns.round();
    if (half_turns - whole).abs() > 1e-6 {
        return Err("the encirclement count does not close".to_owned());
    }
    let closed = whole + unstable_open as f64;
    // A count below zero cannot come from a closed contour.
    if closed < 0.0 { Err("the encirclement count does not close".to_owned()) } else { Ok(count_of(closed)) }
}

/// A non-negative whole number as a count.
#[expect(
    clippy::cast_possible_truncation,
    clippy::cast_sign_loss,
    reason = "a non-negative whole number far below the limit"
)]
fn count_of(x: f64) -> usize {
    x.clamp(0.0, 1e9) as usize
}

/// What is certain about an interval.
#[derive(Clone, Copy, PartialEq, Eq)]
enum Certain {
    /// |T| > 1 throughout.
    Above,
    /// |T| < 1 throughout.
    Below,
    /// T stays within a disc that leaves −1 out.
    Disc,
}

/// One root, prepared for bounds.
struct Root {
    re: f64,
    im: f64,
    /// 1/|root|².
    inverse_square: f64,
    /// Whether it is a zero, else a pole.
    zero: bool,
}

/// The positive imaginary axis with the ends that are settled in closed form.
struct Contour<'a> {
    open: &'a FactoredResponse,
    roots: Vec<Root>,
    /// ln ω of the lower end.
    low: f64,
    /// ln ω of the upper end.
    high: f64,
    /// Angle of 1 + T on the positive real axis near the origin [rad].
    start_angle: f64,
    /// Angle of 1 + T at the lower end [rad].
    low_angle: f64,
    /// T at infinite frequency, for a loop that does not fall to zero.
    at_infinity: f64,
}

impl<'a> Contour<'a> {
    fn new(open: &'a FactoredResponse) -> Result<Self, String> {
        let zpk = open.zpk();
        if zpk.zeros.len() > zpk.poles.len() {
            return Err("the loop gain rises without bound at high frequency".to_owned());
        }
        let at_infinity = if zpk.zeros.len() == zpk.poles.len() { zpk.gain } else { 0.0 };
        if open.delay_s() > 0.0 && at_infinity.abs() >= 1.0 {
            return Err("with a delay, the loop gain must fall below one at high frequency".to_owned());
        }
        let prepare =
            |zero: bool| move |r: &Complex| Root { re: r.re, im: r.im, inverse_square: 1.0 / r.norm_sqr(), zero };
        let zeros = zpk.zeros.iter().filter(|r| **r != Complex::ZERO).map(prepare(true));
        let poles = zpk.poles.iter().filter(|r| **r != Complex::ZERO).map(prepare(false));
        let mut roots: Vec<Root> = zeros.chain(poles).collect();
        // By size, so that the running product of bounds stays near the gain itself.
        roots.sort_by(|p, q| q.inverse_square.total_cmp(&p.inverse_square));
        let mut contour = Self { open, roots, low: 0.0, high: 0.0, start_angle: 0.0, low_angle: 0.0, at_infinity };
        contour.settle_low_end()?;
        contour.settle_high_end()?;
        Ok(contour)
    }

    /// Sum over the roots of 1/|root|, and the delay: how fast ln T can move per rad/s near the origin.
    fn inverse_sum(&self) -> f64 {
        self.roots.iter().map(|r| r.inverse_square.sqrt()).sum::<f64>() + self.open.delay_s()
    }

    /// Chooses the lower end so that what lies below it is certain, and the angle of 1 + T there.
    fn settle_low_end(&mut self) -> Result<(), String> {
        let (ln_scale, negative) = self.open.scale();
        let origin = f64::from(self.open.origin());
        let inverse_sum = self.inverse_sum();
        // Below this ln T departs from its asymptote by less than 0.02 (each factor by at most twice ω/|root|).
        let mut low = if inverse_sum > 0.0 { (0.01 / inverse_sum).ln() } else { 0.0 };
        if origin != 0.0 {
            // Gain above e with poles at the origin, below 1/e with zeros.
            low = low.min(-(ln_scale + origin.signum()) / origin);
        }
        let at_zero = if origin == 0.0 { ln_scale.exp() * if negative { -1.0 } else { 1.0 } } else { 0.0 };
        if origin == 0.0 {
            let distance = (1.0 + at_zero).abs();
            if distance <= 1e-12 * (1.0 + at_zero.abs()) {
                return Err("the loop gain is −1 at zero frequency: a closed-loop pole lies at the origin".to_owned());
            }
            // Here 1 + T moves by less than half its length.
            low = low.min((0.2 * distance / (at_zero.abs() * inverse_sum + f64::MIN_POSITIVE)).ln().min(700.0));
        }
        if !low.is_finite() || low.abs() > 600.0 {
            return Err("the loop gain is out of the number range".to_owned());
        }
        self.low = low;
        let point = self.at(low);
        let sign_angle = if negative { -PI } else { 0.0 };
        (self.start_angle, self.low_angle) = if origin < 0.0 {
            (sign_angle, point.phase_rad + inverse_angle(&point))
        } else if origin > 0.0 {
            (0.0, (point.value() + 1.0).arg())
        } else {
            let start = if at_zero < -1.0 { -PI } else { 0.0 };
            (start, start + ((point.value() + 1.0) / (1.0 + at_zero)).arg())
        };
        Ok(())
    }

    /// Chooses the upper end so that what lies above it is certain.
    fn settle_high_end(&mut self) -> Result<(), String> {
        let zpk = self.open.zpk();
        let sum: f64 = self.roots.iter().map(|r| r.inverse_square.sqrt().recip()).sum();
        let largest = self.roots.last().map_or(1.0, |r| r.inverse_square.sqrt().recip());
        let excess = (zpk.poles.len() - zpk.zeros.len()) as f64;
        // Above twice the largest root, |ln(1 − root/s)| ≤ 1.4·|root|/ω.
        let mut high = (2.0 * largest).ln().max(self.low + 1.0);
        let ln_gain = zpk.gain.abs().ln();
        for _ in 0..4000 {
            let departure = 1.4 * sum / high.exp();
            let certain = if self.at_infinity != 0.0 && self.open.delay_s() == 0.0 {
                self.at_infinity.abs() * departure.exp_m1() < 0.5 * (1.0 + self.at_infinity).abs()
            } else {
                ln_gain - excess * high + departure < -1e-6
            };
            if certain {
                self.high = high;
                return Ok(());
            }
            high += 1.0;
            if high > 600.0 {
                break;
            }
        }
        Err("the loop gain is −1 at infinite frequency, or out of the number range".to_owned())
    }

    fn at(&self, ln_omega: f64) -> LogPoint {
        self.open.log_point(ln_omega.exp() / TAU)
    }

    /// Angle of 1 + T at infinite frequency, followed from the lower end [rad].
    fn end_angle(&self) -> Result<f64, String> {
        let mut angle = self.low_angle;
        let mut run: Option<(Certain, LogPoint)> = None;
        let mut stack = vec![(self.low, self.high)];
        let mut looked_at = 0;
        while let Some((from, to)) = stack.pop() {
            looked_at += 1;
            let Some(certain) = self.judge(from, to) else {
                let middle = 0.5 * (from + to);
                if to - from < NARROWEST || looked_at > INTERVALS_AT_MOST {
                    return Err(format!(
                        "the loop passes through the critical point near {:.6e} Hz",
                        middle.exp() / TAU
                    ));
                }
                stack.push((middle, to));
                stack.push((from, middle));
                continue;
            };
            // Intervals of one certainty join, so that the response is evaluated only where the certainty changes.
            match run {
                Some((kind, _)) if kind == certain && kind != Certain::Disc => {}
                Some((kind, start)) => {
                    let here = self.at(from);
                    angle += turn(kind, &start, &here);
                    run = Some((certain, here));
                }
                None => run = Some((certain, self.at(from))),
            }
        }
        let top = self.at(self.high);
        if let Some((kind, start)) = run {
            angle += turn(kind, &start, &top);
        }
        let left = if self.at_infinity != 0.0 && self.open.delay_s() == 0.0 {
            ((1.0 + self.at_infinity) / (top.value() + 1.0)).arg()
        } else {
            -(top.value() + 1.0).arg()
        };
        Ok(angle + left)
    }

    /// What is certain about T between two values of ln ω.
    fn judge(&self, from: f64, to: f64) -> Option<Certain> {
        let (low, high) = (from.exp(), to.exp());
        let (ln_scale, _) = self.open.scale();
        let origin = f64::from(self.open.origin());
        let (first, second) = if origin < 0.0 { (to, from) } else { (from, to) };
        let mut least = (2.0 * (ln_scale + origin * first)).exp();
        let mut most = (2.0 * (ln_scale + origin * second)).exp();
        for root in &self.roots {
            let (near, far) = root.distance_squares(low, high);
            if root.zero {
                least *= near * root.inverse_square;
                most *= far * root.inverse_square;
            } else {
                least /= far * root.inverse_square;
                most /= near * root.inverse_square;
            }
        }
        if least > 1.0 + SLACK {
            return Some(Certain::Above);
        }
        if most < 1.0 - SLACK {
            return Some(Certain::Below);
        }
        let steepness = origin.abs()
            + high * self.open.delay_s()
            + self.roots.iter().map(|r| high / r.distance_squares(low, high).0.sqrt()).sum::<f64>();
        let radius = 0.5 * steepness * (to - from);
        if radius > FRAC_PI_2 {
            return None;
        }
        let centre = self.at(0.5 * (from + to)).value();
        (centre.norm() * radius.exp_m1() < (1.0 - SLACK) * (centre + 1.0).norm()).then_some(Certain::Disc)
    }
}

impl Root {
    /// Least and greatest squared distance from the points `jω`, ω from `low` to `high`.
    fn distance_squares(&self, low: f64, high: f64) -> (f64, f64) {
        let (below, above) = (self.im - low, high - self.im);
        let gap = if below < 0.0 {
            -below
        } else if above < 0.0 {
            -above
        } else {
            0.0
        };
        let far = below.abs().max(above.abs());
        let square = self.re * self.re;
        (square + gap * gap, square + far * far)
    }
}

/// Angle of 1 + 1/T [rad].
fn inverse_angle(point: &LogPoint) -> f64 {
    (Complex::from_polar((-point.ln_gain).clamp(-690.0, 690.0).exp(), -point.phase_rad) + 1.0).arg()
}

/// By how much 1 + T turns over a run of one certainty [rad].
fn turn(kind: Certain, start: &LogPoint, end: &LogPoint) -> f64 {
    match kind {
        Certain::Above => end.phase_rad - start.phase_rad + inverse_angle(end) - inverse_angle(start),
        Certain::Below => (end.value() + 1.0).arg() - (start.value() + 1.0).arg(),
        Certain::Disc => ((end.value() + 1.0) / (start.value() + 1.0)).arg(),
    }
}

#[cfg(test)]
mod tests {
    use proptest::prelude::*;

    use super::super::precision::assert_close;
    use super::super::{StateSpace, Wire, Zpk, pade_delay};
    use super::*;

    fn real(x: f64) -> Complex {
        Complex::new(x, 0.0)
    }

    fn zpk(zeros: &[Complex], poles: &[Complex], gain: f64) -> Zpk {
        let both = |roots: &[Complex]| {
            roots.iter().flat_map(|r| if r.im == 0.0 { vec![*r] } else { vec![*r, r.conj()] }).collect()
        };
        Zpk::new(both(zeros), both(poles), gain).unwrap()
    }

    /// Closed-loop poles with the delay as an all-pass of order 3.
    fn closed_loop_poles(open: &FactoredResponse) -> Vec<Complex> {
        let forward = open.zpk().cascade().unwrap();
        let delay = pade_delay(open.delay_s(), 3).unwrap();
        let wires = [
            Wire { from_part: 0, output: "y", to_part: 1, input: "u", gain: 1.0 },
            Wire { from_part: 1, output: "y", to_part: 0, input: "u", gain: -1.0 },
        ];
        StateSpace::connect(&[&forward, &delay], &wires, &[], &[]).unwrap().poles().unwrap()
    }

    fn verdict(open: &FactoredResponse) -> Verdict {
        closed_loop_verdict(&closed_loop_poles(open), open)
    }

    /// Whether the cascade is the loop it was made from at all: zeros far below all poles make it lose digits.
    fn well_realised(open: &FactoredResponse) -> bool {
        let system = open.zpk().cascade().unwrap();
        (-4..14).all(|k| {
            let s = Complex::from_polar(10.0_f64.powf(0.5 * f64::from(k)), 1.5);
            let exact = open.zpk().at(s);
            (system.entry_at(0, 0, s).unwrap() - exact).norm() < 1e-8 * exact.norm()
        })
    }

    const STABLE: Verdict = Verdict::Stable { conditionally: false };
    const CONDITIONALLY: Verdict = Verdict::Stable { conditionally: true };

    /// Planted answer: 8/(s + 1)³ has the boundary at gain 8.
    #[test]
    fn three_lags() {
        let open = |gain| FactoredResponse::new(zpk(&[], &[real(-1.0); 3], gain), 0.0);
        assert_eq!(verdict(&open(7.999)), STABLE);
        let Verdict::Unstable { frequency_hz, growth_per_s, poles } = verdict(&open(8.001)) else { panic!("stable") };
        assert_eq!(poles, 2);
        assert_close(frequency_hz, 3.0_f64.sqrt() / TAU, 1e-4);
        assert!(growth_per_s > 0.0 && growth_per_s < 1e-3);
        let closed: Vec<Complex> =
            [real(-3.0), Complex::new(0.0, 3.0_f64.sqrt()), Complex::new(0.0, -3.0_f64.sqrt())].to_vec();
        assert!(matches!(closed_loop_verdict(&closed, &open(8.0)), Verdict::Undecided { .. }));
    }

    #[test]
    fn conditional_stability() {
        // Three integrators and two zeros: stable only above a gain.
        let open = |gain| FactoredResponse::new(zpk(&[real(-1.0); 2], &[Complex::ZERO; 3], gain), 0.0);
        assert_eq!(verdict(&open(5.0)), CONDITIONALLY);
        assert!(matches!(verdict(&open(0.3)), Verdict::Unstable { poles: 2, .. }));
        // An unstable open loop needs its gain; so does one with a negative gain at zero frequency that is high enough.
        assert_eq!(verdict(&FactoredResponse::new(zpk(&[], &[real(1.0)], 2.0), 0.0)), CONDITIONALLY);
        assert!(matches!(
            verdict(&FactoredResponse::new(zpk(&[], &[real(1.0)], 0.5), 0.0)),
            Verdict::Unstable { poles: 1, .. }
        ));
    }

    /// Planted answer: k/s with delay is stable below k·delay = π/2, a lag with inverted gain below one.
    #[test]
    fn exact_delay() {
        let open = |gain: f64| FactoredResponse::new(zpk(&[], &[Complex::ZERO], gain), 1e-3);
        assert_eq!(encirclement_count(&open(1e3 * (FRAC_PI_2 - 1e-9))), Ok(0));
        assert_eq!(encirclement_count(&open(1e3 * (FRAC_PI_2 + 1e-9))), Ok(2));
        assert_eq!(encirclement_count(&open(1e3 * (FRAC_PI_2 + TAU + 1e-6))), Ok(4));
        assert_eq!(verdict(&open(1.5e3)), STABLE);
        assert!(matches!(verdict(&open(1.6e3)), Verdict::Unstable { poles: 2, .. }));
        let inverted = |gain: f64| FactoredResponse::new(zpk(&[], &[real(-1.0)], -gain), 0.0);
        assert_eq!(encirclement_count(&inverted(0.999_999)), Ok(0));
        assert_eq!(encirclement_count(&inverted(1.000_001)), Ok(1));
        assert!(encirclement_count(&inverted(1.0)).is_err());
    }

    #[test]
    fn ends_that_do_not_vanish() {
        // Biproper: 1 + k(s + 1)/(s + 2) has its pole at −(2 + k)/(1 + k).
        let biproper = |gain| encirclement_count(&FactoredResponse::new(zpk(&[real(-1.0)], &[real(-2.0)], gain), 0.0));
        assert_eq!((biproper(5.0), biproper(-0.5), biproper(-1.5), biproper(-3.0)), (Ok(0), Ok(0), Ok(1), Ok(0)));
        assert!(biproper(-1.0).is_err());
        assert!(encirclement_count(&FactoredResponse::new(zpk(&[real(-1.0)], &[], 1.0), 0.0)).is_err());
        assert!(encirclement_count(&FactoredResponse::new(zpk(&[real(-1.0)], &[real(-2.0)], 5.0), 1e-3)).is_err());
        assert_eq!(encirclement_count(&FactoredResponse::new(zpk(&[real(-1.0)], &[real(-2.0)], 0.9), 1e-3)), Ok(0));
        assert_eq!(encirclement_count(&FactoredResponse::new(Zpk::constant(3.0), 0.0)), Ok(0));
        assert_eq!(encirclement_count(&FactoredResponse::new(zpk(&[], &[real(3.0)], 0.0), 0.0)), Ok(1));
        // A differentiator in front, and an undamped pair on the axis.
        assert_eq!(
            encirclement_count(&FactoredResponse::new(zpk(&[Complex::ZERO], &[real(-1.0), real(-5.0)], 9.0), 0.0)),
            Ok(0)
        );
        assert_eq!(
            encirclement_count(&FactoredResponse::new(zpk(&[real(-1.0)], &[Complex::new(0.0, 7.0)], 9.0), 0.0)),
            Ok(0)
        );
        assert_eq!(
            encirclement_count(&FactoredResponse::new(zpk(&[], &[Complex::new(0.0, 7.0), real(-1.0)], 9.0), 0.0)),
            Ok(2)
        );
    }

    #[test]
    fn disagreement_is_undecided() {
        let open = FactoredResponse::new(zpk(&[], &[Complex::ZERO], 1.0), 0.0);
        assert!(matches!(closed_loop_verdict(&[real(1.0)], &open), Verdict::Undecided { .. }));
        assert!(matches!(closed_loop_verdict(&[real(f64::NAN)], &open), Verdict::Undecided { .. }));
    }

    /// A random loop: real roots and pairs over five decades on either side, integrators, resonances down to 1e-6 damping.
    fn random_loop() -> impl Strategy<Value = FactoredResponse> {
        let root = || (0.0..5.0_f64, -6.0..0.0_f64, 0..6_u8, prop::bool::weighted(0.15));
        let roots = move |range| prop::collection::vec(root(), range);
        (roots(1..6), roots(0..5), 0..3_usize, -20.0..20.0_f64, 0.0..4.0_f64, prop::option::of(-6.0..0.0_f64)).prop_map(
            |(poles, zeros, integrators, gain_db, level_decade, delay)| {
                let expand = |roots: Vec<(f64, f64, u8, bool)>| -> Vec<Complex> {
                    let one = |(decade, damping, kind, right): (f64, f64, u8, bool)| {
                        let size = 10.0_f64.powf(decade);
                        let sign = if right { 1.0 } else { -1.0 };
                        match kind {
                            0..=2 => real(sign * size),
                            3 => Complex::from_polar(size, 1.8) * sign.abs(),
                            _ => Complex::new(sign * 10.0_f64.powf(damping), 1.0) * size,
                        }
                    };
                    roots.into_iter().map(one).collect()
                };
                let mut poles = expand(poles);
                poles.extend(vec![Complex::ZERO; integrators]);
                let mut zeros = expand(zeros);
                let degree = |roots: &[Complex]| roots.iter().map(|r| if r.im == 0.0 { 1 } else { 2 }).sum::<usize>();
                while degree(&zeros) >= degree(&poles) {
                    zeros.pop();
                }
                let shape = FactoredResponse::new(zpk(&zeros, &poles, 1.0), 0.0);
                // The gain is set at a frequency among the roots, so that crossovers fall among them too.
                let gain = (gain_db / 8.686 - shape.log_point(10.0_f64.powf(level_decade)).ln_gain).exp();
                let delay_s = delay.map_or(0.0, |decade| 10.0_f64.powf(decade));
                FactoredResponse::new(zpk(&zeros, &poles, gain), delay_s)
            },
        )
    }

    proptest! {
        #![proptest_config(ProptestConfig { cases: 10_000, max_global_rejects: 100_000, ..ProptestConfig::default() })]

        /// Two routes, 10,000 random loops without delay: the poles and the count never disagree.
        #[test]
        fn poles_and_encirclements_agree(open in random_loop()) {
            prop_assume!(well_realised(&open));
            let open = FactoredResponse::new(open.zpk().clone(), 0.0);
            let poles = closed_loop_poles(&open);
            // Poles on the axis to within rounding decide nothing.
            let fastest = poles.iter().map(|p| p.norm()).fold(0.0, f64::max);
            prop_assume!(poles.iter().all(|p| p.re.abs() > 1e-9 * p.norm() + 1e-10 * fastest));
            let unstable = poles.iter().filter(|p| p.re > 0.0).count();
            prop_assert_eq!(encirclement_count(&open), Ok(unstable), "{:?}", poles);
        }

        /// Two routes with a delay: wherever the phase error of the rational form is small up to the last frequency where |T| > 1/4, they agree.
        #[test]
        fn poles_and_encirclements_agree_with_delay(open in random_loop()) {
            let grid = (0..900).map(|k| 10.0_f64.powf(-2.0 + 0.01 * f64::from(k))).chain(open.breakpoints_hz());
            let last = grid.filter(|f| open.log_point(*f).ln_gain > -1.4).max_by(f64::total_cmp);
            prop_assume!(well_realised(&open) && last.is_none_or(|f| f * open.delay_s() < 0.25));
            let poles = closed_loop_poles(&open);
            let fastest = poles.iter().map(|p| p.norm()).fold(0.0, f64::max);
            prop_assume!(poles.iter().all(|p| p.re.abs() > 1e-5 * p.norm() + 1e-10 * fastest));
            let unstable = poles.iter().filter(|p| p.re > 0.0).count();
            prop_assert_eq!(encirclement_count(&open), Ok(unstable), "{:?}", poles);
        }
    }
}
