//! Chooses between the window and the terminal.

use polewright::terminal::{self, Command, Usage};
use std::io::{self, Write};
use std::path::PathBuf;
use std::process::ExitCode;

/// Exit code when an input cannot be used, the window included.
const UNUSABLE: u8 = 2;

fn main() -> ExitCode {
    let (mut out, mut err) = (io::stdout().lock(), io::stderr().lock());
    let code = match terminal::parse(std::env::args_os()) {
        Ok(Command::Check(request)) => match terminal::check(&request, &mut out, &mut err) {
            Ok(outcome) => outcome.code(),
            // The reader went away, as `head` does: what it wanted it has.
            Err(error) if error.kind() == io::ErrorKind::BrokenPipe => 0,
            Err(error) => say(&mut err, &format!("The report could not be written: {error}.\n"), UNUSABLE),
        },
        Ok(Command::Open(file)) => {
            drop((out, err));
            match open(file) {
                Ok(()) => 0,
                Err(message) => say(&mut io::stderr(), &message, UNUSABLE),
            }
        }
        Err(Usage { text, is_error: true }) => say(&mut err, &text, UNUSABLE),
        Err(Usage { text, is_error: false }) => say(&mut out, &text, 0),
    };
    ExitCode::from(code)
}

/// Prints a text as far as that is possible and passes the exit code on.
fn say(to: &mut impl Write, text: &str, code: u8) -> u8 {
    let _ = to.write_all(text.as_bytes());
    code
}

#[cfg(feature = "window")]
fn open(file: Option<PathBuf>) -> Result<(), String> {
    use polewright::design::{file::load, sample};
    let design = match &file {
        Some(path) => load(path).map_err(|error| format!("{error}\n"))?,
        None => sample::built_in(),
    };
    polewright::window::run(design, file).map_err(|error| format!("{error}.\n"))
}

#[cfg(not(feature = "window"))]
fn open(_: Option<PathBuf>) -> Result<(), String> {
    Err("The window cannot be opened: this program was built without it (Cargo feature `window`).\n\
         Build it with `cargo run --release`, or ask the same in the terminal: polewright check FILE\n"
        .into())
}
