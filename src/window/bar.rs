//! The top bar: which design, which condition, the menus; and messages under it.

use eframe::egui::{
    self, Align, Button, Color32, Layout, Pos2, Rect, RichText, ScrollArea, Shape, ThemePreference, Ui, UiBuilder,
    pos2, vec2,
};

use super::command::{COMMANDS, Command, Curve, Exported, Menu, Row};
use super::pages::Page;
use super::theme::{self, palette};
use super::view::Desk;
use super::{conditions, recents, recovery};
use crate::compensator::LaneKind;
use crate::design;

/// Room that the words at the right of the bar take [points].
const WORDS: f32 = 345.0;
/// Least room for the chooser's full text, and for the name of the file [points].
const ROOMY: f32 = 860.0;

/// Draws the bar: names at the left, the chooser in the middle, what can be pressed at the right.
pub(super) fn bar_ui(ui: &mut Ui, desk: &mut Desk<'_>) {
    let room = ui.max_rect();
    let roomy = room.width() > ROOMY;
    let left_width = if roomy { room.width() * 0.29 } else { (room.width() - WORDS) * 0.42 };
    let right_width = if roomy { (room.width() * 0.29).max(WORDS) } else { WORDS };
    let left = Rect::from_min_max(room.min, pos2(room.left() + left_width, room.bottom()));
    let right = Rect::from_min_max(pos2(room.right() - right_width, room.top()), room.max);
    let middle = Rect::from_min_max(left.right_top(), right.left_bottom());
    let mut at_left = ui.new_child(UiBuilder::new().max_rect(left).layout(Layout::left_to_right(Align::Center)));
    names_ui(&mut at_left, roomy, desk);
    let mut at_middle = ui.new_child(UiBuilder::new().max_rect(middle).layout(Layout::top_down(Align::Center)));
    at_middle.add_space(((middle.height() - 28.0) / 2.0).max(0.0));
    conditions::chooser_ui(&mut at_middle, roomy, desk);
    let mut at_right = ui.new_child(UiBuilder::new().max_rect(right).layout(Layout::right_to_left(Align::Center)));
    menus_ui(&mut at_right, desk);
}

fn names_ui(ui: &mut Ui, with_file: bool, desk: &Desk<'_>) {
    let design = desk.session.design();
    let title = if design.title.is_empty() { "Untitled" } else { &design.title };
    ui.add(egui::Label::new(RichText::new(title).font(theme::strong(14.5))).truncate());
    if !with_file {
        return;
    }
    let file = desk.session.path().and_then(|path| path.file_name()).map(|name| name.to_string_lossy().into_owned());
    let mut text = file.unwrap_or_else(|| "not in a file yet".to_owned());
    if desk.session.unsaved() {
        text += ", edited";
    }
    ui.add(egui::Label::new(RichText::new(text).color(palette(ui).weak)).truncate());
}

fn menus_ui(ui: &mut Ui, desk: &mut Desk<'_>) {
    ui.spacing_mut().item_spacing.x = 4.0;
    ui.visuals_mut().widgets.inactive.bg_stroke = egui::Stroke::NONE;
    for (menu, name) in [(Menu::View, "View"), (Menu::Edit, "Edit"), (Menu::Design, "Design")] {
        let text = RichText::new(name).color(palette(ui).accent);
        ui.menu_button(text, |ui| menu_ui(ui, menu, desk));
    }
    ui.add_space(6.0);
    let undo = desk.session.history().undo_name().map(str::to_owned);
    let redo = desk.session.history().redo_name().map(str::to_owned);
    word_ui(ui, "Hold", true, "Keep the present curves to compare with the next try.", Command::Hold, desk);
    let help = redo.as_ref().map_or_else(|| "Nothing to redo.".to_owned(), |name| format!("Redo: {name}"));
    word_ui(ui, "Redo", redo.is_some(), &help, Command::Redo, desk);
    let help = undo.as_ref().map_or_else(|| "Nothing to undo.".to_owned(), |name| format!("Undo: {name}"));
    word_ui(ui, "Undo", undo.is_some(), &help, Command::Undo, desk);
}

fn word_ui(ui: &mut Ui, word: &str, enabled: bool, help: &str, command: Command, desk: &mut Desk<'_>) {
    let accent = palette(ui).accent;
    let button = Button::new(RichText::new(word).color(accent));
    let response = ui.add_enabled(enabled, button);
    if response.on_hover_text(help).on_disabled_hover_text(help).clicked() {
        desk.ask(command);
    }
}

/// Width of a menu [points].
const MENU: f32 = 264.0;
/// Width of the list of samples [points].
const SAMPLES: f32 = 430.0;

/// Whether a line stands above a command in its menu: what follows is of another kind.
fn begins_group(command: &Command) -> bool {
    matches!(
        command,
        Command::Toggle(Curve::Plant)
            | Command::Page(Page::Loop)
            | Command::SweepLoad
            | Command::WholeRange
            | Command::ToggleStage
            | Command::Theme(ThemePreference::Light)
            | Command::Larger
            | Command::ListCommands
            | Command::RoundParts
            | Command::Tie(LaneKind::Zero)
            | Command::Export(Exported::Bode | Exported::Curves)
            | Command::Reload
            | Command::Quit
    )
}

fn menu_ui(ui: &mut Ui, menu: Menu, desk: &mut Desk<'_>) {
    ui.set_width(MENU);
    scrolled(ui, "menu", |ui| {
        // What closes the window stands last, under the lists of files.
        let of_menu = |row: &&Row| row.menu == menu && row.command != Command::Quit;
        COMMANDS.iter().filter(of_menu).for_each(|row| menu_row_ui(ui, row, desk));
        if menu == Menu::Design {
            files_ui(ui, desk);
            COMMANDS.iter().filter(|row| row.command == Command::Quit).for_each(|row| menu_row_ui(ui, row, desk));
        }
    });
}

/// A list that may be higher than the window, as menus are with large text.
fn scrolled(ui: &mut Ui, salt: &str, lines: impl FnOnce(&mut Ui)) {
    let height = ui.ctx().content_rect().height() - 2.0 * theme::BAR_HEIGHT;
    ScrollArea::vertical().id_salt(salt).max_height(height.max(120.0)).show(ui, lines);
}

/// Lists that open beside the menu.
fn files_ui(ui: &mut Ui, desk: &mut Desk<'_>) {
    ui.separator();
    ui.menu_button("Copy and export", |ui| menu_ui(ui, Menu::Export, desk));
    ui.menu_button("Recent files", |ui| {
        if recents::recents_ui(ui, desk) {
            ui.close();
        }
    });
    ui.menu_button("Samples", |ui| {
        let mut pressed = false;
        ui.set_width(SAMPLES);
        scrolled(ui, "samples", |ui| {
            // A menu stretches the words of a line to its width.
            ui.with_layout(Layout::top_down(Align::Min), |ui| pressed = samples_ui(ui, desk));
        });
        if pressed {
            ui.close();
        }
    });
}

fn menu_row_ui(ui: &mut Ui, row: &Row, desk: &mut Desk<'_>) {
    if begins_group(&row.command) {
        ui.separator();
    }
    if command_ui(ui, row, chosen(&row.command, desk)) {
        desk.ask(row.command.clone());
        ui.close();
    }
}

/// A command as a line of a list or a menu; true when pressed. Its keys stand beside it and are no part of its name.
pub(super) fn command_ui(ui: &mut Ui, row: &Row, selected: bool) -> bool {
    let mut button = Button::new(row.name).stroke(egui::Stroke::NONE).selected(selected);
    let keys = row.shortcut.map(|shortcut| ui.ctx().format_shortcut(&shortcut));
    if let Some(keys) = &keys {
        button = button.shortcut_text(keys);
    }
    button = button.min_size(vec2(ui.available_width(), 0.0));
    let response = ui.add(button).accessible_name(row.name);
    super::legend::focus_ring(ui, &response);
    if let Some(keys) = keys {
        ui.ctx().accesskit_node_builder(response.id, |node| node.set_keyboard_shortcut(keys));
    }
    response.on_hover_text(row.help).clicked()
}

/// Whether a command stands for something that is switched on.
fn chosen(command: &Command, desk: &Desk<'_>) -> bool {
    match command {
        Command::Toggle(curve) => desk.view.shows(*curve),
        Command::ToggleBand => desk.view.band,
        Command::ToggleExact => desk.view.exact,
        Command::Page(page) => desk.view.page == *page,
        Command::Tie(kind) => desk.session.tied(*kind),
        Command::ToggleStage => desk.view.stage_column,
        Command::ToggleReadouts => desk.view.readout_column,
        Command::ToggleSchematics => desk.view.schematics.shown(),
        Command::Theme(theme) => desk.view.theme == *theme,
        _ => false,
    }
}

/// The sample designs, each with its line; true when one was pressed.
pub(super) fn samples_ui(ui: &mut Ui, desk: &mut Desk<'_>) -> bool {
    let mut pressed = false;
    ui.set_max_width(SAMPLES);
    for sample in design::sample::all() {
        let title = RichText::new(sample.title).color(palette(ui).accent);
        let response = ui.add(Button::new(title).frame(false));
        super::legend::focus_ring(ui, &response);
        ui.label(RichText::new(sample.line).font(theme::small()).color(palette(ui).weak));
        ui.add_space(4.0);
        if response.clicked() {
            desk.ask(Command::OpenSample(sample.file));
            pressed = true;
        }
    }
    pressed
}

/// The mark of a list that opens.
pub(super) fn down_mark(ui: &Ui, at: Pos2) {
    let colour: Color32 = palette(ui).accent;
    let points = vec![at + vec2(-4.0, -2.0), at + vec2(4.0, -2.0), at + vec2(0.0, 3.0)];
    ui.painter().add(Shape::convex_polygon(points, colour, egui::Stroke::NONE));
}

/// A line under the bar: results are stale, or what was last said.
pub(super) fn notices_ui(ui: &mut Ui, desk: &mut Desk<'_>) {
    let palette = palette(ui);
    if desk.session.stale() {
        let count = desk.session.problems().len();
        let first = desk.session.problems().first().map(|finding| finding.message.clone()).unwrap_or_default();
        let more = if count > 1 { format!(" And {} more, see findings.", count - 1) } else { String::new() };
        let shown = if desk.session.analysis().is_some() {
            "Stale: the curves are those of the last usable design. "
        } else {
            ""
        };
        line_ui(ui, &format!("{shown}{first}{more}"), palette.problem, |_| {});
    }
    recovery::notice_ui(ui, desk);
    if let Some(message) = desk.view.banner().cloned() {
        let colour = if message.failed { palette.problem } else { palette.good };
        let mut closed = false;
        line_ui(ui, &message.text, colour, |ui| closed = ui.button("Close").clicked());
        if closed {
            desk.view.message = None;
        }
    }
}

/// A line under the bar: a mark in its colour, its text, and what can be done about it at the right.
pub(super) fn line_ui(ui: &mut Ui, text: &str, colour: Color32, end: impl FnOnce(&mut Ui)) {
    let ground = palette(ui).field;
    egui::Frame::new().fill(ground).inner_margin(egui::Margin::symmetric(14, 5)).show(ui, |ui| {
        ui.horizontal(|ui| {
            let (rect, _) = ui.allocate_exact_size(vec2(4.0, 16.0), egui::Sense::hover());
            ui.painter().rect_filled(rect, 1.0, colour);
            ui.with_layout(Layout::right_to_left(Align::Center), |ui| {
                end(ui);
                ui.with_layout(Layout::left_to_right(Align::Center), |ui| {
                    ui.add(egui::Label::new(RichText::new(text).color(palette(ui).ink)).truncate()).on_hover_text(text);
                });
            });
        });
    });
}
