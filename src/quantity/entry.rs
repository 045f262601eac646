//! Rows of the table of entries: one row for every number, one for every choice, declared where it is used.
//!
//! Form, file, check, sign-off and the terminal's `--set` all read these rows, so a new entry is one row and no view knows
//! entries by name.

use super::{ParseError, Unit, parse, print};

/// One number a user enters.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Entry {
    /// Where it stands, in dotted words: `stage.inductor.inductance`.
    pub path: &'static str,
    /// Name shown beside its field.
    pub name: &'static str,
    /// Unit of the text and of the number.
    pub unit: Unit,
    /// What the number may be.
    pub bounds: Bounds,
    /// Value of a new design [unit]. For an optional entry, the value offered when it is filled in.
    pub default: f64,
    /// May be left empty.
    pub optional: bool,
    /// Usual spread of such a part, as a fraction either way; 0 for none.
    pub spread: f64,
    /// One or two sentences for the field's tip.
    pub help: &'static str,
}

/// What a number may be. Limits are in the entry's unit.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Bounds {
    /// Above zero.
    Positive,
    /// Zero or above.
    NonNegative,
    /// Any number.
    Finite,
    /// From the first to the second, both included.
    Between(f64, f64),
    /// Above zero, up to and including the limit.
    PositiveUpTo(f64),
    /// Above the limit, which is not included.
    Above(f64),
    /// The limit or above.
    AtLeast(f64),
}

impl Entry {
    /// A row that must be filled in and has no usual spread.
    pub const fn new(
        path: &'static str,
        name: &'static str,
        unit: Unit,
        bounds: Bounds,
        default: f64,
        help: &'static str,
    ) -> Self {
        Self { path, name, unit, bounds, default, optional: false, spread: 0.0, help }
    }

    /// The same row, which may be left empty.
    #[must_use]
    pub const fn optional(mut self) -> Self {
        self.optional = true;
        self
    }

    /// The same row with its usual spread, as a fraction either way.
    #[must_use]
    pub const fn spread(mut self, fraction: f64) -> Self {
        self.spread = fraction;
        self
    }

    /// Reads a text with this row's unit. Bounds are not looked at: an unusable number may be held and is reported by the check.
    ///
    /// # Errors
    /// As [`parse`].
    pub fn read(&self, text: &str) -> Result<f64, ParseError> {
        parse(text, self.unit)
    }

    /// Whether the number may be used.
    ///
    /// # Errors
    /// The reason in words, when it may not.
    pub fn check(&self, value: f64) -> Result<(), String> {
        self.bounds.check(value, self.unit)
    }
}

impl Bounds {
    /// Whether a number is within bounds, and of a magnitude that can belong to a converter at all.
    ///
    /// # Errors
    /// The reason in words: "must be above 0 V, and is −3 V".
    pub fn check(self, value: f64, unit: Unit) -> Result<(), String> {
        if !value.is_finite() {
            return Err("must be a finite number".into());
        }
        let inside = match self {
            Bounds::Positive => value > 0.0,
            Bounds::NonNegative => value >= 0.0,
            Bounds::Finite => true,
            Bounds::Between(least, greatest) => (least..=greatest).contains(&value),
            Bounds::PositiveUpTo(greatest) => value > 0.0 && value <= greatest,
            Bounds::Above(limit) => value > limit,
            Bounds::AtLeast(least) => value >= least,
        };
        if !inside {
            return Err(format!("must be {}, and is {}", self.in_words(unit), print(value, unit)));
        }
        let (least, greatest) = unit.usable_magnitudes();
        if value.abs() > greatest {
            return Err(format!(
                "is {}, beyond {}, the most that is taken here",
                print(value, unit),
                print(greatest, unit)
            ));
        }
        if value != 0.0 && value.abs() < least {
            return Err(format!("is {}, nearer to zero than {}", print(value, unit), print(least, unit)));
        }
        Ok(())
    }

    /// The bounds as words that follow "must be".
    pub fn in_words(self, unit: Unit) -> String {
        let p = |value| print(value, unit);
        match self {
            Bounds::Positive => format!("above {}", p(0.0)),
            Bounds::NonNegative => format!("{} or above", p(0.0)),
            Bounds::Finite => "a number".into(),
            Bounds::Between(least, greatest) => format!("from {} to {}", p(least), p(greatest)),
            Bounds::PositiveUpTo(greatest) => format!("above {} and at most {}", p(0.0), p(greatest)),
            Bounds::Above(limit) => format!("above {}", p(limit)),
            Bounds::AtLeast(least) => format!("{} or above", p(least)),
        }
    }
}

/// One choice between named options.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Choice {
    /// Where it stands, in dotted words: `stage.topology`.
    pub path: &'static str,
    /// Name shown beside it.
    pub name: &'static str,
    /// What can be chosen, in the order shown.
    pub options: &'static [ChoiceOption],
    /// Key of the option of a new design.
    pub default: &'static str,
    /// One or two sentences for its tip.
    pub help: &'static str,
}

/// One option of a [`Choice`].
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct ChoiceOption {
    /// Word in files and on the command line.
    pub key: &'static str,
    /// Name shown.
    pub name: &'static str,
    /// One sentence for its tip.
    pub help: &'static str,
}

impl Choice {
    /// The option with this key.
    pub fn option(&self, key: &str) -> Option<&'static ChoiceOption> {
        self.options.iter().find(|option| option.key == key)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn bounds_say_what_is_wanted() {
        let refused = |bounds: Bounds, value| bounds.check(value, Unit::Volt).expect_err("must be refused");
        assert_eq!(refused(Bounds::Positive, -3.0), "must be above 0 V, and is −3 V");
        assert_eq!(refused(Bounds::Positive, 0.0), "must be above 0 V, and is 0 V");
        assert_eq!(refused(Bounds::Between(1.0, 2.0), 2.5), "must be from 1 V to 2 V, and is 2.5 V");
        assert_eq!(refused(Bounds::PositiveUpTo(0.5), 1.0), "must be above 0 V and at most 500 mV, and is 1 V");
        assert_eq!(refused(Bounds::Above(1.0), 1.0), "must be above 1 V, and is 1 V");
        assert_eq!(refused(Bounds::AtLeast(1.0), 0.5), "must be 1 V or above, and is 500 mV");
        assert_eq!(refused(Bounds::Positive, f64::NAN), "must be a finite number");
        assert!(refused(Bounds::Positive, 1e300).contains("1e300 V"));
        assert!(refused(Bounds::Finite, 1e-300).contains("nearer to zero"));
        assert_eq!(Bounds::NonNegative.check(0.0, Unit::Volt), Ok(()));
        assert_eq!(Bounds::Between(1.0, 2.0).check(2.0, Unit::Volt), Ok(()));
    }
}
