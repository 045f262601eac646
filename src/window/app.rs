//! The application: `logic` carries out commands and collects finished work, `ui` draws.

use std::path::PathBuf;

use eframe::egui::{self, CentralPanel, Frame, Margin, Panel, Rect, ScrollArea, Stroke, Ui, ViewportCommand, pos2};

use super::command::{COMMANDS, Command};
use super::files::FileDialogs;
use super::session::Session;
use super::theme::{self, palette};
use super::view::{Desk, View};
use super::{bar, bode, conditions, dialogs, findings, ledger, operating, parts, readouts, responses, stage, steps};
use crate::analysis;
use crate::design::Design;

/// The window's state: the work, the view, and what was asked for since the last turn.
#[derive(Debug)]
pub struct App {
    pub(super) session: Session,
    pub(super) view: View,
    pub(super) dialogs: FileDialogs,
    /// What unsaved changes held up while a path to save under is asked for.
    pub(super) after_saving: Option<Command>,
    /// True once closing was settled.
    pub(super) leaving: bool,
    asked: Vec<Command>,
    title: String,
}

/// Points of a curve come in whole lots, so that a window being resized does not ask anew at every pixel.
const COLUMNS_STEP: f32 = 64.0;
/// The same as a count.
const COLUMNS: usize = 64;
/// The widest plot, in such lots: four thousand columns.
const MOST_LOTS: usize = 64;
/// Height that steps and responses take under the Bode plots, as a share of the room.
const LOWER_SHARE: f32 = 0.29;
/// Least height of the stack before the column scrolls [points].
const LEAST_STACK: f32 = 400.0;
/// Least height of the plots under it [points].
const LEAST_LOWER: f32 = 150.0;

impl App {
    /// A window on a design and the file it came from.
    pub fn new(ctx: &egui::Context, design: Design, path: Option<PathBuf>) -> Self {
        theme::install(ctx);
        App {
            session: Session::new(design, path),
            view: View { theme: ctx.options(|options| options.theme_preference), ..View::default() },
            dialogs: FileDialogs::default(),
            after_saving: None,
            leaving: false,
            asked: Vec::new(),
            title: String::new(),
        }
    }

    /// The work: document, history, results.
    pub fn session(&self) -> &Session {
        &self.session
    }

    /// Asks for something as a menu would.
    pub fn ask(&mut self, command: Command) {
        self.asked.push(command);
    }

    /// Where the gain plot was drawn in the last frame [points].
    pub fn gain_rect(&self) -> Rect {
        self.view.gain_rect
    }

    /// Frequencies the plots span [Hz].
    pub fn frequency_range_hz(&self) -> (f64, f64) {
        self.view.range_hz.unwrap_or_else(|| self.session.whole_range_hz())
    }

    /// The message under the bar, if any.
    pub fn message(&self) -> Option<&super::view::Message> {
        self.view.message.as_ref()
    }

    fn shortcuts(&mut self, ctx: &egui::Context) {
        let typing = ctx.text_edit_focused();
        for row in COMMANDS {
            let Some(shortcut) = &row.shortcut else { continue };
            // While text is edited, undo and steps of the cursor are the field's own.
            let of_field = matches!(
                row.command,
                Command::Undo
                    | Command::Redo
                    | Command::NextCondition
                    | Command::PreviousCondition
                    | Command::WholeRange
            );
            if typing && of_field {
                continue;
            }
            if ctx.input_mut(|input| input.consume_shortcut(shortcut)) {
                self.take_over_field(ctx);
                self.asked.push(row.command.clone());
            }
        }
    }

    /// A command given while a field is edited works on what stands in the field.
    fn take_over_field(&mut self, ctx: &egui::Context) {
        if let Some(focused) = ctx.memory(egui::Memory::focused)
            && self.view.field.is_some()
        {
            ctx.memory_mut(|memory| memory.surrender_focus(focused));
        }
        if let Some(field) = self.view.field.take() {
            let entry = crate::design::entry(field.path);
            let value = self.session.design().values.get(field.path);
            let before = entry.zip(value).map(|(entry, value)| crate::quantity::exact(value, entry.unit));
            let before = self.session.bad_text(field.path).map(|bad| bad.text.clone()).or(before);
            if before.unwrap_or_default() != field.text {
                self.asked.push(Command::Enter { path: field.path, text: field.text });
            }
        }
    }

    fn dropped_files(&mut self, ctx: &egui::Context) {
        let dropped = ctx.input(|input| input.raw.dropped_files.first().map(|file| file.path().to_path_buf()));
        if let Some(path) = dropped {
            self.asked.push(Command::OpenPath(path));
        }
    }

    /// Closing with unsaved changes asks first.
    fn guard_closing(&mut self, ctx: &egui::Context) {
        if ctx.input(|input| input.viewport().close_requested()) && !self.leaving && self.session.unsaved() {
            ctx.send_viewport_cmd(ViewportCommand::CancelClose);
            self.asked.push(Command::Quit);
        }
    }

    /// Curves at one frequency per column of the plot, over the frequencies shown.
    fn ask_frequencies(&mut self) {
        let lots = (self.view.plot_width / COLUMNS_STEP).ceil();
        let points = (2..=MOST_LOTS).find(|count| *count as f32 >= lots).unwrap_or(MOST_LOTS) * COLUMNS;
        let (from, to) = self.frequency_range_hz();
        let frequencies_hz = analysis::logarithmic(from, to, points);
        self.session.ask_frequencies(frequencies_hz);
    }

    fn name_window(&mut self, ctx: &egui::Context) {
        let design = self.session.design();
        let edited = if self.session.unsaved() { ", edited" } else { "" };
        let title = format!("{}{edited} \u{2013} Polewright", design.title);
        if title != self.title {
            ctx.send_viewport_cmd(ViewportCommand::Title(title.clone()));
            self.title = title;
        }
    }
}

impl eframe::App for App {
    fn logic(&mut self, ctx: &egui::Context, _frame: &mut eframe::Frame) {
        self.shortcuts(ctx);
        self.dropped_files(ctx);
        self.guard_closing(ctx);
        self.take_file_answer();
        for command in std::mem::take(&mut self.asked) {
            self.perform(command, ctx);
        }
        self.ask_frequencies();
        self.session.refresh();
        self.name_window(ctx);
    }

    fn ui(&mut self, ui: &mut Ui, _frame: &mut eframe::Frame) {
        let width_before = self.view.plot_width;
        let mut desk = Desk { session: &self.session, view: &mut self.view, send: &mut self.asked };
        window_ui(ui, &mut desk);
        dialogs::dialog_ui(ui, &mut desk);
        // What was asked for is carried out in the next turn, and new widths ask for new curves there.
        let resized = (self.view.plot_width - width_before).abs() >= 1.0;
        if !self.asked.is_empty() || resized {
            ui.ctx().request_repaint();
        }
    }

    fn clear_color(&self, visuals: &egui::Visuals) -> [f32; 4] {
        visuals.panel_fill.to_normalized_gamma_f32()
    }
}

fn window_ui(ui: &mut Ui, desk: &mut Desk<'_>) {
    let palette = palette(ui);
    let frame = |fill| Frame::new().fill(fill);
    Panel::top("bar")
        .exact_size(theme::BAR_HEIGHT)
        .resizable(false)
        .frame(frame(palette.bar).inner_margin(Margin::symmetric(14, 0)))
        .show(ui, |ui| bar::bar_ui(ui, desk));
    if desk.session.stale() || desk.view.message.is_some() {
        Panel::top("notices").resizable(false).frame(frame(palette.field)).show(ui, |ui| bar::notices_ui(ui, desk));
    }
    let roomy = ui.available_width() > 2.0 * theme::LEFT_COLUMN + theme::RIGHT_COLUMN;
    let column = frame(palette.panel).inner_margin(Margin { left: 14, right: 8, top: 10, bottom: 8 });
    if desk.view.stage_column && roomy {
        Panel::left("stage")
            .exact_size(theme::LEFT_COLUMN)
            .resizable(false)
            .frame(column)
            .show(ui, |ui| left_ui(ui, desk));
    }
    if desk.view.readout_column {
        Panel::right("readouts")
            .exact_size(theme::RIGHT_COLUMN)
            .resizable(false)
            .frame(column)
            .show(ui, |ui| right_ui(ui, desk));
    }
    CentralPanel::default().frame(frame(palette.canvas)).show(ui, |ui| middle_ui(ui, desk));
}

/// Height from which the map of the nine conditions has a place of its own [points].
const TALL_COLUMN: f32 = 880.0;

fn left_ui(ui: &mut Ui, desk: &mut Desk<'_>) {
    let tall = ui.available_height() > TALL_COLUMN;
    let below = if tall { 350.0 } else { 190.0_f32.min(ui.available_height() * 0.4) };
    let margin = Margin { top: 8, right: 6, ..Margin::ZERO };
    Panel::bottom("operating").resizable(false).exact_size(below).frame(Frame::new().inner_margin(margin)).show(
        ui,
        |ui| {
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
        },
    );
    ScrollArea::vertical().id_salt("stage").auto_shrink(false).show(ui, |ui| {
        ui.set_max_width(ui.available_width() - 6.0);
        stage::stage_ui(ui, desk);
    });
}

/// Share of the right column that findings may take.
const FINDINGS_SHARE: f32 = 0.22;

fn right_ui(ui: &mut Ui, desk: &mut Desk<'_>) {
    let margin = Margin { top: 8, right: 6, ..Margin::ZERO };
    let below = (ui.available_height() * FINDINGS_SHARE).max(90.0);
    Panel::bottom("findings").resizable(false).exact_size(below).frame(Frame::new().inner_margin(margin)).show(
        ui,
        |ui| {
            ScrollArea::vertical()
                .id_salt("findings")
                .auto_shrink(false)
                .show(ui, |ui| findings::findings_ui(ui, desk));
        },
    );
    ScrollArea::vertical().id_salt("readouts").auto_shrink(false).show(ui, |ui| {
        ui.set_max_width(ui.available_width() - 6.0);
        ui.spacing_mut().item_spacing.y = 2.0;
        // Stale results stand back; the parts beside them are the present ones.
        ui.scope(|ui| {
            ui.multiply_opacity(if desk.session.stale() { theme::STALE } else { 1.0 });
            readouts::readouts_ui(ui, desk);
            gap(ui);
            ledger::ledger_ui(ui, desk);
        });
        gap(ui);
        parts::parts_ui(ui, desk);
        ui.add_space(8.0);
    });
}

fn gap(ui: &mut Ui) {
    ui.add_space(12.0);
}

/// Bode plots with lanes above, time and closed-loop plots below; scrolls when the window is low.
fn middle_ui(ui: &mut Ui, desk: &mut Desk<'_>) {
    let room = ui.available_rect_before_wrap();
    let lower = (room.height() * LOWER_SHARE).max(LEAST_LOWER);
    let upper = (room.height() - lower).max(LEAST_STACK);
    if upper + lower <= room.height() + 0.5 {
        plots_ui(ui, room, upper, desk);
        return;
    }
    ScrollArea::vertical().id_salt("plots").auto_shrink(false).show(ui, |ui| {
        let (_, whole) = ui.allocate_space(egui::vec2(room.width(), upper + lower));
        plots_ui(ui, whole, upper, desk);
    });
}

fn plots_ui(ui: &mut Ui, room: Rect, upper: f32, desk: &mut Desk<'_>) {
    let stack =
        Rect::from_min_max(pos2(room.left() + 4.0, room.top() + 6.0), pos2(room.right() - 4.0, room.top() + upper));
    let mut stack_ui = ui.new_child(egui::UiBuilder::new().max_rect(stack));
    bode::bode_ui(&mut stack_ui, desk);
    let top = stack.bottom() + 4.0;
    ui.painter().hline(room.x_range(), top, Stroke::new(1.0, palette(ui).hairline));
    let middle = room.center().x;
    let left = Rect::from_min_max(pos2(stack.left(), top + 2.0), pos2(middle, room.bottom() - 4.0));
    let right = Rect::from_min_max(pos2(middle, top + 2.0), pos2(stack.right(), room.bottom() - 4.0));
    steps::steps_ui(ui, left, desk);
    responses::responses_ui(ui, right, desk);
}
