//! The designs that come with the program: own scenarios, one file each in `sample-designs/`.

use super::Design;
use super::file::{FileError, read};

/// A design that comes with the program.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Sample {
    /// Name of its file.
    pub file: &'static str,
    /// Its title, as in the file.
    pub title: &'static str,
    /// What it shows, in one line.
    pub line: &'static str,
    /// Text of its file.
    pub ron: &'static str,
}

macro_rules! sample {
    ($file:literal, $title:literal, $line:literal) => {
        Sample { file: $file, title: $title, line: $line, ron: include_str!(concat!("../../sample-designs/", $file)) }
    };
}

static ALL: &[Sample] = &[sample!(
    "gimbal-rail.ron",
    "Gimbal rail",
    "A finished boost, 9 to 16 V in, 24 V out, that meets all it is asked."
)];

impl Sample {
    /// The design itself.
    ///
    /// # Errors
    /// None in a release: a test reads every sample.
    pub fn design(&self) -> Result<Design, FileError> {
        read(&mut self.ron.as_bytes())
    }
}

/// Every sample, in the order shown.
pub fn all() -> &'static [Sample] {
    ALL
}

/// The design the program opens with.
pub fn built_in() -> Design {
    // A test reads every sample; a broken one would still leave a program that opens.
    ALL.first().and_then(|sample| sample.design().ok()).unwrap_or_default()
}
