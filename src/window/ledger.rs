//! The phase ledger as a waterfall: each cause takes up where the one before ended, down to the phase margin.

use eframe::egui::{Align2, Color32, Rect, RichText, Role, Sense, Stroke, Ui, WidgetInfo, pos2, vec2};

use super::axis::Axis;
use super::explain;
use super::pointed::Pointed;
use super::theme::{self, Palette, palette};
use super::view::Desk;
use crate::analysis::{LedgerRole, LedgerRow};
use crate::quantity::{self, Unit};

/// Height of a row [points].
const ROW: f32 = 17.0;
/// Room for the degrees at the right [points].
const VALUE: f32 = 52.0;

/// Draws the ledger at the headline crossover.
pub(super) fn ledger_ui(ui: &mut Ui, desk: &mut Desk<'_>) {
    let session = desk.session;
    let Some(detail) = session.analysis().and_then(|analysis| analysis.shown.as_ref().ok()) else { return };
    let Some(ledger) = &detail.ledger else { return };
    let palette = palette(ui);
    let at = quantity::print_digits(ledger.frequency_hz, Unit::Hertz, 3);
    ui.horizontal(|ui| {
        let heading = ui.label(RichText::new("Phase ledger").font(theme::strong(13.5)));
        explain::explained(ui, heading, "phase-ledger", explain::nothing);
        ui.label(RichText::new(format!("at crossover, {at}")).font(theme::small()).color(palette.weak));
    });
    let mut least = 0.0_f64;
    let mut greatest = 0.0_f64;
    let mut sum = 0.0;
    for row in &ledger.rows {
        sum += row.degrees;
        least = least.min(sum);
        greatest = greatest.max(sum);
    }
    let room = ui.available_width();
    let left = ui.cursor().left();
    // The labels take what they need; the blocks keep a quarter of the width at least.
    let widest = ledger.rows.iter().map(|row| label_width(ui, &row.label)).fold(0.0, f32::max);
    let blocks = left + (widest + 8.0).clamp(room * 0.4, room * 0.75 - VALUE);
    let x = Axis::linear(least - 4.0, greatest + 4.0, blocks, left + room - VALUE);
    let mut from = 0.0;
    for row in &ledger.rows {
        row_ui(ui, row, from, &x, desk);
        from += row.degrees;
    }
    sum_ui(ui, ledger.phase_margin_deg, &x, palette);
}

fn label_width(ui: &Ui, label: &str) -> f32 {
    ui.painter().layout_no_wrap(label.to_owned(), theme::small(), Color32::PLACEHOLDER).size().x
}

fn colour(role: LedgerRole, palette: &Palette) -> Color32 {
    match role {
        LedgerRole::HalfTurn | LedgerRole::Turns => palette.held,
        LedgerRole::Compensator => palette.compensator,
        LedgerRole::Amplifier | LedgerRole::Sampling => palette.compensator.gamma_multiply(0.6),
        LedgerRole::Plant => palette.plant,
        LedgerRole::RightHalfPlane => palette.plant.gamma_multiply(0.75),
        LedgerRole::Delay => palette.weak,
    }
}

fn row_ui(ui: &mut Ui, row: &LedgerRow, from: f64, x: &Axis, desk: &mut Desk<'_>) {
    let palette = palette(ui);
    let (rect, response) = ui.allocate_exact_size(vec2(ui.available_width(), ROW), Sense::hover());
    let thing = row.lane.map(Pointed::Lane).or(row.landmark.map(Pointed::Landmark));
    if let Some(thing) = thing {
        desk.view.point(thing, &response);
    }
    let lit = desk.lit_row(row);
    let painter = ui.painter();
    if lit {
        painter.rect_filled(rect.expand2(vec2(4.0, 0.0)), 3.0, palette.accent_ground);
    }
    let label = painter.with_clip_rect(rect.with_max_x(x.at(x.range().0) - 2.0));
    label.text(rect.left_center(), Align2::LEFT_CENTER, &row.label, theme::small(), palette.ink);
    let (a, b) = (x.at(from), x.at(from + row.degrees));
    let middle = rect.center().y;
    let block = Rect::from_x_y_ranges(a.min(b)..=a.max(b).max(a.min(b) + 1.5), (middle - 4.5)..=(middle + 4.5));
    painter.rect_filled(block, 1.0, colour(row.role, palette));
    if row.role == LedgerRole::RightHalfPlane {
        painter.line_segment([block.left_bottom(), block.right_top()], Stroke::new(1.0, palette.panel));
    }
    painter.vline(b, middle + 4.5..=rect.bottom() + ROW / 2.0 - 4.5, Stroke::new(1.0, palette.grid_strong));
    painter.text(rect.right_center(), Align2::RIGHT_CENTER, signed(row.degrees), theme::small(), palette.ink);
    let name = || format!("{}: {}", row.label, signed(row.degrees));
    response.widget_info(|| WidgetInfo::labeled(Role::Label, true, name()));
    explain::explained(ui, response, term(row), name);
}

/// Key of the term that explains a row.
fn term(row: &LedgerRow) -> &'static str {
    match (row.role, row.lane) {
        (LedgerRole::HalfTurn, _) => "half-turn",
        (LedgerRole::Turns, _) => "turns",
        (LedgerRole::Compensator, Some("gain")) => "integrator",
        (LedgerRole::Compensator, Some(lane)) if lane.starts_with("pole") => "compensator-pole",
        (LedgerRole::Compensator, _) => "compensator-zero",
        (LedgerRole::Amplifier, _) => "amplifier",
        (LedgerRole::Sampling, _) => "sampling-share",
        (LedgerRole::Plant, _) => "plant-phase",
        (LedgerRole::RightHalfPlane, _) => "right-half-plane-zero",
        (LedgerRole::Delay, _) => "delay",
    }
}

fn sum_ui(ui: &mut Ui, margin_deg: f64, x: &Axis, palette: &Palette) {
    let (rect, response) = ui.allocate_exact_size(vec2(ui.available_width(), ROW + 2.0), Sense::hover());
    response.widget_info(|| WidgetInfo::labeled(Role::Label, true, format!("phase margin: {}", signed(margin_deg))));
    let painter = ui.painter();
    painter.hline(rect.x_range(), rect.top() + 0.5, Stroke::new(1.0, palette.hairline));
    painter.text(rect.left_center(), Align2::LEFT_CENTER, "phase margin", theme::strong(11.5), palette.ink);
    let (a, b) = (x.at(0.0), x.at(margin_deg));
    let block = Rect::from_min_max(pos2(a.min(b), rect.center().y - 4.5), pos2(a.max(b), rect.center().y + 4.5));
    painter.rect_filled(block, 1.0, palette.ink);
    painter.text(rect.right_center(), Align2::RIGHT_CENTER, signed(margin_deg), theme::strong(11.5), palette.ink);
}

/// Degrees with one decimal and their sign.
fn signed(degrees: f64) -> String {
    if degrees.abs() < 0.05 {
        return "0.0°".to_owned();
    }
    let sign = if degrees < 0.0 { '\u{2212}' } else { '+' };
    format!("{sign}{:.1}°", degrees.abs())
}
