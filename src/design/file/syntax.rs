//! What the RON reader says, in words for someone who has never seen its library.

use super::error::FileErrorKind;
use ron::Error;

/// How a design file is laid out, for hints.
const LAYOUT: &str = "a design file is RON text: ( format: 1, title: \"…\", choices: {…}, values: {…} )";

/// A failure of the RON reader, with its line and a hint.
pub(super) fn syntax(error: &ron::error::SpannedError) -> FileErrorKind {
    FileErrorKind::Syntax {
        line: error.span.start.line,
        column: error.span.start.col,
        reason: reason(&error.code),
        hint: hint(&error.code).into(),
    }
}

/// What is wrong, as a sentence.
fn reason(error: &Error) -> String {
    match error {
        Error::Message(message) => format!("{message}."),
        Error::Eof => "The file ends in the middle of the design.".into(),
        Error::ExpectedStringEnd => "A text is opened with a quotation mark and never closed.".into(),
        Error::UnclosedBlockComment => "A comment is opened with “/*” and never closed.".into(),
        Error::ExpectedString => "A text in quotation marks is expected here.".into(),
        Error::ExpectedInteger | Error::IntegerOutOfBounds | Error::InvalidIntegerDigit { .. } => {
            "A whole number from 0 up is expected here.".into()
        }
        Error::ExpectedComma => "A comma is expected here.".into(),
        Error::ExpectedArray | Error::ExpectedArrayEnd => "A list in square brackets […] is expected here.".into(),
        Error::ExpectedMap | Error::ExpectedMapEnd => "Entries in braces {…} are expected here.".into(),
        Error::ExpectedMapColon => "A colon is expected between a name and its value.".into(),
        Error::ExpectedDifferentStructName { .. }
        | Error::ExpectedNamedStructLike(_)
        | Error::ExpectedStructLike
        | Error::ExpectedStructName(_)
        | Error::InvalidIdentifier(_)
        | Error::SuggestRawIdentifier(_)
        | Error::ExpectedIdentifier => "This does not read as a design.".into(),
        Error::ExpectedStructLikeEnd | Error::ExpectedOptionEnd => "A closing parenthesis is expected here.".into(),
        Error::InvalidEscape(_) => "A backslash in this text is followed by what it cannot be followed by.".into(),
        Error::NoSuchExtension(name) => format!("There is no extension “{name}” of RON."),
        Error::TrailingCharacters => "Something follows after the end of the design.".into(),
        Error::NoSuchStructField { found, .. } => format!("There is no field “{found}” in a design."),
        Error::MissingStructField { field, .. } => format!("The field “{field}” is missing."),
        Error::DuplicateStructField { field, .. } => format!("The field “{field}” stands twice."),
        Error::ExceededRecursionLimit => "The text is nested too deeply.".into(),
        _ => "This cannot be read as part of a design.".into(),
    }
}

/// What would help.
fn hint(error: &Error) -> &'static str {
    match error {
        Error::Eof | Error::ExpectedStringEnd => "the file ends too early; it may have been cut off",
        Error::ExpectedString => "numbers are written as text with their unit, such as \"10 µH\"",
        Error::ExceededRecursionLimit => "a design file is never nested this deeply",
        Error::NoSuchStructField { .. } => "the field may be misspelt or come from a later release",
        Error::MissingStructField { .. } => "every design file has format, title, choices and values",
        // The structure's own message: an entry that stands twice.
        Error::Message(_) | Error::DuplicateStructField { .. } => "keep one of the two",
        Error::InvalidEscape(_) => "write \\\\ for a backslash, \\\" for a quotation mark, \\n for a new line",
        _ => LAYOUT,
    }
}
