//! Coefficients of a difference equation as whole numbers of a word length.
//!
//! *Conventions*: a code stands for code · 2^(−fraction bits); negative codes are in two's complement, so a word of N bits holds −2^(N−1) to
//! 2^(N−1) − 1. Rounding is to the nearest code, half away from zero.

/// Greatest number of fraction bits: beyond it 2^bits and a code of 32 bits no longer fit the whole numbers of a double together.
pub(super) const MOST_FRACTION_BITS: u32 = 62;

/// One group of coefficients that share a scale.
#[derive(Clone, Debug, PartialEq)]
pub struct Codes {
    /// Binary places.
    pub fraction_bits: u32,
    /// Whole numbers, one for each coefficient.
    pub codes: Vec<i64>,
}

/// A coefficient that does not fit its word.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Overflow {
    /// Place in the group, from 0.
    pub index: usize,
    /// The coefficient.
    pub value: f64,
}

impl Codes {
    /// The values that the codes stand for.
    pub fn values(&self) -> Vec<f64> {
        self.codes.iter().map(|code| *code as f64 / scale(self.fraction_bits)).collect()
    }

    /// The nearest codes; with no fraction bits given, the most with which all fit.
    ///
    /// # Errors
    /// The first coefficient that does not fit the word.
    pub(super) fn nearest(values: &[f64], bits: u32, fraction_bits: Option<u32>) -> Result<Self, Overflow> {
        let fits = |fraction_bits: u32| {
            let codes: Option<Vec<i64>> = values.iter().map(|v| code(*v, bits, fraction_bits)).collect();
            codes.map(|codes| Codes { fraction_bits, codes })
        };
        let found = match fraction_bits {
            Some(given) => fits(given),
            None => (0..=MOST_FRACTION_BITS).rev().find_map(fits),
        };
        let at = fraction_bits.unwrap_or(0);
        found.ok_or_else(|| {
            let beyond = |v: &f64| code(*v, bits, at).is_none();
            let index = values.iter().position(beyond).unwrap_or(0);
            Overflow { index, value: values.get(index).copied().unwrap_or(0.0) }
        })
    }

    /// The nearest codes whose sum is one, for values whose sum is one: where rounding each leaves codes over, those change by one whose rounding
    /// error is greatest that way.
    ///
    /// # Errors
    /// As [`Codes::nearest`].
    pub(super) fn summing_to_one(values: &[f64], bits: u32, fraction_bits: Option<u32>) -> Result<Self, Overflow> {
        let mut codes = Self::nearest(values, bits, fraction_bits)?;
        let scale = scale(codes.fraction_bits);
        let mut errors: Vec<f64> = values.iter().zip(&codes.codes).map(|(v, code)| v * scale - *code as f64).collect();
        // Each round takes one code off what is missing, and rounding leaves less than one for each coefficient.
        for _ in 0..=values.len() {
            let missing = scale - codes.codes.iter().map(|code| *code as f64).sum::<f64>();
            let way = if missing > 0.0 { 1.0 } else { -1.0 };
            let worst = (0..errors.len()).rev().max_by(|a, b| (way * errors[*a]).total_cmp(&(way * errors[*b])));
            let Some(worst) = worst.filter(|_| missing != 0.0) else { break };
            errors[worst] -= way;
            codes.codes[worst] += if way > 0.0 { 1 } else { -1 };
        }
        let (least, greatest) = limits(bits);
        match codes.codes.iter().position(|code| !(least..=greatest).contains(code)) {
            None => Ok(codes),
            // One code over the word's end: one binary place less makes room.
            Some(index) => match fraction_bits {
                None if codes.fraction_bits > 0 => Self::summing_to_one(values, bits, Some(codes.fraction_bits - 1)),
                _ => Err(Overflow { index, value: values.get(index).copied().unwrap_or(0.0) }),
            },
        }
    }
}

/// Codes per one.
fn scale(fraction_bits: u32) -> f64 {
    2f64.powi(i32::try_from(fraction_bits).unwrap_or(0))
}

/// Least and greatest code of a word.
pub fn limits(bits: u32) -> (i64, i64) {
    let half = 1_i64 << bits.saturating_sub(1).min(62);
    (-half, half - 1)
}

/// The nearest code, where it fits.
#[expect(clippy::cast_possible_truncation, reason = "within the limits of a word of at most 63 bits")]
fn code(value: f64, bits: u32, fraction_bits: u32) -> Option<i64> {
    let rounded = (value * scale(fraction_bits)).round();
    let (least, greatest) = limits(bits);
    (rounded >= least as f64 && rounded <= greatest as f64).then_some(rounded as i64)
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Two's complement by hand: 4 bits hold −8 to 7.
    #[test]
    fn a_word_of_four_bits() {
        assert_eq!(limits(4), (-8, 7));
        assert_eq!(Codes::nearest(&[1.75, -2.0], 4, None).unwrap(), Codes { fraction_bits: 2, codes: vec![7, -8] });
        assert_eq!(Codes::nearest(&[0.3], 4, Some(2)).unwrap().codes, [1]);
        assert_eq!(Codes::nearest(&[-0.375], 4, Some(2)).unwrap().codes, [-2], "half goes away from zero");
        assert_eq!(Codes::nearest(&[1.0, 2.0], 4, Some(2)), Err(Overflow { index: 1, value: 2.0 }));
        assert_eq!(Codes::nearest(&[9.0], 4, None), Err(Overflow { index: 0, value: 9.0 }));
        assert_eq!(Codes::nearest(&[1.75, -2.0], 4, None).unwrap().values(), [1.75, -2.0]);
    }

    /// a = (1 + p + q, −(p + q + pq), pq) sums to one; each rounded by itself its codes do not.
    #[test]
    fn codes_that_keep_the_integrator() {
        let (p, q) = (0.41, 0.17);
        let values = [1.0 + p + q, -(p + q + p * q), p * q];
        let sum = |codes: &Codes| codes.codes.iter().sum::<i64>();
        let mut moved = 0;
        for bits in 4..20 {
            let nearest = Codes::nearest(&values, bits, None).unwrap();
            let kept = Codes::summing_to_one(&values, bits, None).unwrap();
            assert_eq!(sum(&kept), 1 << kept.fraction_bits, "{bits}");
            moved += usize::from(sum(&nearest) != 1 << nearest.fraction_bits);
            let apart = kept.codes.iter().zip(&nearest.codes).map(|(a, b)| (a - b).abs()).max();
            assert!(apart <= Some(1) || kept.fraction_bits != nearest.fraction_bits);
        }
        assert!(moved > 2, "{moved}");
    }
}
