//! What can go wrong with a linear system.

use std::fmt;

/// Why a linear system could not be built or evaluated.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum LinearError {
    /// Matrices, names or arguments that do not fit together; says which.
    Shape(String),
    /// No input or output of that name.
    UnknownPort(String),
    /// A number that is not finite, going in or coming out.
    NotFinite,
    /// The algebraic loop through the direct paths has no unique solution.
    AlgebraicLoop,
    /// The system has a pole exactly where it was to be evaluated.
    PoleThere,
    /// More zeros than poles: no state space has that response.
    Improper,
    /// An iteration that did not converge within its bound.
    NoConvergence,
    /// A result that exists only for a stable system was asked of one that is not.
    NotStable,
}

impl fmt::Display for LinearError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::Shape(what) => write!(f, "sizes do not fit: {what}"),
            Self::UnknownPort(name) => write!(f, "there is no input or output named “{name}”"),
            Self::NotFinite => write!(f, "a number is not finite"),
            Self::AlgebraicLoop => write!(f, "the direct paths form a loop without a unique solution"),
            Self::PoleThere => write!(f, "the system has a pole exactly there"),
            Self::Improper => write!(f, "more zeros than poles"),
            Self::NoConvergence => write!(f, "an iteration did not converge"),
            Self::NotStable => write!(f, "the system is not stable"),
        }
    }
}

impl std::error::Error for LinearError {}
