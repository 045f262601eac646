//! The review view: a page to read and not to change, for who sits at the desk and asks what the design meets.
//!
//! *Keys*: left and right step through the loads, up and down through the input voltages, Page Up and Page Down through the
//! present design and the held tries; Escape goes back. The plots are those of the working view without handles.

use eframe::egui::{
    Align, Button, CentralPanel, Frame, Layout, Margin, Panel, Rect, RichText, Role, ScrollArea, Stroke, Ui, UiBuilder,
    WidgetInfo, pos2, vec2,
};

use super::command::Command;
use super::readouts::Look;
use super::theme::{self, palette};
use super::view::Desk;
use super::{bar, bode, conditions, exact_readouts, findings, ledger, operating, readouts, steps, verdict, what_if};

/// Width from which read-outs stand beside the plots [points].
const WIDE: f32 = 900.0;
/// Share of the width that read-outs take there, and its least and greatest [points].
const COLUMN: (f32, f32, f32) = (0.32, 372.0, 540.0);
/// Share of the height that the Bode plots take there.
const UPPER: f32 = 0.6;
/// What the row under them needs to show all of the operating point [points].
const LOWER: f32 = 318.0;
/// Heights of the plots in a narrow window [points].
const NARROW_PLOTS: (f32, f32) = (380.0, 200.0);
/// What the keys do.
const KEYS: &str = "Arrow keys: load and input. Page Up, Page Down: held tries. Esc: back.";
/// Height of the findings at most, as a share of their column.
const FINDINGS: f32 = 0.3;

/// Draws the whole page.
pub(super) fn review_ui(ui: &mut Ui, desk: &mut Desk<'_>) {
    let palette = palette(ui);
    let frame = |fill| Frame::new().fill(fill);
    Panel::top("review bar")
        .exact_size(theme::BAR_HEIGHT)
        .resizable(false)
        .frame(frame(palette.bar).inner_margin(Margin::symmetric(14, 0)))
        .show(ui, |ui| bar_ui(ui, desk));
    if desk.session.stale() || desk.view.banner().is_some() {
        Panel::top("notices").resizable(false).frame(frame(palette.field)).show(ui, |ui| bar::notices_ui(ui, desk));
    }
    let page = frame(palette.canvas).inner_margin(Margin::symmetric(14, 8));
    if ui.available_width() >= WIDE {
        Panel::top("review condition").resizable(false).frame(page).show(ui, |ui| condition_ui(ui, true, desk));
        let (share, least, most) = COLUMN;
        let width = (ui.available_width() * share).clamp(least, most).round();
        let column = frame(palette.panel).inner_margin(Margin { left: 14, right: 10, top: 8, bottom: 8 });
        Panel::left("review read-outs")
            .exact_size(width)
            .resizable(false)
            .frame(column)
            .show(ui, |ui| column_ui(ui, desk));
        CentralPanel::default().frame(frame(palette.canvas)).show(ui, |ui| plots_ui(ui, desk));
    } else {
        CentralPanel::default().frame(page).show(ui, |ui| {
            ScrollArea::vertical().id_salt("review").auto_shrink(false).show(ui, |ui| narrow_ui(ui, desk));
        });
    }
}

/// Design and try at the left, the way back at the right.
fn bar_ui(ui: &mut Ui, desk: &mut Desk<'_>) {
    let palette = palette(ui);
    ui.with_layout(Layout::right_to_left(Align::Center), |ui| {
        let text = RichText::new("Back to the design").color(palette.accent);
        let back = ui.add(Button::new(text).shortcut_text("Esc"));
        if back.accessible_name("Back to the design").on_hover_text(KEYS).clicked() {
            desk.ask(Command::Review);
        }
        ui.with_layout(Layout::left_to_right(Align::Center), |ui| {
            ui.label(RichText::new("Review").font(theme::strong(14.5)).color(palette.weak));
            tries_ui(ui, desk);
        });
    });
}

/// The present design and the held tries, one of them chosen.
fn tries_ui(ui: &mut Ui, desk: &mut Desk<'_>) {
    let session = desk.session;
    let design = session.design();
    let title = if design.title.is_empty() { "Untitled" } else { &design.title };
    let reviewed = session.reviewed().map(|held| held.number);
    if session.tries().is_empty() {
        ui.add(eframe::egui::Label::new(RichText::new(title).font(theme::strong(14.5))).truncate());
        return;
    }
    ScrollArea::horizontal().id_salt("tries").show(ui, |ui| {
        let present = (None, title.to_owned(), "The design as it stands.");
        let held = session.tries().iter().map(|held| (Some(held.number), held.title(), "A held try."));
        for (number, name, help) in std::iter::once(present).chain(held) {
            let text = RichText::new(&name).font(theme::strong(13.5));
            let response = ui.selectable_label(number == reviewed, text);
            response.widget_info(|| {
                WidgetInfo::selected(Role::RadioButton, true, number == reviewed, format!("Review {name}"))
            });
            if response.on_hover_text(format!("{help} Page Up and Page Down step through.")).clicked() {
                desk.ask(Command::ReviewTry(number));
            }
        }
    });
}

/// The condition named large, what is met, and the what-if.
fn condition_ui(ui: &mut Ui, wide: bool, desk: &mut Desk<'_>) {
    if !wide {
        words_ui(ui, false, desk);
        what_if::what_if_ui(ui, "review", desk);
        return;
    }
    ui.horizontal(|ui| {
        let width = (ui.available_width() - 380.0).max(300.0);
        ui.vertical(|ui| {
            ui.set_width(width);
            words_ui(ui, true, desk);
        });
        ui.vertical(|ui| what_if::what_if_ui(ui, "review", desk));
    });
}

fn words_ui(ui: &mut Ui, wide: bool, desk: &mut Desk<'_>) {
    let palette = palette(ui);
    let Some(analysis) = desk.session.analysis() else {
        ui.label("There are no results yet.");
        return;
    };
    let condition = &analysis.condition;
    let text = match condition.levels {
        Some(_) => capital(&condition.label),
        None => format!("What if: {}", condition.label),
    };
    let colour = if condition.levels.is_some() { palette.ink } else { palette.accent };
    ui.label(RichText::new(text).font(theme::strong(21.0)).color(colour));
    ui.horizontal_wrapped(|ui| {
        let (text, colour) = outcome(analysis, palette);
        ui.label(RichText::new(text).font(theme::strong(14.0)).color(colour));
        if wide {
            ui.label(RichText::new(KEYS).font(theme::small()).color(palette.weak));
        }
    });
}

/// What is met over the nine conditions, in a sentence.
fn outcome(analysis: &crate::analysis::Analysis, palette: &theme::Palette) -> (String, eframe::egui::Color32) {
    let (all, missed) =
        (analysis.requirements.len(), analysis.requirements.iter().filter(|verdict| !verdict.met).count());
    match (all, missed) {
        (0, _) => ("No requirements are stated.".to_owned(), palette.weak),
        (_, 0) => (format!("All {all} requirements are met over the nine conditions."), palette.good),
        _ => (format!("{missed} of {all} requirements missed over the nine conditions."), palette.amber),
    }
}

fn capital(text: &str) -> String {
    let mut letters = text.chars();
    letters.next().map_or_else(String::new, |first| first.to_uppercase().chain(letters).collect())
}

/// Read-outs, and the findings under them.
fn column_ui(ui: &mut Ui, desk: &mut Desk<'_>) {
    let below = desk.view.findings_height.clamp(64.0, (ui.available_height() * FINDINGS).max(64.0));
    let foot = Panel::bottom("review findings").resizable(false).exact_size(below);
    foot.frame(Frame::new().inner_margin(Margin { top: 8, ..Margin::ZERO })).show(ui, |ui| {
        let area = ScrollArea::vertical().id_salt("review findings").auto_shrink(false);
        let output = area.show(ui, |ui| findings::findings_ui(ui, desk));
        let height = output.content_size.y + 20.0;
        if (height - desk.view.findings_height).abs() > 0.5 {
            desk.view.findings_height = height;
            ui.ctx().request_repaint();
        }
    });
    ScrollArea::vertical().id_salt("review read-outs").auto_shrink(false).show(ui, |ui| {
        ui.set_max_width(ui.available_width() - 6.0);
        results_ui(ui, 1, desk);
        ui.add_space(8.0);
        ledger::ledger_ui(ui, desk);
    });
}

/// Stability in words and all read-outs, the large ones in this many columns.
fn results_ui(ui: &mut Ui, columns: usize, desk: &mut Desk<'_>) {
    let Some(analysis) = desk.session.analysis() else { return };
    ui.spacing_mut().item_spacing.y = 2.0;
    ui.multiply_opacity(if desk.session.stale() { theme::STALE } else { 1.0 });
    verdict::verdict_ui(ui, desk);
    let (large, small) = readouts::sorted(analysis);
    let look = Look::page();
    for row in large.chunks(columns) {
        ui.spacing_mut().item_spacing.x = 20.0;
        ui.columns(columns, |uis| {
            for (ui, readout) in uis.iter_mut().zip(row) {
                readouts::large_ui(ui, readout, analysis, &look, desk);
            }
        });
    }
    readouts::small_rows_ui(ui, &small, desk);
    exact_readouts::rows_ui(ui, desk);
}

/// Bode plots above; load step, the nine conditions and the operating point below.
fn plots_ui(ui: &mut Ui, desk: &mut Desk<'_>) {
    let room = ui.available_rect_before_wrap();
    let upper = (room.height() * UPPER).min(room.height() - LOWER).max(260.0);
    let stack = Rect::from_min_max(room.min + vec2(4.0, 6.0), pos2(room.right() - 4.0, room.top() + upper));
    let mut stack_ui = ui.new_child(UiBuilder::new().max_rect(stack));
    bode::bode_ui(&mut stack_ui, desk);
    ui.painter().hline(room.x_range(), stack.bottom() + 2.0, Stroke::new(1.0, palette(ui).hairline));
    let lower = Rect::from_min_max(pos2(stack.left(), stack.bottom() + 6.0), room.max - vec2(4.0, 6.0));
    let (step, beside) = lower.split_left_right_at_fraction(0.56);
    steps::steps_ui(ui, step, desk);
    let beside = Rect::from_min_max(beside.min + vec2(10.0, 4.0), beside.max - vec2(10.0, 0.0));
    let mut beside_ui = ui.new_child(UiBuilder::new().max_rect(beside));
    ScrollArea::vertical().id_salt("review point").auto_shrink(false).show(&mut beside_ui, |ui| {
        ui.set_max_width(ui.available_width() - 6.0);
        point_ui(ui, desk);
    });
}

/// The nine conditions and the operating point.
fn point_ui(ui: &mut Ui, desk: &mut Desk<'_>) {
    ui.multiply_opacity(if desk.session.stale() { theme::STALE } else { 1.0 });
    conditions::panel_ui(ui, desk);
    ui.add_space(4.0);
    ui.spacing_mut().item_spacing.y = 0.0;
    operating::operating_ui(ui, desk);
}

/// All of it under one another, for a narrow window or large text.
fn narrow_ui(ui: &mut Ui, desk: &mut Desk<'_>) {
    ui.set_max_width(ui.available_width() - 8.0);
    condition_ui(ui, false, desk);
    ui.add_space(6.0);
    let width = ui.available_width();
    ui.scope(|ui| results_ui(ui, if width > 560.0 { 2 } else { 1 }, desk));
    ui.add_space(8.0);
    let (_, stack) = ui.allocate_space(vec2(width, NARROW_PLOTS.0));
    let mut stack_ui = ui.new_child(UiBuilder::new().max_rect(stack));
    bode::bode_ui(&mut stack_ui, desk);
    let (_, step) = ui.allocate_space(vec2(width, NARROW_PLOTS.1));
    steps::steps_ui(ui, step, desk);
    ui.add_space(8.0);
    findings::findings_ui(ui, desk);
    ui.add_space(8.0);
    ui.scope(|ui| point_ui(ui, desk));
    ui.add_space(8.0);
    ledger::ledger_ui(ui, desk);
}
