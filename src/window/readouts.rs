//! Read-outs: numbers decisions are made on, each with its worst condition, its requirement and the distance to it.

use eframe::egui::{Align2, Color32, FontId, Painter, Rect, Role, Sense, Ui, WidgetInfo, pos2, vec2};

use super::command::Command;
use super::conditions;
use super::exact_readouts::{self, Beside};
use super::explain;
use super::marks;
use super::theme::{self, Palette, palette};
use super::view::Desk;
use crate::analysis::{Analysis, LimitKind, Readout, RequirementVerdict, terms};
use crate::quantity::{self, Unit};

/// Height of a read-out with its requirement [points].
const TALL: f32 = 46.0;
/// The same on a page for reading [points].
const PAGE: f32 = 58.0;
/// Height of a read-out in a line [points].
const SHORT: f32 = 19.0;
/// Where the shown values of the short rows end, as a share of the width.
const SHOWN: f32 = 0.68;
/// Room that an exact value beside the averaged one wants at least [points].
const BESIDE: f32 = 62.0;
/// Read-outs that stand large even while nothing is asked of them.
const LARGE: [&str; 4] = ["crossover", "phase-margin", "gain-margin", "modulus-margin"];

/// Draws all read-outs.
pub(super) fn readouts_ui(ui: &mut Ui, desk: &mut Desk<'_>) {
    let Some(analysis) = desk.session.analysis() else { return };
    let (large, small) = sorted(analysis);
    let look = Look::column();
    for readout in large {
        large_ui(ui, readout, analysis, &look, desk);
    }
    small_rows_ui(ui, &small, desk);
    exact_readouts::rows_ui(ui, desk);
}

/// Read-outs that stand large and those that stand in lines.
pub(super) fn sorted(analysis: &Analysis) -> (Vec<&Readout>, Vec<&Readout>) {
    analysis
        .readouts
        .iter()
        .filter(|readout| !beside_the_point(readout, analysis))
        .partition(|readout| LARGE.contains(&readout.key) || !readout.requirements.is_empty())
}

/// Read-outs in lines, shown value and worst value side by side.
pub(super) fn small_rows_ui(ui: &mut Ui, readouts: &[&Readout], desk: &mut Desk<'_>) {
    let Some(analysis) = desk.session.analysis().filter(|_| !readouts.is_empty()) else { return };
    header_ui(ui, readouts.iter().any(|readout| worst_value(readout, analysis).is_some()));
    for readout in readouts {
        small_ui(ui, readout, analysis, desk);
    }
}

/// True for the ratio to a right-half-plane zero where no condition has such a zero and nothing is asked of it.
fn beside_the_point(readout: &Readout, analysis: &Analysis) -> bool {
    let conditions = analysis.conditions.iter().filter_map(|result| result.outcome.as_ref().ok());
    readout.key == "right-half-plane-ratio"
        && readout.requirements.is_empty()
        && analysis.shown.as_ref().is_ok_and(|detail| detail.right_half_plane_zero_hz.is_none())
        && conditions.into_iter().all(|summary| summary.right_half_plane_zero_hz.is_none())
}

/// What the two columns of the short rows are; the second is named only where it holds anything.
fn header_ui(ui: &mut Ui, worst: bool) {
    let palette = palette(ui);
    let (rect, _) = ui.allocate_exact_size(vec2(ui.available_width(), 15.0), Sense::hover());
    let small = theme::small();
    ui.painter().text(
        pos2(shown_column(rect), rect.center().y),
        Align2::RIGHT_CENTER,
        "shown",
        small.clone(),
        palette.weak,
    );
    if worst {
        ui.painter().text(rect.right_center(), Align2::RIGHT_CENTER, "worst of nine", small, palette.weak);
    }
}

/// Right edge of the column of shown values in the short rows.
pub(super) fn shown_column(rect: Rect) -> f32 {
    rect.left() + rect.width() * SHOWN
}

fn value_text(readout: &Readout, analysis: &Analysis) -> String {
    match readout.value {
        Some(value) => readout.said(trimmed(value, readout.unit), 3),
        None if no_step(readout, analysis) => "no step".to_owned(),
        None => readout.absent.to_owned(),
    }
}

/// True for the figures of a load step of 0 A: then a stable loop has no response to it, at any condition.
fn no_step(readout: &Readout, analysis: &Analysis) -> bool {
    matches!(readout.key, "load-step-deviation" | "settling")
        && analysis.shown.as_ref().is_ok_and(|detail| detail.loop_gain.stable() && detail.steps.load.is_none())
}

/// Angles and decibels to a tenth: more is noise to whoever decides.
fn trimmed(value: f64, unit: Unit) -> f64 {
    match unit {
        Unit::Degree | Unit::Decibel => (value * 10.0).round() / 10.0,
        _ => value,
    }
}

/// Worst value over the nine conditions, or the word for why there is none.
fn worst_value(readout: &Readout, analysis: &Analysis) -> Option<String> {
    let worst = readout.worst.as_ref().filter(|_| !no_step(readout, analysis))?;
    Some(match worst.value {
        Some(value) => readout.said(trimmed(value, readout.unit), 3),
        None => match analysis.conditions.get(worst.index).map(|result| &result.outcome) {
            Some(Err(_)) => "no result".to_owned(),
            Some(Ok(summary)) if !summary.loop_gain.stable() => "unstable".to_owned(),
            _ => "none".to_owned(),
        },
    })
}

/// Worst value over the nine conditions, with where it is.
fn worst_text(readout: &Readout, analysis: &Analysis) -> Option<String> {
    let index = readout.worst.as_ref()?.index;
    let condition = &analysis.conditions.get(index)?.condition;
    Some(format!("{} at {}", worst_value(readout, analysis)?, conditions::short(condition)))
}

fn ink(readout: &Readout, analysis: &Analysis, palette: &Palette) -> Color32 {
    if readout.greyed {
        palette.held
    } else if marks::misses(readout, analysis) {
        palette.amber
    } else {
        palette.ink
    }
}

/// Sizes of a read-out that stands large.
#[derive(Clone, Debug)]
pub(super) struct Look {
    /// Height with a requirement [points].
    height: f32,
    /// Letters of the name and of the worst value.
    name: FontId,
    /// Letters of the value.
    value: FontId,
    /// Letters of limit and distance.
    verdict: FontId,
    /// Where value and verdict begin, below the top [points].
    tops: (f32, f32),
}

impl Look {
    /// In the column beside the plots.
    pub(super) fn column() -> Self {
        Look { height: TALL, name: theme::small(), value: theme::figure(), verdict: theme::small(), tops: (13.0, 20.0) }
    }

    /// On the page for a reviewer.
    pub(super) fn page() -> Self {
        let verdict = theme::strong(14.0);
        Look { height: PAGE, name: theme::body(), value: theme::large(), verdict, tops: (16.0, 24.0) }
    }
}

/// A read-out that stands large: value, worst condition by name, limit and distance.
pub(super) fn large_ui(ui: &mut Ui, readout: &Readout, analysis: &Analysis, look: &Look, desk: &mut Desk<'_>) {
    let palette = palette(ui);
    let verdict = decisive(readout);
    let height = if verdict.is_some() { look.height } else { look.height - 8.0 };
    let (rect, response) = ui.allocate_exact_size(vec2(ui.available_width(), height), Sense::click());
    let painter = ui.painter();
    let at = rect.left_top() + vec2(0.0, 1.0);
    let name = painter.text(at, Align2::LEFT_TOP, readout.name, look.name.clone(), palette.weak);
    let value = value_text(readout, analysis);
    let at = rect.left_top() + vec2(0.0, look.tops.0);
    // Words stand smaller than numbers, or they would run into the requirement.
    let words = readout.value.is_none_or(|value| value == 0.0 && readout.at_zero.is_some());
    let (at, font) = if words { (at + vec2(0.0, 5.0), theme::strong(13.0)) } else { (at, look.value.clone()) };
    let shown = painter.text(at, Align2::LEFT_TOP, &value, font, ink(readout, analysis, palette));
    if let Some(worst) = missed_text(readout, analysis).or_else(|| worst_text(readout, analysis)) {
        let missed = readout.requirements.iter().any(|verdict| verdict.over_all_conditions && !verdict.met);
        let colour = if missed { palette.amber } else { palette.weak };
        // A long name leaves no room for the word, but the place at the right says it in every row.
        let layout = |text: String| painter.layout_no_wrap(text, look.name.clone(), colour);
        let mut galley = layout(format!("worst {worst}"));
        if name.right() + 6.0 > rect.right() - galley.size().x {
            galley = layout(worst);
        }
        painter.galley(pos2(rect.right() - galley.size().x, rect.top() + 1.0), galley, colour);
    }
    let beside = Beside::of(readout, analysis, desk, palette);
    let mut free_to = rect.right();
    if let Some(verdict) = verdict {
        let colour = if verdict.met { palette.good } else { palette.amber };
        let layout = |(font, text): (FontId, String)| painter.layout_no_wrap(text, font, colour);
        // As much of it as leaves room for the exact value: the bar shows the limit, too.
        let whole = verdict_text(verdict);
        let apart = whole.split_once(", ").map_or(String::new(), |(_, apart)| apart.to_owned());
        let wanted = shown.right() + if beside.is_some() { BESIDE } else { 8.0 };
        let fonts = [(look.verdict.clone(), whole.clone()), (theme::small(), whole.clone()), (theme::small(), apart)];
        let count = if beside.is_some() && fonts[2].1.len() > 1 { 3 } else { 2 };
        let mut galleys = fonts.into_iter().take(count).map(layout);
        let fits = |galley: &std::sync::Arc<eframe::egui::Galley>| wanted <= rect.right() - galley.size().x;
        let galley = galleys.find(fits).unwrap_or_else(|| layout((theme::small(), whole)));
        free_to -= galley.size().x;
        painter.galley(pos2(free_to, rect.top() + look.tops.1), galley, colour);
        bar(painter, rect, verdict, palette);
    }
    let mut said = value.clone();
    if let Some(beside) = beside {
        let from = shown.right() + 8.0;
        beside.write(painter, (from, shown.bottom() - look.value.size * 0.42, free_to - 6.0 - from), palette);
        said = format!("{value}, {}", beside.said());
    }
    announce(ui, &response, readout, &said);
    let clicked = response.clicked();
    let _ = explain::explained(ui, response, readout.key, || further(readout));
    let missed = missed_at(readout, analysis).map(|(index, _)| index);
    if let (true, Some(index)) = (clicked, missed.or(readout.worst.as_ref().map(|worst| worst.index))) {
        show_condition(index, desk);
    }
}

/// Where the requirement that is missed most is missed, and the value there. A quantity with limits on both sides is worst at
/// another condition for each of them.
fn missed_at(readout: &Readout, analysis: &Analysis) -> Option<(usize, f64)> {
    let verdict = decisive(readout).filter(|verdict| verdict.over_all_conditions && !verdict.met)?;
    let index = analysis.conditions.iter().position(|result| result.condition.label == verdict.condition)?;
    Some((index, verdict.value?))
}

/// The same in words.
fn missed_text(readout: &Readout, analysis: &Analysis) -> Option<String> {
    let (index, value) = missed_at(readout, analysis)?;
    let condition = &analysis.conditions.get(index)?.condition;
    Some(format!("{} at {}", readout.said(trimmed(value, readout.unit), 3), conditions::short(condition)))
}

/// The requirement that decides: a missed one first, else the one with least to spare.
fn decisive(readout: &Readout) -> Option<&RequirementVerdict> {
    readout.requirements.iter().min_by(|one, other| one.met.cmp(&other.met).then(spare(one).total_cmp(&spare(other))))
}

/// How much is to spare, as a share of the limit; negative when missed.
fn spare(verdict: &RequirementVerdict) -> f64 {
    let Some(value) = verdict.value else { return if verdict.met { 1.0 } else { -1.0 } };
    let scale = verdict.limit.abs().max(f64::MIN_POSITIVE);
    match verdict.kind {
        LimitKind::AtLeast => (value - verdict.limit) / scale,
        LimitKind::AtMost => (verdict.limit - value) / scale,
    }
}

fn verdict_text(verdict: &RequirementVerdict) -> String {
    let way = match verdict.kind {
        LimitKind::AtLeast => "≥",
        LimitKind::AtMost => "≤",
    };
    let limit = quantity::print_digits(verdict.limit, verdict.unit, 3);
    match verdict.value {
        None if verdict.met => format!("{way} {limit}: met"),
        None => format!("{way} {limit}: {}", verdict.reason),
        Some(value) => {
            let apart = quantity::print_digits(trimmed((value - verdict.limit).abs(), verdict.unit), verdict.unit, 2);
            let word = if verdict.met { "to spare" } else { "missing" };
            format!("{way} {limit}, {apart} {word}")
        }
    }
}

/// A bar that fills up to the limit in its middle and beyond it, so that the distance is seen before it is read.
fn bar(painter: &Painter, rect: Rect, verdict: &RequirementVerdict, palette: &Palette) {
    let rail = Rect::from_min_max(pos2(rect.left(), rect.bottom() - 7.0), pos2(rect.right(), rect.bottom() - 4.0));
    painter.rect_filled(rail, 1.5, palette.rail);
    let share = (0.5 + 0.5 * spare(verdict)).clamp(0.02, 1.0);
    let colour = if verdict.met { palette.good } else { palette.amber };
    let right = rail.left() + rail.width() * super::axis::narrow(share);
    painter.rect_filled(rail.with_max_x(right), 1.5, colour);
    let middle = Rect::from_center_size(rail.center(), vec2(1.5, 9.0));
    painter.rect_filled(middle, 0.0, palette.weak);
}

fn small_ui(ui: &mut Ui, readout: &Readout, analysis: &Analysis, desk: &mut Desk<'_>) {
    let palette = palette(ui);
    let value = value_text(readout, analysis);
    let width = ui.available_width();
    let value_galley = ui.painter().layout_no_wrap(value.clone(), theme::body(), ink(readout, analysis, palette));
    let room = (width * SHOWN - value_galley.size().x - 6.0).max(40.0);
    let name = ui.painter().layout(readout.name.to_owned(), theme::small(), palette.weak, room);
    let height = SHORT.max(name.size().y + 4.0);
    let (rect, response) = ui.allocate_exact_size(vec2(width, height), Sense::click());
    let painter = ui.painter().with_clip_rect(rect);
    let at = Align2::RIGHT_CENTER.anchor_size(pos2(shown_column(rect), rect.center().y), value_galley.size()).min;
    painter.galley(at, value_galley, palette.ink);
    painter.galley(pos2(rect.left(), rect.center().y - name.size().y / 2.0), name, palette.weak);
    if let Some(text) = worst_value(readout, analysis) {
        let layout = |text: &str| painter.layout_no_wrap(text.to_owned(), theme::small(), palette.weak);
        // A sentence in both columns would run into itself.
        let mut galley = layout(&text);
        if text == value && shown_column(rect) + 6.0 > rect.right() - galley.size().x {
            galley = layout("the same");
        }
        let at = Align2::RIGHT_CENTER.anchor_size(rect.right_center(), galley.size()).min;
        painter.galley(at, galley, palette.weak);
    }
    announce(ui, &response, readout, &value);
    let clicked = response.clicked();
    let _ = explain::explained(ui, response, readout.key, || {
        let worst = worst_text(readout, analysis).map_or_else(String::new, |worst| format!("\nworst {worst}"));
        format!("{}{worst}", further(readout)).trim_start().to_owned()
    });
    if let (true, Some(worst)) = (clicked, &readout.worst) {
        show_condition(worst.index, desk);
    }
}

fn announce(ui: &Ui, response: &eframe::egui::Response, readout: &Readout, value: &str) {
    super::legend::focus_ring(ui, response);
    response.widget_info(|| {
        let mut info = WidgetInfo::labeled(Role::Button, true, readout.name);
        info.current_text_value = Some(value.to_owned());
        info
    });
    ui.ctx().accesskit_node_builder(response.id, |node| node.set_value(value));
}

/// What is asked of a read-out, and where its worst is. A read-out without a term says here what it means.
fn further(readout: &Readout) -> String {
    let mut lines = Vec::new();
    if terms::find(readout.key).is_none() {
        lines.push(readout.help.to_owned());
    }
    for verdict in &readout.requirements {
        let scope = if verdict.over_all_conditions { "all conditions" } else { "nominal condition" };
        let place = if verdict.condition.is_empty() { String::new() } else { format!(" ({})", verdict.condition) };
        lines.push(format!("asked of {scope}: {}{place}", verdict_text(verdict)));
    }
    if let Some(worst) = &readout.worst {
        lines.push(format!("Press to show the worst condition: {}.", worst.condition));
    }
    lines.join("\n")
}

/// Shows one of the nine conditions.
pub(super) fn show_condition(index: usize, desk: &mut Desk<'_>) {
    let levels = desk.session.analysis().and_then(|analysis| analysis.conditions.get(index)?.condition.levels);
    if let Some((input, load)) = levels {
        desk.ask(Command::Show(input, load));
    }
}
