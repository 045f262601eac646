//! Tables for the clipboard: rows with tabs between the columns, so that they paste into a spreadsheet, a mail or a ticket.

use super::coefficients::coefficient_list;
use crate::analysis::{Analysis, LimitKind, Readout};
use crate::compensator::Series;
use crate::design::{CheckedDesign, Design, entry, printable};
use crate::quantity::{Unit, print, print_digits};

/// Number of digits of results.
const DIGITS: usize = 4;

/// The parts of the compensator as ordered: designator, value, series, whether it is locked.
pub fn parts_list(design: &Design, checked: &CheckedDesign) -> String {
    let (resistors, capacitors) = Series::chosen(&design.choices);
    let mut rows = vec![row(&["Part", "Value", "Series", "Kept"])];
    for part in checked.compensator.fitted() {
        let Some(entry) = entry(part.path()) else { continue };
        let series = if part.is_resistor() { resistors } else { capacitors };
        let kept = if design.locks.contains(part.path()) { "kept" } else { "" };
        let value = print(checked.compensator.parts.get(part), entry.unit);
        rows.push(row(&[entry.name, &value, series.key(), kept]));
    }
    let parts = headed(&design.title, "compensator parts", &rows);
    match checked.compensator.digital().and_then(|digital| coefficient_list(&design.title, &digital)) {
        Some(coefficients) => format!("{parts}\n{coefficients}"),
        None => parts,
    }
}

/// Every read-out: at the shown condition, worst of the conditions and where, what is required and whether it is met.
pub fn margin_table(design: &Design, analysis: &Analysis) -> String {
    let mut rows = vec![row(&["Quantity", &format!("At {}", analysis.place()), "Worst", "At", "Required", "Met"])];
    for readout in &analysis.readouts {
        let here = readout.value.map_or(readout.absent.to_owned(), |value| figure(value, readout));
        let worst = readout.worst.as_ref();
        let value = worst.map_or(String::new(), |w| w.value.map_or("none".to_owned(), |value| figure(value, readout)));
        let at = worst.map_or("", |w| w.condition.as_str());
        let asked: Vec<&_> = readout.requirements.iter().collect();
        if asked.is_empty() {
            rows.push(row(&[readout.name, &here, &value, at, "", ""]));
        }
        for (k, verdict) in asked.into_iter().enumerate() {
            let sign = if verdict.kind == LimitKind::AtLeast { "≥" } else { "≤" };
            let scope = if verdict.over_all_conditions { "everywhere" } else { "nominal" };
            let limit = format!("{sign} {} {scope}", print(verdict.limit, verdict.unit));
            let met = if verdict.met { "yes" } else { "no" };
            let first = [readout.name, here.as_str(), value.as_str(), at];
            let [name, here, value, at] = if k == 0 { first } else { [""; 4] };
            rows.push(row(&[name, here, value, at, &limit, met]));
        }
    }
    headed(&design.title, "margins", &rows)
}

fn figure(value: f64, readout: &Readout) -> String {
    let digits = if readout.unit == Unit::One { 3 } else { DIGITS };
    print_digits(value, readout.unit, digits)
}

fn headed(title: &str, what: &str, rows: &[String]) -> String {
    format!("{}\n{}\n", row(&[&format!("{title}: {what}")]), rows.join("\n"))
}

/// Fields with tabs between them; a tab or line end within a field becomes a space.
fn row(fields: &[&str]) -> String {
    let plain = |field: &&str| printable(&field.replace(['\t', '\n', '\r'], " "));
    fields.iter().map(plain).collect::<Vec<_>>().join("\t")
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::analysis::{Level, Request, Shown, analyse};
    use crate::design::sample;

    #[test]
    fn the_tables_of_the_built_in_design() {
        let mut design = sample::built_in();
        design.title = "a\tb".to_owned();
        design.locks.insert("compensator.r2".to_owned());
        let checked = design.check().expect("usable");
        let parts = parts_list(&design, &checked);
        assert!(parts.starts_with("a b: compensator parts\nPart\tValue\tSeries\tKept\n"), "{parts}");
        assert!(parts.contains("\t2.32 kΩ\t"), "{parts}");
        assert_eq!(parts.lines().filter(|line| line.ends_with("\tkept")).count(), 1);
        let request = Request::spanning(Shown::Levels(Level::Nominal, Level::Nominal), 300e3, 100);
        let analysis = analyse(&checked, &request);
        let margins = margin_table(&design, &analysis);
        assert!(margins.lines().skip(1).all(|line| line.matches('\t').count() == 5), "{margins}");
        assert!(margins.contains("Phase margin\t"), "{margins}");
        assert!(!margins.contains("NaN"));
    }
}
