//! The figures of a transient, each beside what the small-signal model predicts, and what is to be known about the run.

use eframe::egui::{Align2, Label, Rect, RichText, Role, ScrollArea, Sense, Ui, UiBuilder, WidgetInfo, pos2, vec2};

use super::explain;
use super::theme::{self, palette};
use crate::analysis::{Transient, TransientEvent};
use crate::quantity::{self, Unit};

/// Height of a row [points].
const ROW: f32 = 18.0;
/// Where the simulated and the predicted values end, as shares of the width.
const COLUMNS: (f32, f32) = (0.52, 0.76);
/// The same in a narrow column, and the width below which it is one [points].
const NARROW: ((f32, f32), f32) = ((0.68, 1.0), 420.0);
/// Values longer than this take the room of both columns [characters].
const LONG: usize = 14;

/// The columns of a width.
fn columns(width: f32) -> (f32, f32) {
    if width < NARROW.1 { NARROW.0 } else { COLUMNS }
}

/// What stands under the plot.
pub(super) struct Lines {
    /// Name, simulated value, predicted value, term that explains it.
    rows: Vec<(&'static str, String, String, &'static str)>,
    /// Sentences below.
    remarks: Vec<String>,
    /// Whether there is anything predicted.
    predicted: bool,
}

/// The figures of a run.
pub(super) fn lines(run: &Transient) -> Lines {
    let figures = &run.figures;
    let step = run.prediction.as_ref();
    let volts = |value: f64| quantity::print_digits(value, Unit::Volt, 3);
    let four = |value: f64| quantity::print_digits(value, Unit::Volt, 4);
    let amperes = |value: f64| quantity::print_digits(value, Unit::Ampere, 3);
    let seconds = |value: f64| quantity::print_digits(value, Unit::Second, 3);
    let or_none = |value: Option<f64>, print: &dyn Fn(f64) -> String| value.map_or("none".to_owned(), print);
    let settles = |value: Option<f64>| match value {
        Some(0.0) => "stays within".to_owned(),
        Some(time) => seconds(time),
        None => "does not settle".to_owned(),
    };
    let none = String::new;
    let (first, second) = match run.event {
        TransientEvent::StartUp | TransientEvent::ReferenceStep => ("Beyond the final value", "Rebound"),
        _ => ("Deviation", "Rebound"),
    };
    let predicted = step.map_or_else(none, |step| match run.event {
        TransientEvent::ReferenceStep => {
            let beyond = step.initial_v + step.deviation_v - step.final_v;
            volts(if beyond * (step.final_v - step.initial_v) > 0.0 { beyond } else { 0.0 })
        }
        _ => volts(step.deviation_v),
    });
    let mut rows = vec![
        (first, or_none(figures.deviation_v, &volts), predicted, "transient-deviation"),
        (second, or_none(figures.rebound_v, &volts), none(), "transient-rebound"),
        (
            "Settles in",
            settles(figures.settling_s),
            step.map_or_else(none, |step| settles(step.settling_s)),
            "transient-settling",
        ),
        ("Peak inductor current", amperes(figures.peak_inductor_a), none(), "transient-peak"),
        ("Peak switch current", amperes(figures.peak_switch_a), none(), "transient-peak"),
    ];
    rows.push((
        "Output, ripple included",
        format!("{} to {}", four(figures.least_v), four(figures.greatest_v)),
        none(),
        "transient-range",
    ));
    Lines { rows, remarks: remarks(run), predicted: step.is_some() }
}

fn remarks(run: &Transient) -> Vec<String> {
    let figures = &run.figures;
    let mut remarks = Vec::new();
    if run.cancelled {
        remarks.push(format!("Stopped after {} periods.", figures.periods));
    }
    let limited = figures.limited.iter().filter(|(_, periods)| *periods > 0);
    let limited: Vec<String> = limited.map(|(name, periods)| format!("{name} in {periods} periods")).collect();
    if !limited.is_empty() {
        remarks.push(format!("Limits that acted: {}.", limited.join(", ")));
    }
    if figures.skipped > 0 {
        remarks.push(format!("{} of {} periods are without a pulse.", figures.skipped, figures.periods));
    }
    remarks.extend(run.notices.iter().map(|notice| notice.message.clone()));
    remarks
}

/// Height that all of it wants [points].
pub(super) fn height(lines: &Lines) -> f32 {
    ROW * (lines.rows.len() + 1 + 2 * lines.remarks.len()) as f32 + 8.0
}

/// Draws figures and remarks into a rectangle.
pub(super) fn figures_ui(ui: &mut Ui, rect: Rect, lines: &Lines, stale: bool) {
    let inner = Rect::from_min_max(
        pos2(rect.left() + theme::GUTTER + 6.0, rect.top() + 2.0),
        pos2(rect.right() - theme::RIGHT_GUTTER - 4.0, rect.bottom()),
    );
    let mut ui = ui.new_child(UiBuilder::new().max_rect(inner));
    ui.multiply_opacity(if stale { theme::STALE } else { 1.0 });
    ScrollArea::vertical().id_salt("transient figures").auto_shrink(false).show(&mut ui, |ui| {
        ui.spacing_mut().item_spacing.y = 0.0;
        header_ui(ui, lines.predicted);
        for row in &lines.rows {
            row_ui(ui, row);
        }
        for remark in &lines.remarks {
            ui.add_space(2.0);
            ui.add(Label::new(RichText::new(remark).font(theme::small()).color(palette(ui).weak)).wrap());
        }
    });
}

fn header_ui(ui: &mut Ui, predicted: bool) {
    let palette = palette(ui);
    let (rect, _) = ui.allocate_exact_size(vec2(ui.available_width(), ROW), Sense::hover());
    let painter = ui.painter();
    let at = |share: f32| pos2(rect.left() + rect.width() * share, rect.center().y);
    painter.text(rect.left_center(), Align2::LEFT_CENTER, "What happens", theme::strong(12.5), palette.ink);
    let (simulated, beside) = columns(rect.width());
    painter.text(at(simulated), Align2::RIGHT_CENTER, "cycle by cycle", theme::small(), palette.weak);
    if predicted {
        painter.text(at(beside), Align2::RIGHT_CENTER, "predicted", theme::small(), palette.weak);
    }
}

fn row_ui(ui: &mut Ui, (name, simulated, predicted, term): &(&'static str, String, String, &'static str)) {
    let palette = palette(ui);
    let (rect, response) = ui.allocate_exact_size(vec2(ui.available_width(), ROW), Sense::hover());
    let painter = ui.painter().with_clip_rect(rect);
    let at = |share: f32| pos2(rect.left() + rect.width() * share, rect.center().y);
    painter.text(rect.left_center(), Align2::LEFT_CENTER, name, theme::small(), palette.weak);
    let (first, second) = columns(rect.width());
    let long = predicted.is_empty() && simulated.chars().count() > LONG;
    painter.text(at(if long { second } else { first }), Align2::RIGHT_CENTER, simulated, theme::body(), palette.ink);
    painter.text(at(second), Align2::RIGHT_CENTER, predicted, theme::body(), palette.weak);
    let beside = if predicted.is_empty() { String::new() } else { format!(", predicted {predicted}") };
    response.widget_info(|| WidgetInfo::labeled(Role::Label, true, format!("{name}: {simulated}{beside}")));
    let _ = explain::explained(ui, response, term, explain::nothing);
}
