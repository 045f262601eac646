//! The coefficients of a difference equation in a plain form that can be typed into a controller: values, codes, scale.

use crate::compensator::{Codes, DifferenceEquation, Digital, FixedPoint, limits};
use crate::design::printable;
use crate::quantity::{Unit, print};

/// The equation with its coefficients by name: "u[n] = a1·u[n-1] + … + b0·e[n] + …".
pub fn equation(codes: &FixedPoint) -> String {
    let term = |name: char, signal: char, k: usize| {
        let back = if k == 0 { String::new() } else { format!("-{k}") };
        format!("{name}{k}*{signal}[n{back}]")
    };
    let feedback = (1..=codes.feedback.codes.len()).map(|k| term('a', 'u', k));
    let forward = (0..codes.forward.codes.len()).map(|k| term('b', 'e', k));
    format!("u[n] = {}", feedback.chain(forward).collect::<Vec<_>>().join(" + "))
}

/// The list in lines: the equation, what its signals are, and a row for each coefficient with value, code and the value before rounding.
pub fn coefficients(digital: &Digital, codes: &FixedPoint, exact: &DifferenceEquation) -> Vec<String> {
    let (least, greatest) = limits(digital.bits);
    let mut lines = vec![
        equation(codes),
        format!(
            "e = (reference - sampled tap) / {}, u = {}",
            print(digital.input_range, Unit::Volt),
            if digital.duty_command {
                "duty ratio".to_owned()
            } else {
                format!("control voltage / {}", print(digital.output_range, Unit::Volt))
            }
        ),
        format!("words of {} bits, {least} to {greatest}; value = code / 2^fraction bits", digital.bits),
        columns(["", "value", "code", "fraction bits", "before rounding"]),
    ];
    lines.extend(rows('a', 1, &codes.feedback, &exact.feedback));
    lines.extend(rows('b', 0, &codes.forward, &exact.forward));
    lines
}

/// The same as text with a title, for a clipboard or a file.
pub fn coefficient_list(title: &str, digital: &Digital) -> Option<String> {
    let codes = digital.fixed_point()?;
    let lines = coefficients(digital, &codes, &digital.exact());
    let lines: Vec<&str> = lines.iter().map(|line| line.trim_end()).collect();
    Some(format!("{}: difference equation\n{}\n", printable(&title.replace(['\n', '\r'], " ")), lines.join("\n")))
}

fn rows(name: char, first: usize, codes: &Codes, exact: &[f64]) -> Vec<String> {
    let each = codes.values().into_iter().zip(&codes.codes).zip(exact).enumerate();
    each.map(|(k, ((value, code), exact))| {
        columns([
            &format!("{name}{}", first + k),
            &format!("{value}"),
            &code.to_string(),
            &codes.fraction_bits.to_string(),
            &format!("{exact:.12}"),
        ])
    })
    .collect()
}

/// Five columns, aligned.
fn columns(words: [&str; 5]) -> String {
    format!("{:<4}{:<24}{:<14}{:<15}{}", words[0], words[1], words[2], words[3], words[4])
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::compensator::Compensator;
    use crate::design::Design;

    /// Definition: a value is its code over two to the fraction bits, and the rows say so.
    #[test]
    fn every_row_is_its_code_over_its_scale() {
        let mut design = Design { title: "Two\nlines".into(), ..Design::default() };
        design.set_from_text("compensator.amplifier", "digital").unwrap();
        let digital = Compensator::from_values(&design.values, &design.choices).unwrap().digital().unwrap();
        let text = coefficient_list(&design.title, &digital).unwrap();
        assert!(
            text.starts_with("Two lines: difference equation\nu[n] = a1*u[n-1] + a2*u[n-2] + a3*u[n-3] + b0*e[n] + ")
        );
        let rows: Vec<Vec<f64>> = text
            .lines()
            .filter(|line| line.starts_with(['a', 'b']))
            .map(|line| line.split_whitespace().skip(1).map(|word| word.parse().unwrap()).collect())
            .collect();
        assert_eq!(rows.len(), 7);
        for row in &rows {
            let [value, code, places, exact] = row[..] else { panic!("{row:?}") };
            assert!((value - code / 2f64.powf(places)).abs() < 1e-15);
            assert!((value - exact).abs() <= 1.5 / 2f64.powf(places));
        }
        let sum: f64 = rows[..3].iter().map(|row| row[0]).sum();
        assert!((sum - 1.0).abs() < 1e-15, "an integrator");
    }
}
