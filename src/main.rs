//! Chooses between the window and the terminal.

use polewright::terminal::{self, Command, Opening, Outcome, Usage};
use std::io::{self, Write};
use std::process::ExitCode;
use std::time::Instant;

/// Exit code when an input cannot be used, the window included.
const UNUSABLE: u8 = 2;

fn main() -> ExitCode {
    let started = Instant::now();
    let (mut out, mut err) = (io::stdout().lock(), io::stderr().lock());
    let code = match terminal::parse(std::env::args_os()) {
        Ok(Command::Check(request)) => ended(terminal::check(&request, &mut out, &mut err), &mut err),
        Ok(Command::Transient(request)) => ended(terminal::transient(&request, &mut out, &mut err), &mut err),
        Ok(Command::Open(opening)) => {
            drop((out, err));
            match open(opening, started) {
                Ok(report) => say(&mut io::stdout(), &report, 0),
                Err(message) => say(&mut io::stderr(), &message, UNUSABLE),
            }
        }
        Err(Usage { text, is_error: true }) => say(&mut err, &text, UNUSABLE),
        Err(Usage { text, is_error: false }) => say(&mut out, &text, 0),
    };
    ExitCode::from(code)
}

/// Exit code of a report that was written, or could not be.
fn ended(outcome: io::Result<Outcome>, err: &mut impl Write) -> u8 {
    match outcome {
        Ok(outcome) => outcome.code(),
        // The reader went away, as `head` does: what it wanted it has.
        Err(error) if error.kind() == io::ErrorKind::BrokenPipe => 0,
        Err(error) => say(err, &format!("The report could not be written: {error}.\n"), UNUSABLE),
    }
}

/// Prints a text as far as that is possible and passes the exit code on.
fn say(to: &mut impl Write, text: &str, code: u8) -> u8 {
    let _ = to.write_all(text.as_bytes());
    code
}

/// Opens the window and works until it is closed; gives back what a measurement has to report.
#[cfg(feature = "window")]
fn open(opening: Opening, started: Instant) -> Result<String, String> {
    use polewright::design::{file::load, sample};
    use polewright::window::{Measurement, run};
    let design = match &opening.file {
        Some(path) => load(path).map_err(|error| format!("{error}\n"))?,
        None => sample::built_in(),
    };
    let measurement = opening.measure.map(|rest| Measurement::new(started, rest));
    run(design, opening.file, measurement.clone()).map_err(|error| format!("{error}.\n"))?;
    Ok(measurement.map(|measurement| measurement.to_string()).unwrap_or_default())
}

#[cfg(not(feature = "window"))]
fn open(_: Opening, _: Instant) -> Result<String, String> {
    Err("The window cannot be opened: this program was built without it (Cargo feature `window`).\n\
         Build it with `cargo run --release`, or ask the same in the terminal: polewright check FILE\n"
        .into())
}
