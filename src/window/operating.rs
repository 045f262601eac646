//! The operating point of the shown condition: duty ratio, currents, losses.

use eframe::egui::{Align2, RichText, Role, Sense, Ui, WidgetInfo, vec2};

use super::theme::{self, palette};
use super::view::Desk;
use crate::converter::OperatingPoint;
use crate::quantity::{self, Unit};

/// Draws the operating point.
pub(super) fn operating_ui(ui: &mut Ui, desk: &mut Desk<'_>) {
    ui.label(RichText::new("At this condition").font(theme::strong(13.5)));
    let Some(analysis) = desk.session.analysis() else { return };
    match &analysis.shown {
        Ok(detail) => {
            for (name, value, help) in rows(&detail.operating_point) {
                row_ui(ui, &name, &value, &help);
            }
        }
        Err(finding) => {
            ui.label(RichText::new(&finding.message).color(palette(ui).problem));
        }
    }
}

/// Name, value and explanation of each row.
fn rows(point: &OperatingPoint) -> Vec<(String, String, String)> {
    let amperes = |value| quantity::print_digits(value, Unit::Ampere, 3);
    let mut rows = vec![row(
        "Duty ratio",
        quantity::print_digits(point.duty, Unit::One, 3),
        "Share of the period in which the controlled switch conducts.",
    )];
    rows.push(row("Conduction", point.conduction.word().to_owned(), "How the inductor current behaves over a period."));
    for inductor in &point.inductors {
        let current = &inductor.current;
        let text = format!("{}, peak {}", amperes(current.average), amperes(current.peak));
        rows.push(row(
            &format!("{} current", capital(inductor.name)),
            text,
            &format!("Average and peak. RMS {}.", amperes(current.rms)),
        ));
        rows.push(row(&format!("{} ripple", capital(inductor.name)), amperes(current.ripple), "Peak to peak."));
    }
    rows.push(row("Input current", amperes(point.input_current), "Average current from the source."));
    let help = format!(
        "Step of the output voltage at a switching instant, from the ESR. The bank carries {} RMS.",
        amperes(point.output_bank_rms)
    );
    rows.push(row("Output step", quantity::print_digits(point.output_step, Unit::Volt, 3), &help));
    let parts: Vec<String> = point
        .conduction_losses
        .iter()
        .map(|loss| format!("{}: {}", loss.name, quantity::print_digits(loss.watts, Unit::Watt, 3)))
        .collect();
    let help = format!("Losses of conduction alone, without switching.\n{}", parts.join("\n"));
    rows.push(row("Conduction losses", quantity::print_digits(point.conduction_loss, Unit::Watt, 3), &help));
    rows
}

fn row(name: &str, value: String, help: &str) -> (String, String, String) {
    (name.to_owned(), value, help.to_owned())
}

fn capital(word: &str) -> String {
    let mut letters = word.chars();
    letters.next().map_or_else(String::new, |first| first.to_uppercase().chain(letters).collect())
}

fn row_ui(ui: &mut Ui, name: &str, value: &str, help: &str) {
    let palette = palette(ui);
    let (rect, response) = ui.allocate_exact_size(vec2(ui.available_width(), 18.0), Sense::hover());
    let painter = ui.painter();
    painter.text(rect.left_center(), Align2::LEFT_CENTER, name, theme::body(), palette.weak);
    painter.text(rect.right_center(), Align2::RIGHT_CENTER, value, theme::body(), palette.ink);
    response.widget_info(|| WidgetInfo::labeled(Role::Label, true, format!("{name}: {value}")));
    response.on_hover_text(help);
}
