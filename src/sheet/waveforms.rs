//! Waveforms of a transient as comma-separated values (RFC 4180): one row per column of the plot, least and greatest of every signal.
//!
//! *Conventions*: as the other curves; times are the middles of the columns, from the event's begin.

use crate::switched::{Trace, Waveforms};
use std::io::{self, Write};

/// Name of a signal's column: "load voltage" in volts becomes `load_voltage_v`.
fn heading(trace: &Trace, which: &str) -> String {
    let unit = trace.unit.symbol().to_lowercase();
    format!("{}_{unit}_{which}", trace.name.replace([' ', '-'], "_"))
}

/// Writes waveforms.
///
/// # Errors
/// As the writer.
pub fn write_waveforms(waveforms: &Waveforms, out: impl Write) -> io::Result<()> {
    let mut writer = csv::WriterBuilder::new().terminator(csv::Terminator::CRLF).from_writer(out);
    let named = waveforms.traces.iter().flat_map(|trace| ["least", "greatest"].map(|which| heading(trace, which)));
    writer.write_record(std::iter::once("time_s".to_owned()).chain(named))?;
    let field =
        |values: &[f64], k: usize| values.get(k).filter(|v| v.is_finite()).map_or(String::new(), f64::to_string);
    for k in 0..waveforms.filled {
        let values = waveforms.traces.iter().flat_map(|trace| [field(&trace.least, k), field(&trace.greatest, k)]);
        writer.write_record(std::iter::once(waveforms.time_s(k).to_string()).chain(values))?;
    }
    writer.flush()
}
