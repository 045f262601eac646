//! The operating point of the shown condition: duty ratio, currents, losses.

use eframe::egui::{RichText, Role, Sense, Ui, Vec2, WidgetInfo, pos2, vec2};

use super::explain;
use super::theme::{self, palette};
use super::view::Desk;
use crate::converter::{Loss, OperatingPoint};
use crate::quantity::{self, Unit};

/// Draws the operating point.
pub(super) fn operating_ui(ui: &mut Ui, desk: &mut Desk<'_>) {
    ui.label(RichText::new("At this condition").font(theme::strong(13.5)));
    let Some(analysis) = desk.session.analysis() else { return };
    match &analysis.shown {
        Ok(detail) => {
            for row in rows(&detail.operating_point) {
                row_ui(ui, &row);
            }
        }
        Err(finding) => {
            ui.label(RichText::new(&finding.message).color(palette(ui).problem));
        }
    }
}

/// A row: its term's key, name, value, and what the explanation adds to the term.
struct Row {
    term: &'static str,
    name: String,
    value: String,
    further: String,
}

fn rows(point: &OperatingPoint) -> Vec<Row> {
    let amperes = |value| quantity::print_digits(value, Unit::Ampere, 3);
    let row = |term, name: &str, value: String, further: String| Row { term, name: name.to_owned(), value, further };
    let none = String::new;
    let mut rows = vec![
        row("duty-ratio", "Duty ratio", quantity::print_digits(point.duty, Unit::One, 3), none()),
        row("conduction", "Conduction", point.conduction.word().to_owned(), none()),
    ];
    for figure in &point.further {
        rows.push(row(figure.key, figure.name, figure.text(3), figure.help.to_owned()));
    }
    for inductor in &point.inductors {
        let current = &inductor.current;
        let text = format!("{}, peak {}", amperes(current.average), amperes(current.peak));
        let rms = format!("RMS {}.", amperes(current.rms));
        // A filter's inductor has one row, which has little room: its ripple stands in the explanation.
        if let Some(filter) = inductor.name.strip_suffix(" inductor") {
            let further =
                format!("Current of the {}, ripple {} peak to peak. {rms}", inductor.name, amperes(current.ripple));
            rows.push(row("inductor-current", &capital(filter), text, further));
            continue;
        }
        let name = capital(inductor.name);
        rows.push(row("inductor-current", &format!("{name} current"), text, rms));
        rows.push(row("inductor-ripple", &format!("{name} ripple"), amperes(current.ripple), none()));
    }
    rows.push(row("input-current", "Input current", amperes(point.input_current), none()));
    if point.load_voltage < point.output_voltage {
        let volts = |value| quantity::print_digits(value, Unit::Volt, 4);
        let further =
            format!("Behind the second stage; regulated is the bank's voltage, {}.", volts(point.output_voltage));
        rows.push(row("load-voltage", "Voltage at the load", volts(point.load_voltage), further));
    }
    let carried = format!("The bank carries {} RMS.", amperes(point.output_bank_rms));
    rows.push(row("output-step", "Output step", quantity::print_digits(point.output_step, Unit::Volt, 3), carried));
    let loss = |loss: &Loss| format!("{}: {}", loss.name, quantity::print_digits(loss.watts, Unit::Watt, 3));
    let parts = point.conduction_losses.iter().map(loss).collect::<Vec<_>>().join("\n");
    let watts = quantity::print_digits(point.conduction_loss, Unit::Watt, 3);
    rows.push(row("conduction-losses", "Conduction losses", watts, parts));
    rows
}

fn capital(word: &str) -> String {
    let mut letters = word.chars();
    letters.next().map_or_else(String::new, |first| first.to_uppercase().chain(letters).collect())
}

/// Height of a line, and the least room between name and value on one.
const LINE: f32 = 18.0;
const APART: f32 = 8.0;

/// Name and value on one line; the value on a line of its own where both have no room.
fn row_ui(ui: &mut Ui, row: &Row) {
    let palette = palette(ui);
    let galley = |text: &str, color| ui.painter().layout_no_wrap(text.to_owned(), theme::body(), color);
    let (name, value) = (galley(&row.name, palette.weak), galley(&row.value, palette.ink));
    let width = ui.available_width();
    let lines = if name.size().x + value.size().x + APART > width { 2.0 } else { 1.0 };
    let (rect, response) = ui.allocate_exact_size(vec2(width, lines * LINE), Sense::hover());
    let place = |size: Vec2, x: f32, line: f32| pos2(x, rect.top() + (line - 0.5) * LINE - size.y / 2.0);
    let (name_at, value_at) =
        (place(name.size(), rect.left(), 1.0), place(value.size(), rect.right() - value.size().x, lines));
    ui.painter().galley(name_at, name, palette.weak);
    ui.painter().galley(value_at, value, palette.ink);
    response.widget_info(|| WidgetInfo::labeled(Role::Label, true, format!("{}: {}", row.name, row.value)));
    explain::explained(ui, response, row.term, || row.further.clone());
}
