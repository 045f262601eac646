//! The arguments of the command line, read into typed requests.

use crate::analysis::TransientEvent;
use crate::design::printable;
use crate::quantity::{Bounds, Unit};
use clap::error::ErrorKind;
use clap::{Args, Parser, Subcommand};
use std::ffi::OsString;
use std::path::PathBuf;
use std::time::Duration;

/// What the command line asks for.
#[derive(Clone, Debug, PartialEq)]
pub enum Command {
    /// Open the window.
    Open(Opening),
    /// Check designs and report.
    Check(CheckRequest),
    /// Follow a design through an event, period by period.
    Transient(TransientCommand),
}

/// How the window is opened.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Opening {
    /// The design file; without one the built-in design is opened.
    pub file: Option<PathBuf>,
    /// Measure the start and so long a rest, report, and close.
    pub measure: Option<Duration>,
}

/// What `polewright check` asks for.
#[derive(Clone, Debug, PartialEq)]
pub struct CheckRequest {
    /// Design files, in the order given.
    pub files: Vec<PathBuf>,
    /// Report as JSON.
    pub json: bool,
    /// Frequencies of the response [Hz], in the order asked for; none given leaves the choice to the report.
    pub at_hz: Option<Vec<f64>>,
    /// Input voltage in place of the nominal one [V].
    pub input_voltage: Option<f64>,
    /// Load current in place of the nominal one [A].
    pub load_current: Option<f64>,
    /// Whether the load is swept too.
    pub load_sweep: bool,
    /// Whether the exact switched model is asked, too.
    pub switched: bool,
    /// Entries set before the check, by path, in the order given.
    pub settings: Vec<(String, String)>,
}

/// What `polewright transient` asks for.
#[derive(Clone, Debug, PartialEq)]
pub struct TransientCommand {
    /// The design file.
    pub file: PathBuf,
    /// The event.
    pub event: TransientEvent,
    /// Report as JSON.
    pub json: bool,
    /// File that takes the waveforms as comma-separated values.
    pub csv: Option<PathBuf>,
    /// Rows of that file.
    pub rows: usize,
    /// Time from the event on [s]; none leaves it to the event.
    pub span_s: Option<f64>,
    /// Input voltage in place of the nominal one [V].
    pub input_voltage: Option<f64>,
    /// Load current in place of the nominal one [A].
    pub load_current: Option<f64>,
    /// Entries set before the run, by path, in the order given.
    pub settings: Vec<(String, String)>,
}

/// A text to print instead of working: help, version, or what is wrong with the arguments.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Usage {
    /// The text, line ends included.
    pub text: String,
    /// Whether the arguments are wrong; otherwise help or version was asked for.
    pub is_error: bool,
}

/// Close the feedback loop around a switching power converter.
#[derive(Parser)]
#[command(name = "polewright", version, args_conflicts_with_subcommands = true)]
struct Arguments {
    /// Design file to open in the window; without one the built-in design is opened.
    file: Option<PathBuf>,
    /// Measure instead of work: open the window, leave it alone for so many seconds, say how long the start took, how many frames
    /// were painted at rest and how much memory is used, and close.
    #[arg(long, value_name = "SECONDS", value_parser = seconds)]
    measure: Option<Duration>,
    #[command(subcommand)]
    command: Option<Task>,
}

#[derive(Subcommand)]
enum Task {
    /// Check designs: operating point, margins, worst conditions, requirements, findings.
    ///
    /// Exit code: 0 when every loop is stable and every requirement is met, 1 when one is not, 2 when an input cannot be used; the
    /// worst of all files.
    Check(CheckArguments),
    /// Follow the switched closed loop of a design through an event, period by period.
    ///
    /// Exit code: 0 when the run came to its end, 1 when it stopped before, 2 when an input cannot be used.
    Transient(TransientArguments),
}

#[derive(Args)]
struct CheckArguments {
    /// Design files.
    #[arg(required = true)]
    files: Vec<PathBuf>,
    /// Report as JSON: an array with one object per file.
    #[arg(long)]
    json: bool,
    /// Frequencies of the response, such as 100,1k,10k. A comma separates frequencies; a decimal point is written 1.5k.
    #[arg(long, value_name = "FREQUENCIES", value_delimiter = ',', value_parser = frequency, allow_hyphen_values = true)]
    at: Option<Vec<f64>>,
    /// Input voltage in place of the nominal one, such as 11.5.
    #[arg(long, value_name = "VOLTAGE", value_parser = voltage, allow_hyphen_values = true)]
    input_voltage: Option<f64>,
    /// Load current in place of the nominal one, such as 800m.
    #[arg(long, value_name = "CURRENT", value_parser = current, allow_hyphen_values = true)]
    load_current: Option<f64>,
    /// Sweep the load at three input voltages: duty ratio, conduction, crossover, margins.
    #[arg(long)]
    load_sweep: bool,
    /// Ask the exact switched model, too: margins as an analyser reads them, multipliers, how far the averaged model holds, what the
    /// parts bear.
    #[arg(long)]
    switched: bool,
    /// Set an entry or a choice before the check, such as stage.inductor.inductance=8.2u; may be repeated.
    #[arg(long = "set", value_name = "PATH=VALUE", value_parser = setting)]
    settings: Vec<(String, String)>,
}

#[derive(Args)]
struct TransientArguments {
    /// Design file.
    file: PathBuf,
    /// The event: start-up, load-step, line-step, reference-step or overload.
    #[arg(long, value_parser = event)]
    event: TransientEvent,
    /// Report as JSON: one object.
    #[arg(long)]
    json: bool,
    /// Write the waveforms to this file: comma-separated values, least and greatest of every signal in each row's time.
    #[arg(long, value_name = "OUT")]
    csv: Option<PathBuf>,
    /// Rows of the waveforms.
    #[arg(long, value_name = "COUNT", default_value_t = 2000, value_parser = clap::value_parser!(u32).range(10..=1_000_000))]
    rows: u32,
    /// How long the event is followed, such as 5m for 5 ms.
    #[arg(long, value_name = "TIME", value_parser = time, allow_hyphen_values = true)]
    span: Option<f64>,
    /// Input voltage in place of the nominal one, such as 11.5.
    #[arg(long, value_name = "VOLTAGE", value_parser = voltage, allow_hyphen_values = true)]
    input_voltage: Option<f64>,
    /// Load current in place of the nominal one, such as 800m.
    #[arg(long, value_name = "CURRENT", value_parser = current, allow_hyphen_values = true)]
    load_current: Option<f64>,
    /// Set an entry or a choice before the run, such as event.soft-start=3m; may be repeated.
    #[arg(long = "set", value_name = "PATH=VALUE", value_parser = setting)]
    settings: Vec<(String, String)>,
}

/// Reads the arguments, the program's own name first.
///
/// # Errors
/// The text to print when help or version is asked for or the arguments are wrong.
pub fn parse(arguments: impl IntoIterator<Item = OsString>) -> Result<Command, Usage> {
    let arguments = Arguments::try_parse_from(arguments).map_err(|error| usage(&error))?;
    match arguments.command {
        None => Ok(Command::Open(Opening { file: arguments.file, measure: arguments.measure })),
        Some(Task::Check(check)) => Ok(Command::Check(check.into())),
        Some(Task::Transient(transient)) => Ok(Command::Transient(transient.into())),
    }
}

fn usage(error: &clap::Error) -> Usage {
    let asked = matches!(error.kind(), ErrorKind::DisplayHelp | ErrorKind::DisplayVersion);
    Usage { text: printable(&error.render().to_string()), is_error: !asked }
}

impl From<CheckArguments> for CheckRequest {
    fn from(arguments: CheckArguments) -> Self {
        let CheckArguments { files, json, at, input_voltage, load_current, load_sweep, switched, settings } = arguments;
        Self { files, json, at_hz: at, input_voltage, load_current, load_sweep, switched, settings }
    }
}

impl From<TransientArguments> for TransientCommand {
    fn from(arguments: TransientArguments) -> Self {
        let TransientArguments { file, event, json, csv, rows, span, input_voltage, load_current, settings } =
            arguments;
        let rows = usize::try_from(rows).unwrap_or(usize::MAX);
        Self { file, event, json, csv, rows, span_s: span, input_voltage, load_current, settings }
    }
}

fn event(text: &str) -> Result<TransientEvent, String> {
    TransientEvent::from_key(text).ok_or_else(|| {
        let keys: Vec<&str> = TransientEvent::ALL.iter().map(|event| event.key()).collect();
        format!("choose one of {}", keys.join(", "))
    })
}

fn time(text: &str) -> Result<f64, String> {
    positive(text, Unit::Second)
}

fn positive(text: &str, unit: Unit) -> Result<f64, String> {
    let value = crate::quantity::parse(text, unit).map_err(|error| error.to_string())?;
    Bounds::Positive.check(value, unit).map(|()| value)
}

fn seconds(text: &str) -> Result<Duration, String> {
    positive(text, Unit::Second).map(Duration::from_secs_f64)
}

fn frequency(text: &str) -> Result<f64, String> {
    positive(text, Unit::Hertz)
}

fn voltage(text: &str) -> Result<f64, String> {
    positive(text, Unit::Volt)
}

fn current(text: &str) -> Result<f64, String> {
    positive(text, Unit::Ampere)
}

fn setting(text: &str) -> Result<(String, String), String> {
    match text.split_once('=') {
        Some((path, value)) => Ok((path.trim().to_owned(), value.to_owned())),
        None => Err("write PATH=VALUE, such as stage.inductor.inductance=8.2u".into()),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn read(line: &str) -> Result<Command, Usage> {
        parse(line.split_whitespace().map(OsString::from))
    }

    #[test]
    fn without_a_task_the_window_opens() {
        assert_eq!(read("polewright"), Ok(Command::Open(Opening::default())));
        let opening = Opening { file: Some("a.ron".into()), measure: None };
        assert_eq!(read("polewright a.ron"), Ok(Command::Open(opening.clone())));
        let measured = Opening { measure: Some(Duration::from_millis(2500)), ..opening };
        assert_eq!(read("polewright --measure 2.5 a.ron"), Ok(Command::Open(measured)));
    }

    #[test]
    fn a_check_is_read_in_engineering_notation() {
        let line = "polewright check a.ron b.ron --json --at 100,1k,10k --input-voltage 11.5V --load-current 800m --load-sweep --switched \
                    --set stage.inductor.inductance=8.2u --set stage.topology=buck";
        let Ok(Command::Check(request)) = read(line) else { panic!("a check") };
        assert_eq!(request.files, [PathBuf::from("a.ron"), PathBuf::from("b.ron")]);
        assert!(request.json);
        assert_eq!(request.at_hz, Some(vec![100.0, 1e3, 1e4]));
        assert_eq!((request.input_voltage, request.load_current), (Some(11.5), Some(0.8)));
        assert!(request.load_sweep && request.switched);
        assert_eq!(request.settings[1], ("stage.topology".into(), "buck".into()));
    }

    #[test]
    fn a_transient_is_read() {
        let line = "polewright transient a.ron --event overload --csv out.csv --span 5m --load-current 2 --set event.overload.time=2m";
        let Ok(Command::Transient(request)) = read(line) else { panic!("a transient") };
        assert_eq!((request.event, request.rows), (TransientEvent::Overload, 2000));
        assert_eq!((request.span_s, request.load_current), (Some(5e-3), Some(2.0)));
        assert_eq!(request.csv, Some("out.csv".into()));
        assert_eq!(request.settings, [("event.overload.time".into(), "2m".into())]);
    }

    #[test]
    fn wrong_arguments_are_told() {
        for (line, said) in [
            ("polewright check", "required"),
            ("polewright check a.ron --input-voltage -5", "above 0 V"),
            ("polewright check a.ron --load-current 0", "above 0 A"),
            ("polewright check a.ron --at 1k,fast", "not a number"),
            ("polewright check a.ron --at 10V", "a voltage"),
            ("polewright check a.ron --at \u{1b}[31m", "\u{FFFD}[31m"),
            ("polewright check a.ron --set stage.topology", "PATH=VALUE"),
            ("polewright check a.ron --jsno", "--json"),
            ("polewright transient a.ron", "--event"),
            ("polewright transient a.ron --event load", "load-step"),
            ("polewright transient a.ron --event load-step --span -1m", "above 0 s"),
            ("polewright transient a.ron --event load-step --rows 0", "10.."),
            ("polewright transient --event load-step", "required"),
            ("polewright --measure 0", "above 0 s"),
            ("polewright --measure 2h", "not"),
            ("polewright --measure 4000", "the most that is taken"),
        ] {
            let usage = read(line).expect_err(line);
            assert!(usage.is_error && usage.text.contains(said), "{line}: {}", usage.text);
        }
        assert!(!read("polewright --help").expect_err("help").is_error);
    }
}
