//! Curves as comma-separated values (RFC 4180): one row per frequency or instant, the unit in each column's name.
//!
//! *Conventions*: numbers are printed so that they read back bit for bit, with a decimal point; a value that is not finite is
//! an empty field.

use crate::analysis::{Curves, Steady, Step};
use crate::quantity::Unit;
use std::io::{self, Write};

/// A column: its name and its values.
type Column<'a> = (&'a str, &'a [f64]);

/// Writes the frequency curves of one condition.
///
/// # Errors
/// As the writer.
pub fn write_curves(curves: &Curves, out: impl Write) -> io::Result<()> {
    let columns: [Column<'_>; 15] = [
        ("frequency_hz", &curves.frequencies_hz),
        ("plant_db", &curves.plant_db),
        ("plant_deg", &curves.plant_deg),
        ("compensator_db", &curves.compensator_db),
        ("compensator_deg", &curves.compensator_deg),
        ("loop_db", &curves.loop_db),
        ("loop_deg", &curves.loop_deg),
        ("output_impedance_ohm", &curves.output_impedance_ohm),
        ("output_impedance_deg", &curves.output_impedance_deg),
        ("open_loop_output_impedance_ohm", &curves.open_loop_output_impedance_ohm),
        ("line_to_output_db", &curves.line_to_output_db),
        ("line_to_output_deg", &curves.line_to_output_deg),
        ("open_loop_line_to_output_db", &curves.open_loop_line_to_output_db),
        ("reference_to_output_db", &curves.reference_to_output_db),
        ("reference_to_output_deg", &curves.reference_to_output_deg),
    ];
    write(&columns, out)
}

/// Writes a time response.
///
/// # Errors
/// As the writer.
pub fn write_step(step: &Step, out: impl Write) -> io::Result<()> {
    write(&[("time_s", &step.times_s), ("output_voltage_v", &step.output_v)], out)
}

/// Writes the waveforms of a steady period: a row for every sampled instant, two at an instant where values jump.
///
/// # Errors
/// As the writer.
pub fn write_waves(steady: &Steady, out: impl Write) -> io::Result<()> {
    let Some(first) = steady.waves.first() else { return Ok(()) };
    let names =
        steady.waves.iter().map(|wave| column_name(&wave.name, if wave.unit() == Unit::Volt { "v" } else { "a" }));
    let names: Vec<String> = std::iter::once("time_s".to_owned()).chain(names).collect();
    let values: Vec<&[f64]> =
        std::iter::once(&*first.times_s).chain(steady.waves.iter().map(|wave| &*wave.values)).collect();
    write_named(&names, &values, out)
}

/// A name as a column's: "inductor current" in amperes is `inductor_current_a`.
fn column_name(name: &str, unit: &str) -> String {
    let plain: String =
        name.chars().map(|c| if c.is_ascii_alphanumeric() { c.to_ascii_lowercase() } else { '_' }).collect();
    if unit.is_empty() { plain } else { format!("{plain}_{unit}") }
}

fn write_named(names: &[String], values: &[&[f64]], out: impl Write) -> io::Result<()> {
    let columns: Vec<Column<'_>> = names.iter().map(String::as_str).zip(values.iter().copied()).collect();
    write(&columns, out)
}

fn write(columns: &[Column<'_>], out: impl Write) -> io::Result<()> {
    let mut writer = csv::WriterBuilder::new().terminator(csv::Terminator::CRLF).from_writer(out);
    writer.write_record(columns.iter().map(|(name, _)| *name))?;
    let rows = columns.first().map_or(0, |(_, values)| values.len());
    for row in 0..rows {
        let field = |values: &[f64]| values.get(row).filter(|v| v.is_finite()).map_or(String::new(), f64::to_string);
        writer.write_record(columns.iter().map(|(_, values)| field(values)))?;
    }
    writer.flush()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn numbers_read_back_bit_for_bit_and_what_is_not_finite_is_empty() {
        let values = [1.0 / 3.0, f64::NAN, 6.02e23, 1e-30];
        let step = Step {
            times_s: vec![0.0, 1e-6, 2e-6, 3e-6],
            output_v: values.to_vec(),
            deviation_v: 0.0,
            deviation_at_s: None,
            settling_s: None,
            initial_v: 0.0,
            final_v: 0.0,
            band_v: 0.0,
            control_v: (0.0, 0.0),
            size: 1.0,
            rise_s: 0.0,
        };
        let mut bytes = Vec::new();
        write_step(&step, &mut bytes).expect("written");
        let text = String::from_utf8(bytes).expect("text");
        assert!(text.starts_with("time_s,output_voltage_v\r\n"));
        let mut reader = csv::Reader::from_reader(text.as_bytes());
        let read: Vec<Option<f64>> = reader.records().map(|row| row.expect("a row")[1].parse().ok()).collect();
        assert_eq!(read, [Some(values[0]), None, Some(values[2]), Some(values[3])]);
    }

    #[test]
    fn waveforms_have_a_column_each_with_its_unit() {
        use crate::analysis::{Level, Shown, steady};
        let design = crate::design::sample::built_in().check().expect("usable");
        let steady = steady(&design, Shown::Levels(Level::Nominal, Level::Nominal)).expect("it has one");
        let mut bytes = Vec::new();
        write_waves(&steady, &mut bytes).expect("written");
        let text = String::from_utf8(bytes).expect("text");
        let mut reader = csv::Reader::from_reader(text.as_bytes());
        let names = reader.headers().expect("a heading").clone();
        assert_eq!(names.len(), steady.waves.len() + 1);
        assert_eq!((&names[0], &names[1]), ("time_s", "inductor_a"));
        assert!(names.iter().any(|name| name == "switch_node_v"), "{names:?}");
        assert_eq!(reader.records().count(), steady.waves[0].times_s.len());
    }
}
