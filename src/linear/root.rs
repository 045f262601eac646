//! A root between two values of opposite sign.

/// Steps granted; the method needs about ten, and never more than bisection to the last bit.
const STEPS_AT_MOST: usize = 120;

/// The root of `value` between `low` and `high`, to the tolerance, by a variant of regula falsi with bisection as its guard.
///
/// The values at the ends are given, since callers know them; when they have one sign the end nearer to zero is returned.
///
/// Source: Anderson and Björck, BIT 13 (1973), 253 (from memory).
pub(crate) fn bracketed_root(
    mut value: impl FnMut(f64) -> f64,
    (mut low, mut at_low): (f64, f64),
    (mut high, mut at_high): (f64, f64),
    tolerance: f64,
) -> f64 {
    if at_low * at_high >= 0.0 || at_low.is_nan() || at_high.is_nan() {
        return if at_low.abs() <= at_high.abs() { low } else { high };
    }
    let mut width = high - low;
    // A secant that lands beside an end has only converged if the value has fallen, too.
    let fallen = 0.5 * at_low.abs().min(at_high.abs());
    for step in 1..=STEPS_AT_MOST {
        let falsi = high - at_high * (high - low) / (at_high - at_low);
        // A curve that fools the secant cannot stall it: three steps that do not halve the bracket are followed by one that does.
        let stalled = step % 4 == 0 && high - low > 0.5 * width;
        if step % 4 == 0 {
            width = high - low;
        }
        let x = if falsi > low && falsi < high && !stalled { falsi } else { 0.5 * (low + high) };
        let here = value(x);
        if here == 0.0 {
            return x;
        }
        let moved;
        if (here > 0.0) == (at_low > 0.0) {
            moved = x - low;
            // Anderson and Björck: the end that stays is weighed by how the moving end improved.
            at_high *= weight(here, at_low);
            (low, at_low) = (x, here);
        } else {
            moved = high - x;
            at_low *= weight(here, at_high);
            (high, at_high) = (x, here);
        }
        if high - low <= tolerance || (moved <= tolerance && !stalled && here.abs() <= fallen) {
            return x;
        }
    }
    0.5 * (low + high)
}

/// The root of a function between `low` and `high`, to the tolerance, by Newton's method with bisection as its guard.
///
/// `value` gives the function and its slope; `at_low` is the function at `low`, the one at `high` having the other sign.
pub(super) fn newton_root(
    mut value: impl FnMut(f64) -> (f64, f64),
    (mut low, at_low): (f64, f64),
    (mut high, at_high): (f64, f64),
    tolerance: f64,
) -> f64 {
    let mut x = low + (high - low) * (at_low / (at_low - at_high)).clamp(0.0, 1.0);
    let mut last_step = high - low;
    for _ in 0..STEPS_AT_MOST {
        let (here, slope) = value(x);
        let newton = here / slope;
        if here == 0.0 || newton.abs() <= tolerance || high - low <= tolerance {
            return if newton.is_finite() { (x - newton).clamp(low, high) } else { x };
        }
        if (here > 0.0) == (at_low > 0.0) {
            low = x;
        } else {
            high = x;
        }
        let next = x - newton;
        let trusted = next > low && next < high && newton.abs() < 0.5 * last_step;
        let next = if trusted { next } else { 0.5 * (low + high) };
        last_step = (next - x).abs();
        x = next;
    }
    x
}

/// Factor for the value at the end that stays, from the new and the old value at the end that moves.
fn weight(new: f64, old: f64) -> f64 {
    let left = 1.0 - new / old;
    if left > 0.0 { left } else { 0.5 }
}

#[cfg(test)]
mod tests {
    use super::super::precision::assert_near;
    use super::*;

    #[test]
    fn finds_roots_that_fool_the_secant() {
        // A wall beside a plain: regula falsi alone would creep.
        let steep = |x: f64| (40.0 * (x - 0.9)).exp_m1();
        assert_near(bracketed_root(steep, (0.0, steep(0.0)), (2.0, steep(2.0)), 1e-13), 0.9, 1e-12);
        // A jump.
        let jump = |x: f64| if x < 0.3 { -1.0 } else { 1.0 };
        assert_near(bracketed_root(jump, (0.0, -1.0), (1.0, 1.0), 1e-13), 0.3, 1e-12);
    }

    #[test]
    fn newton_is_guarded_against_a_bend() {
        let steep = |x: f64| ((40.0 * (x - 0.9)).exp_m1(), 40.0 * (40.0 * (x - 0.9)).exp());
        assert_near(newton_root(steep, (0.0, steep(0.0).0), (2.0, steep(2.0).0), 1e-13), 0.9, 1e-12);
        let flat = |x: f64| ((x - 0.3).powi(3), 3.0 * (x - 0.3).powi(2));
        assert_near(newton_root(flat, (0.0, flat(0.0).0), (1.0, flat(1.0).0), 1e-13), 0.3, 1e-6);
    }

    #[test]
    fn without_a_sign_change_the_nearer_end_is_taken() {
        assert_near(bracketed_root(|x| x, (1.0, 1.0), (2.0, 2.0), 1e-9), 1.0, 0.0);
    }
}
