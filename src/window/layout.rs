//! The window's columns: entries at the left, plots and lanes in the middle, results and parts at the right.
//!
//! A narrow window, or one with large text, has room for one column beside the plots; F6 and F7 say which.

use eframe::egui::{CentralPanel, Frame, Margin, Panel, Rect, ScrollArea, Stroke, Ui, UiBuilder, pos2, vec2};

use super::pages::{self, Page};
use super::pointed::Sheet;
use super::theme::{self, palette};
use super::view::Desk;
use super::{
    bar, bode, conditions, exact_curves, findings, hint, ledger, operating, parts, readouts, recovery, responses,
    review, schematic, stage, steps, transient, tries, verdict, waves,
};

/// Height that steps and responses take under the Bode plots, as a share of the room.
const LOWER_SHARE: f32 = 0.29;
/// Least height of the stack before the column scrolls [points].
const LEAST_STACK: f32 = 400.0;
/// Least height of the plots under it [points].
const LEAST_LOWER: f32 = 150.0;
/// Least width of the plots while both columns stand beside them [points].
const LEAST_MIDDLE: f32 = 440.0;
/// Widths of the window between which the columns grow [points].
const WINDOW_WIDTHS: (f32, f32) = (1280.0, 1920.0);
/// Width of the plots from which the two under the stack stand side by side [points].
const SIDE_BY_SIDE: f32 = 480.0;
/// Height from which the map of the nine conditions has a place of its own [points].
const TALL_COLUMN: f32 = 880.0;
/// Height of the entries' part of the left column from which the schematic stands still above them [points].
const HIGH_FORM: f32 = 400.0;
/// Share of the right column that findings may take, and their least height [points].
const FINDINGS: (f32, f32) = (0.26, 74.0);

/// Draws the whole window.
pub(super) fn window_ui(ui: &mut Ui, desk: &mut Desk<'_>) {
    if desk.view.review {
        review::review_ui(ui, desk);
        return;
    }
    let palette = palette(ui);
    let frame = |fill| Frame::new().fill(fill);
    Panel::top("bar")
        .exact_size(theme::BAR_HEIGHT)
        .resizable(false)
        .frame(frame(palette.bar).inner_margin(Margin::symmetric(14, 0)))
        .show(ui, |ui| bar::bar_ui(ui, desk));
    if desk.session.stale() || desk.view.banner().is_some() || recovery::notice(desk).is_some() {
        Panel::top("notices").resizable(false).frame(frame(palette.field)).show(ui, |ui| bar::notices_ui(ui, desk));
    }
    if desk.view.hint {
        hint::hint_ui(ui, desk);
    }
    let (left_width, right_width) = column_widths(ui.available_width());
    let narrow = ui.available_width() < theme::LEFT_COLUMN + theme::RIGHT_COLUMN + LEAST_MIDDLE;
    let both = desk.view.stage_column && desk.view.readout_column;
    desk.view.one_column = narrow && both;
    let column = frame(palette.panel).inner_margin(Margin { left: 14, right: 8, top: 10, bottom: 8 });
    let (one, readouts_first) = (desk.view.one_column, desk.view.readouts_first);
    if desk.view.stage_column && (!one || !readouts_first) {
        let panel = Panel::left("stage").exact_size(left_width).resizable(false).frame(column);
        panel.show(ui, |ui| left_ui(ui, desk));
    }
    if desk.view.readout_column && (!one || readouts_first) {
        let panel = Panel::right("readouts").exact_size(right_width).resizable(false).frame(column);
        panel.show(ui, |ui| right_ui(ui, desk));
    }
    CentralPanel::default().frame(frame(palette.canvas)).show(ui, |ui| middle_ui(ui, desk));
}

/// Widths of both columns: they grow with a window that is wider than usual, up to where their words have room [points].
fn column_widths(window: f32) -> (f32, f32) {
    let (usual, wide) = WINDOW_WIDTHS;
    let share = ((window - usual) / (wide - usual)).clamp(0.0, 1.0);
    let grown = |least: f32, most: f32| (least + share * (most - least)).round();
    (grown(theme::LEFT_COLUMN, theme::WIDE_LEFT_COLUMN), grown(theme::RIGHT_COLUMN, theme::WIDE_RIGHT_COLUMN))
}

/// Margin of what stands at the foot of a column.
const FOOT_MARGIN: Margin = Margin { top: 8, right: 6, ..Margin::ZERO };

fn left_ui(ui: &mut Ui, desk: &mut Desk<'_>) {
    let tall = ui.available_height() > TALL_COLUMN;
    let below = if tall { 350.0 } else { 190.0_f32.min(ui.available_height() * 0.4) };
    let foot = Panel::bottom("operating").resizable(false).exact_size(below);
    foot.frame(Frame::new().inner_margin(FOOT_MARGIN)).show(ui, |ui| {
        ScrollArea::vertical().id_salt("operating").show(ui, |ui| {
            ui.set_max_width(ui.available_width());
            ui.multiply_opacity(if desk.session.stale() { theme::STALE } else { 1.0 });
            if tall {
                conditions::panel_ui(ui, desk);
                gap(ui);
            }
            ui.spacing_mut().item_spacing.y = 1.0;
            operating::operating_ui(ui, desk);
        });
    });
    // The schematic stays in view where there is height for it, else it scrolls with the entries.
    let fixed = ui.available_height() > HIGH_FORM;
    let head_ui = |ui: &mut Ui, desk: &mut Desk<'_>| {
        ui.set_max_width(ui.available_width() - 6.0);
        stage::title_ui(ui, desk);
        schematic::schematic_ui(ui, Sheet::Stage, desk);
    };
    if fixed {
        ui.scope(|ui| head_ui(ui, desk));
    }
    ScrollArea::vertical().id_salt("stage").auto_shrink(false).show(ui, |ui| {
        if !fixed {
            ui.scope(|ui| head_ui(ui, desk));
        }
        ui.set_max_width(ui.available_width() - 6.0);
        stage::stage_ui(ui, desk);
    });
}

fn right_ui(ui: &mut Ui, desk: &mut Desk<'_>) {
    findings_panel_ui(ui, desk);
    ScrollArea::vertical().id_salt("readouts").auto_shrink(false).show(ui, |ui| {
        ui.set_max_width(ui.available_width() - 6.0);
        ui.spacing_mut().item_spacing.y = 2.0;
        // Stale results stand back; the parts beside them are the present ones.
        ui.scope(|ui| {
            ui.multiply_opacity(if desk.session.stale() { theme::STALE } else { 1.0 });
            verdict::verdict_ui(ui, desk);
            readouts::readouts_ui(ui, desk);
        });
        if !desk.session.tries().is_empty() {
            gap(ui);
            tries::tries_ui(ui, desk);
        }
        gap(ui);
        parts::parts_ui(ui, desk);
        gap(ui);
        ui.scope(|ui| {
            ui.multiply_opacity(if desk.session.stale() { theme::STALE } else { 1.0 });
            ledger::ledger_ui(ui, desk);
        });
        ui.add_space(8.0);
    });
}

/// Findings are always in view: as high as they are, up to their share of the column.
fn findings_panel_ui(ui: &mut Ui, desk: &mut Desk<'_>) {
    let (share, least) = FINDINGS;
    let below = desk.view.findings_height.clamp(least, (ui.available_height() * share).max(least));
    let foot = Panel::bottom("findings").resizable(false).exact_size(below);
    foot.frame(Frame::new().inner_margin(FOOT_MARGIN)).show(ui, |ui| {
        let area = ScrollArea::vertical().id_salt("findings").auto_shrink(false);
        let output = area.show(ui, |ui| findings::findings_ui(ui, desk));
        let height = output.content_size.y + f32::from(FOOT_MARGIN.top) + 12.0;
        // The column above stays where it is while something is dragged.
        let calm = ui.input(|input| !input.pointer.any_down());
        if calm && (height - desk.view.findings_height).abs() > 0.5 {
            desk.view.findings_height = height;
            ui.ctx().request_repaint();
        }
    });
}

fn gap(ui: &mut Ui) {
    ui.add_space(12.0);
}

/// The row of pages, and the page under it.
fn middle_ui(ui: &mut Ui, desk: &mut Desk<'_>) {
    let room = ui.available_rect_before_wrap();
    let (row, page) = room.split_top_bottom_at_y(room.top() + pages::HEIGHT);
    let rest = pages::pages_ui(ui, row.translate(vec2(0.0, 3.0)), desk);
    match desk.view.page {
        Page::Loop => {
            exact_curves::switch_ui(ui, rest, desk);
            let mut page_ui = ui.new_child(UiBuilder::new().max_rect(page));
            loop_ui(&mut page_ui, desk);
        }
        Page::Waveforms => pages::page_ui(ui, page, waves::LEAST, |ui, rect| waves::waves_ui(ui, rect, desk)),
        Page::Transient => {
            transient::run_ui(ui, rest, desk);
            pages::page_ui(ui, page, transient::LEAST, |ui, rect| transient::transient_ui(ui, rect, desk));
        }
    }
    ui.advance_cursor_after_rect(room);
}

/// Bode plots with lanes above, time and closed-loop plots below; scrolls when the window is low.
fn loop_ui(ui: &mut Ui, desk: &mut Desk<'_>) {
    let room = ui.available_rect_before_wrap();
    let rows = if room.width() < SIDE_BY_SIDE { 2.0 } else { 1.0 };
    let lower = (room.height() * LOWER_SHARE).max(LEAST_LOWER) * rows;
    let upper = (room.height() - lower).max(LEAST_STACK);
    desk.view.plots_scroll = upper + lower > room.height() + 0.5;
    if !desk.view.plots_scroll {
        plots_ui(ui, room, upper, desk);
        return;
    }
    ScrollArea::vertical().id_salt("plots").auto_shrink(false).show(ui, |ui| {
        let (_, whole) = ui.allocate_space(vec2(room.width(), upper + lower));
        plots_ui(ui, whole, upper, desk);
    });
}

fn plots_ui(ui: &mut Ui, room: Rect, upper: f32, desk: &mut Desk<'_>) {
    let corner = pos2(room.right() - 4.0, room.top() + upper);
    let stack = Rect::from_min_max(pos2(room.left() + 4.0, room.top() + 6.0), corner);
    let mut stack_ui = ui.new_child(UiBuilder::new().max_rect(stack));
    bode::bode_ui(&mut stack_ui, desk);
    let top = stack.bottom() + 4.0;
    ui.painter().hline(room.x_range(), top, Stroke::new(1.0, palette(ui).hairline));
    let lower = Rect::from_min_max(pos2(stack.left(), top + 2.0), pos2(stack.right(), room.bottom() - 4.0));
    let (first, second) = if room.width() < SIDE_BY_SIDE {
        lower.split_top_bottom_at_fraction(0.5)
    } else {
        lower.split_left_right_at_fraction(0.5)
    };
    steps::steps_ui(ui, first, desk);
    responses::responses_ui(ui, second, desk);
}
