//! The nine operating conditions: the chooser in the bar, and the map that shows all of them at once.

use eframe::egui::{
    Align2, Popup, PopupCloseBehavior, Pos2, Rect, RichText, Role, Sense, Stroke, StrokeKind, Ui, WidgetInfo, pos2,
    vec2,
};

use super::command::Command;
use super::explain;
use super::theme::{self, palette};
use super::view::Desk;
use super::what_if;
use crate::analysis::{Analysis, Condition, ConditionResult, Detail, Level, LimitKind};
use crate::converter::Conduction;
use crate::quantity::{self, Unit};

/// The chooser: says which condition is shown; pressed, it opens the map. Wheel and arrow commands step through.
pub(super) fn chooser_ui(ui: &mut Ui, roomy: bool, desk: &mut Desk<'_>) {
    let palette = palette(ui);
    let galley = |text: &str| ui.painter().layout_no_wrap(text.to_owned(), theme::body(), palette.ink);
    let fits = |text: &String| galley(text).size().x + CHOOSER_EDGE <= ui.available_width();
    let bare = desk.session.analysis().map(|analysis| short(&analysis.condition));
    let words = [chosen_words(roomy, desk), chosen_words(false, desk)];
    let last = bare.unwrap_or_else(|| words[1].clone());
    let text = words.into_iter().find(fits).unwrap_or(last);
    let galley = galley(&text);
    let (rect, response) = ui.allocate_exact_size(vec2(galley.size().x + CHOOSER_EDGE, 28.0), Sense::click());
    let ground = if response.hovered() { palette.accent_ground } else { palette.field };
    ui.painter().rect(rect, 14.0, ground, Stroke::new(1.0, palette.field_edge), StrokeKind::Inside);
    glance(ui, pos2(rect.left() + 15.0, rect.center().y - 10.0), desk);
    let at = pos2(rect.left() + 46.0, rect.center().y - galley.size().y / 2.0);
    ui.painter().galley(at, galley, palette.ink);
    super::bar::down_mark(ui, pos2(rect.right() - 16.0, rect.center().y));
    response.widget_info(|| {
        let mut info = WidgetInfo::labeled(Role::ComboBox, true, "Operating condition shown");
        info.current_text_value = Some(text.clone());
        info
    });
    super::legend::focus_ring(ui, &response);
    Popup::menu(&response).close_behavior(PopupCloseBehavior::CloseOnClickOutside).show(|ui| {
        // Not the bare look of menu lines: the fields of the what-if are to be seen as fields.
        ui.reset_style();
        ui.set_width(360.0);
        ui.label(RichText::new("Press a condition to show it in full.").color(palette.weak));
        let asked = desk.send.len();
        map_ui(ui, "chooser", desk);
        ui.add_space(4.0);
        ui.separator();
        what_if::what_if_ui(ui, "chooser", desk);
        if desk.send.len() > asked {
            ui.close();
        }
    });
}

/// Room of the chooser beside its words [points].
const CHOOSER_EDGE: f32 = 76.0;

/// The condition shown, in words as long as there is room for.
fn chosen_words(roomy: bool, desk: &Desk<'_>) -> String {
    let (input, load) = desk.session.shown();
    let Some(analysis) = desk.session.analysis() else {
        return format!("Shown: {} input, {} load", input.word(), load.word());
    };
    let condition = &analysis.condition;
    match (condition.levels, roomy) {
        (None, true) => format!("What if: {}", condition.label),
        (None, false) => format!("what if {}", short(condition)),
        (Some(_), true) => {
            let rests = |d: &Detail| d.operating_point.conduction == Conduction::Discontinuous;
            let mode = if analysis.shown.as_deref().is_ok_and(rests) { ", discontinuous" } else { "" };
            format!("Shown: {}{mode}", condition.label)
        }
        (Some(_), false) => short(condition),
    }
}

/// A condition in a few letters: "9 V, 1.5 A".
pub(super) fn short(condition: &Condition) -> String {
    let volts = quantity::print_digits(condition.input_voltage, Unit::Volt, 3);
    format!("{volts}, {}", quantity::print_digits(condition.load_current, Unit::Ampere, 3))
}

/// All nine at a glance: a full square is well, an open amber one misses what is asked, a crossed one has no result or is
/// unstable; the shown one has a ring.
fn glance(ui: &Ui, at: Pos2, desk: &Desk<'_>) {
    let Some(analysis) = desk.session.analysis() else { return };
    let palette = palette(ui);
    for (index, result) in analysis.conditions.iter().take(9).enumerate() {
        let corner = at + vec2((index % 3) as f32 * 7.0, (index / 3) as f32 * 7.0);
        let square = Rect::from_min_size(corner, vec2(5.0, 5.0));
        let stroke = Stroke::new(1.2, palette.amber);
        let painter = ui.painter();
        match state(result, desk) {
            State::Well => {
                painter.rect_filled(square, 1.0, palette.good.gamma_multiply(0.75));
            }
            State::Missed => {
                painter.rect_stroke(square, 1.0, stroke, StrokeKind::Inside);
            }
            State::None => {
                painter.line_segment([square.left_top(), square.right_bottom()], stroke);
                painter.line_segment([square.left_bottom(), square.right_top()], stroke);
            }
        }
        if result.condition.levels.is_some_and(|(input, load)| desk.session.shows(input, load)) {
            painter.rect_stroke(square.expand(2.0), 2.0, Stroke::new(1.0, palette.accent), StrokeKind::Inside);
        }
    }
}

/// How a condition fares.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum State {
    /// All that is asked of it is met, as far as it can be told from one condition.
    Well,
    /// It misses what is asked.
    Missed,
    /// It is unstable or has no result.
    None,
}

fn state(result: &ConditionResult, desk: &Desk<'_>) -> State {
    let Ok(summary) = &result.outcome else { return State::None };
    if !summary.loop_gain.stable() {
        return State::None;
    }
    let (_, _, missed) = figures(result, desk);
    if missed { State::Missed } else { State::Well }
}

/// The map: input voltage down, load across, each cell its phase margin and crossover.
pub(super) fn map_ui(ui: &mut Ui, salt: &str, desk: &mut Desk<'_>) {
    let Some(analysis) = desk.session.analysis() else { return };
    let palette = palette(ui);
    let room = ui.available_width();
    let (head, label, cell_height) = (17.0, 46.0, 36.0);
    let (rect, _) = ui.allocate_exact_size(vec2(room, head + 3.0 * cell_height), Sense::hover());
    let width = (room - label) / 3.0;
    for (index, result) in analysis.conditions.iter().take(9).enumerate() {
        let (row, column) = ((index / 3) as f32, (index % 3) as f32);
        let corner = pos2(rect.left() + label + column * width, rect.top() + head + row * cell_height);
        let cell = Rect::from_min_size(corner, vec2(width - 3.0, cell_height - 3.0));
        if index < 3 {
            let text = quantity::print_digits(result.condition.load_current, Unit::Ampere, 3);
            let at = pos2(cell.center().x, rect.top() + head / 2.0);
            ui.painter().text(at, Align2::CENTER_CENTER, text, theme::small(), palette.weak);
        }
        if index % 3 == 0 {
            let text = quantity::print_digits(result.condition.input_voltage, Unit::Volt, 3);
            ui.painter().text(
                pos2(rect.left(), cell.center().y),
                Align2::LEFT_CENTER,
                text,
                theme::small(),
                palette.weak,
            );
        }
        cell_ui(ui, cell, (salt, index), result, desk);
    }
}

fn cell_ui(ui: &mut Ui, cell: Rect, id: (&str, usize), result: &ConditionResult, desk: &mut Desk<'_>) {
    let palette = palette(ui);
    let Some((input, load)) = result.condition.levels else { return };
    let shown = desk.session.shows(input, load);
    let response = ui.interact(cell, ui.scope_id().with(id), Sense::click());
    let (figure, under, missed) = figures(result, desk);
    let label = format!("{} input, {} load: {figure}", input.word(), load.word());
    response.widget_info(|| WidgetInfo::selected(Role::RadioButton, true, shown, &label));
    let ground = if response.hovered() || shown { palette.accent_ground } else { palette.field };
    let edge = if shown { Stroke::new(1.5, palette.accent) } else { Stroke::new(1.0, palette.hairline) };
    ui.painter().rect(cell, 4.0, ground, edge, StrokeKind::Inside);
    let ink = if missed { palette.amber } else { palette.ink };
    let painter = ui.painter().with_clip_rect(cell);
    let lift = if under.is_empty() { 0.0 } else { 7.0 };
    painter.text(cell.center() - vec2(0.0, lift), Align2::CENTER_CENTER, &figure, theme::strong(12.5), ink);
    painter.text(cell.center() + vec2(0.0, 7.0), Align2::CENTER_CENTER, under, theme::small(), palette.weak);
    super::legend::focus_ring(ui, &response);
    let help = match &result.outcome {
        Ok(summary) => {
            let conduction = format!("{} conduction", summary.operating_point.conduction.word());
            [vec![result.condition.label.clone(), conduction], summary.beside()].concat().join("\n")
        }
        Err(finding) => format!("{}\n{}", result.condition.label, finding.message),
    };
    if response.on_hover_text(help).clicked() {
        desk.ask(Command::Show(input, load));
    }
}

/// What a cell says: phase margin over crossover, or the word for what is wrong; and whether it misses what is asked.
fn figures(result: &ConditionResult, desk: &Desk<'_>) -> (String, String, bool) {
    let Ok(summary) = &result.outcome else {
        return ("none".to_owned(), "no result".to_owned(), true);
    };
    if !summary.loop_gain.stable() {
        return ("unstable".to_owned(), String::new(), true);
    }
    let Some(crossover) = summary.loop_gain.margins.headline_crossover() else {
        return ("stable".to_owned(), "no crossover".to_owned(), false);
    };
    let margin_deg = crossover.phase_margin_deg;
    let nominal = result.condition.levels == Some((Level::Nominal, Level::Nominal));
    let missed = desk.session.analysis().is_some_and(|analysis| missed(analysis, margin_deg, nominal));
    (format!("{margin_deg:.1}°"), quantity::print_digits(crossover.frequency_hz, Unit::Hertz, 3), missed)
}

/// True when a phase margin misses what is asked of this condition.
fn missed(analysis: &Analysis, margin_deg: f64, nominal: bool) -> bool {
    analysis
        .requirements
        .iter()
        .filter(|verdict| verdict.readout == "phase-margin" && (verdict.over_all_conditions || nominal))
        .any(|verdict| verdict.kind == LimitKind::AtLeast && margin_deg < verdict.limit)
}

/// The map with its heading, for the column of read-outs.
pub(super) fn panel_ui(ui: &mut Ui, desk: &mut Desk<'_>) {
    let palette = palette(ui);
    ui.horizontal(|ui| {
        let heading = ui.label(RichText::new("Nine conditions").font(theme::strong(13.5)));
        explain::explained(ui, heading, "nine-conditions", explain::nothing);
        let text = RichText::new("margin, crossover").font(theme::small()).color(palette.weak);
        ui.label(text).on_hover_text("Input voltage down, load across.");
    });
    map_ui(ui, "panel", desk);
}
