//! The application: `logic` carries out commands and collects finished work, `ui` draws.

use std::path::PathBuf;

use eframe::egui::{self, FocusDirection, Key, Modifiers, Rect, Ui, ViewportCommand};

use super::command::{COMMANDS, Command, Row};
use super::exact::Wanted;
use super::files::FileDialogs;
use super::pages::Page;
use super::safety::Kept;
use super::session::Session;
use super::theme;
use super::view::{Desk, View};
use super::{dialogs, layout};
use crate::analysis::{self, Transient};
use crate::design::Design;

/// The window's state: the work, the view, and what was asked for since the last turn.
#[derive(Debug)]
pub struct App {
    pub(super) session: Session,
    pub(super) view: View,
    pub(super) dialogs: FileDialogs,
    /// What outlives the window.
    pub(super) kept: Kept,
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
impl App {
    /// A window on a design and the file it came from; it keeps nothing beyond its own life.
    pub fn new(ctx: &egui::Context, design: Design, path: Option<PathBuf>) -> Self {
        theme::install(ctx);
        let mut app = App {
            session: Session::new(design, path),
            view: View { theme: ctx.options(|options| options.theme_preference), ..View::default() },
            dialogs: FileDialogs::default(),
            kept: Kept::nothing(),
            after_saving: None,
            leaving: false,
            asked: Vec::new(),
            title: String::new(),
        };
        app.in_file(ctx);
        app
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

    /// True while the review view is open.
    pub fn reviewing(&self) -> bool {
        self.view.review
    }

    /// True while the hint for who is new here is shown.
    pub fn hinting(&self) -> bool {
        self.view.hint
    }

    /// Names of the parts, lanes and landmarks that are lit because of what is pointed at, for tests.
    pub fn lit(&mut self) -> Vec<String> {
        let desk = Desk { session: &self.session, kept: &self.kept, view: &mut self.view, send: &mut self.asked };
        desk.lit()
    }

    /// The transient that is shown, when it is that of the present design.
    pub fn transient(&self) -> Option<&Transient> {
        self.view.transient.result()
    }

    /// True while a transient runs.
    pub fn transient_runs(&self) -> bool {
        self.view.transient.runs()
    }

    /// The message under the bar, if any.
    pub fn message(&self) -> Option<&super::view::Message> {
        self.view.message.as_ref()
    }

    fn shortcuts(&mut self, ctx: &egui::Context) {
        let typing = ctx.text_edit_focused();
        // A shortcut without Shift takes the key with Shift as well, so those with Shift are asked first.
        let shifted = |row: &&Row| row.shortcut.is_some_and(|shortcut| shortcut.modifiers.shift);
        let rest = COMMANDS.iter().filter(|row| !shifted(row));
        for row in COMMANDS.iter().filter(shifted).chain(rest) {
            let Some(shortcut) = &row.shortcut else { continue };
            // While text is edited, undo and steps of the cursor are the field's own.
            let of_field = matches!(
                row.command,
                Command::Undo
                    | Command::Redo
                    | Command::NextCondition
                    | Command::PreviousCondition
                    | Command::WholeRange
                    | Command::Pan(_)
                    | Command::Zoom(_)
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

    /// Keys of the review view, where nothing else wants them.
    fn review_keys(&mut self, ctx: &egui::Context) {
        if !self.view.review || self.view.dialog.is_some() || ctx.text_edit_focused() || egui::Popup::is_any_open(ctx) {
            return;
        }
        let keys = [
            (Key::ArrowRight, Command::StepLevels { input: 0, load: 1 }),
            (Key::ArrowLeft, Command::StepLevels { input: 0, load: -1 }),
            (Key::ArrowDown, Command::StepLevels { input: 1, load: 0 }),
            (Key::ArrowUp, Command::StepLevels { input: -1, load: 0 }),
            (Key::PageDown, Command::StepTry { forward: true }),
            (Key::PageUp, Command::StepTry { forward: false }),
            (Key::Escape, Command::Review),
        ];
        for (key, command) in keys {
            if ctx.input_mut(|input| input.consume_key(Modifiers::NONE, key)) {
                // The keyboard's place stays where it is: the keys go through the conditions.
                ctx.memory_mut(|memory| memory.move_focus(FocusDirection::None));
                self.asked.push(command);
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
        if let Some((path, text)) = self.typed() {
            let text = text.to_owned();
            self.asked.push(Command::Enter { path, text });
        }
        self.view.field = None;
        if let Some(title) = self.view.title.take()
            && title != self.session.design().title
        {
            self.asked.push(Command::Title(title));
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
        if !ctx.input(|input| input.viewport().close_requested()) || self.leaving {
            return;
        }
        // What is being typed counts like what was entered.
        let asked = self.asked.len();
        self.take_over_field(ctx);
        if self.asked.len() > asked || self.session.unsaved() {
            ctx.send_viewport_cmd(ViewportCommand::CancelClose);
            self.asked.push(Command::Quit);
        }
    }

    /// Curves at no more than one frequency per column of the plot, over the frequencies shown.
    fn ask_frequencies(&mut self) {
        let lots = (self.view.plot_width / COLUMNS_STEP).floor();
        let points = (1..=MOST_LOTS).rev().find(|count| *count as f32 <= lots).unwrap_or(1) * COLUMNS;
        let (from, to) = self.frequency_range_hz();
        let frequencies_hz = analysis::logarithmic(from, to, points);
        self.session.ask_frequencies(frequencies_hz);
    }

    /// What is looked at beside the averaged results.
    fn ask_exact(&mut self) {
        let waveforms = self.view.page == Page::Waveforms && !self.view.review;
        self.session.ask_exact(Wanted { referee: self.view.exact, steady: waveforms });
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
        self.review_keys(ctx);
        self.dropped_files(ctx);
        self.guard_closing(ctx);
        self.take_file_answer();
        for command in std::mem::take(&mut self.asked) {
            self.perform(command, ctx);
        }
        self.ask_frequencies();
        self.ask_exact();
        self.session.refresh();
        self.follow_transient(ctx);
        self.keep_up(ctx);
        self.name_window(ctx);
    }

    fn ui(&mut self, ui: &mut Ui, _frame: &mut eframe::Frame) {
        let width_before = self.view.plot_width;
        self.view.begin_pointing();
        let mut desk = Desk { session: &self.session, kept: &self.kept, view: &mut self.view, send: &mut self.asked };
        layout::window_ui(ui, &mut desk);
        dialogs::dialog_ui(ui, &mut desk);
        // What was asked for is carried out in the next turn, and new widths ask for new curves there.
        let resized = (self.view.plot_width - width_before).abs() >= 1.0;
        if !self.asked.is_empty() || resized || self.view.pointed_elsewhere() {
            ui.ctx().request_repaint();
        }
    }

    fn on_exit(&mut self, _gl: Option<&eframe::glow::Context>) {
        self.keep_on_exit();
    }

    fn persist_egui_memory(&self) -> bool {
        // What is worth keeping stands in the settings.
        false
    }

    fn clear_color(&self, visuals: &egui::Visuals) -> [f32; 4] {
        visuals.panel_fill.to_normalized_gamma_f32()
    }
}
