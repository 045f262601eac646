//! Curves as comma-separated values (RFC 4180): one row per frequency or instant, the unit in each column's name.
//!
//! *Conventions*: numbers are printed so that they read back bit for bit, with a decimal point; a value that is not finite is
//! an empty field.

use crate::analysis::{Curves, Step};
use std::io::{self, Write};

/// A column: its name and its values.
type Column<'a> = (&'static str, &'a [f64]);

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
}
