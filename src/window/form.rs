//! The form: rows for the numbers and choices of the table of entries, drawn without knowing any of them by name.
//!
//! *Conventions*: text is taken over with Enter or when the field is left; Escape keeps what was there. Text that cannot be
//! read stays in its field with the reason under it. A field shows four digits; while edited it shows the exact number.

use std::borrow::Cow;

use eframe::egui::{
    self, Align, FontSelection, Id, Key, Layout, Response, RichText, Role, Sense, Stroke, TextEdit, Ui, UiBuilder,
    WidgetInfo, pos2, text::CCursor, text::CCursorRange, vec2,
};

use super::command::Command;
use super::explain;
use super::pointed::Pointed;
use super::theme::{self, palette};
use super::view::{Desk, Field};
use crate::analysis::terms;
use crate::quantity::{self, Choice, ChoiceOption, Entry};

/// What a form row stands for.
enum Item {
    /// One of several named options.
    Choice(&'static Choice),
    /// A heading over entries of a numbered group.
    Heading(String),
    /// One number.
    Entry(&'static Entry),
    /// Least, nominal and greatest of one quantity.
    Range([&'static Entry; 3]),
}

/// Draws the rows of all entries and choices whose path starts with `section` and passes `takes`.
pub(super) fn section_ui(ui: &mut Ui, section: &str, takes: impl Fn(&str) -> bool, desk: &mut Desk<'_>) {
    for item in items(section, takes, desk) {
        match item {
            Item::Choice(choice) => choice_row_ui(ui, choice, desk),
            Item::Heading(text) => {
                ui.add_space(5.0);
                ui.label(RichText::new(text).font(theme::strong(12.0)));
            }
            Item::Entry(entry) => entry_row_ui(ui, entry, entry.name, desk),
            Item::Range(entries) => range_row_ui(ui, &entries, desk),
        }
    }
}

fn items(section: &str, takes: impl Fn(&str) -> bool, desk: &Desk<'_>) -> Vec<Item> {
    let design = desk.session.design();
    let inside = |path: &str| path.strip_prefix(section).is_some_and(|rest| rest.starts_with('.')) && takes(path);
    let entries: Vec<_> = design.entries().into_iter().filter(|entry| inside(entry.path)).collect();
    let mut choices: Vec<_> = design.choice_rows().into_iter().filter(|choice| inside(choice.path)).collect();
    let governs = |choice: &Choice| entries.iter().any(|entry| under(entry.path, choice.path));
    let mut items: Vec<Item> =
        choices.iter().filter(|choice| !governs(choice)).map(|choice| Item::Choice(choice)).collect();
    choices.retain(|choice| governs(choice));
    let mut group = "";
    let mut index = 0;
    while let Some(entry) = entries.get(index) {
        if let Some(at) = choices.iter().position(|choice| under(entry.path, choice.path)) {
            items.push(Item::Choice(choices.remove(at)));
        }
        let (parent, _) = entry.path.rsplit_once('.').unwrap_or_default();
        if parent != group {
            group = parent;
            items.extend(numbered(parent).map(Item::Heading));
        }
        match entries.get(index..index + 3) {
            Some([least, nominal, greatest]) if is_range(least, nominal, greatest) => {
                items.push(Item::Range([least, nominal, greatest]));
                index += 3;
            }
            _ => {
                items.push(Item::Entry(entry));
                index += 1;
            }
        }
    }
    items
}

fn under(path: &str, parent: &str) -> bool {
    path.strip_prefix(parent).is_some_and(|rest| rest.starts_with('.'))
}

/// Heading of a numbered group: "Bank 2" for `stage.bank.2`.
fn numbered(parent: &str) -> Option<String> {
    let (rest, number) = parent.rsplit_once('.')?;
    let number: u8 = number.parse().ok()?;
    let word = rest.rsplit('.').next()?;
    let mut letters = word.chars();
    let first = letters.next()?.to_uppercase();
    Some(format!("{first}{} {number}", letters.as_str()))
}

fn is_range(least: &Entry, nominal: &Entry, greatest: &Entry) -> bool {
    let parent = least.path.strip_suffix(".least");
    parent.is_some()
        && parent == nominal.path.strip_suffix(".nominal")
        && parent == greatest.path.strip_suffix(".greatest")
}

fn choice_row_ui(ui: &mut Ui, choice: &'static Choice, desk: &mut Desk<'_>) {
    row_ui(ui, (choice.name, choice.help), CHOICE_LABEL_SHARE, |ui, width| choice_ui(ui, choice, width, desk));
}

/// Most of the window's height that a list of options takes before it scrolls.
pub(super) const LIST_SHARE: f32 = 0.7;

/// One option in a list that may scroll: the keyboard's focus is brought into sight. Returns whether it was pressed.
pub(super) fn option_ui(ui: &mut Ui, option: &ChoiceOption, chosen: bool) -> bool {
    let response = ui.selectable_label(chosen, option.name).on_hover_text(option.help);
    if response.gained_focus() {
        response.scroll_to_me(None);
    }
    response.clicked()
}

/// A choice between options, as a list that opens.
pub(super) fn choice_ui(ui: &mut Ui, choice: &'static Choice, width: f32, desk: &mut Desk<'_>) {
    let key = desk.session.design().choices.get_or_default(choice);
    let chosen = choice.option(key).map_or(key, |option| option.name);
    let text = RichText::new(chosen).color(palette(ui).accent);
    let response = egui::ComboBox::from_id_salt(choice.path)
        .selected_text(text)
        .width(width)
        .height(ui.ctx().content_rect().height() * LIST_SHARE)
        .truncate()
        .show_ui(ui, |ui| {
            for option in choice.options {
                if option_ui(ui, option, option.key == key) && option.key != key {
                    desk.ask(Command::Choose { path: choice.path, key: option.key });
                }
            }
        })
        .response;
    response.widget_info(|| {
        let mut info = WidgetInfo::labeled(Role::ComboBox, true, choice.name);
        info.current_text_value = Some(chosen.to_owned());
        info
    });
    problem_ui(ui, choice.path, desk);
}

fn entry_row_ui(ui: &mut Ui, entry: &'static Entry, name: &str, desk: &mut Desk<'_>) {
    row_ui(ui, (name, &help(entry)), LABEL_SHARE, |ui, width| {
        field_ui(ui, entry, width, desk);
    });
    problem_ui(ui, entry.path, desk);
}

fn range_row_ui(ui: &mut Ui, entries: &[&'static Entry; 3], desk: &mut Desk<'_>) {
    let name = entries[0].name.split(',').next().unwrap_or_default();
    let room = ui.available_width();
    ui.allocate_ui_with_layout(vec2(room, theme::ROW), Layout::left_to_right(Align::Center), |ui| {
        ui.spacing_mut().item_spacing.x = 4.0;
        let label_width = 44.0;
        label_ui(ui, name, "least, nominal and greatest", label_width);
        let width = (room - label_width - 12.0) / 3.0;
        for entry in entries {
            field_ui(ui, entry, width, desk);
        }
    });
    for entry in entries {
        problem_ui(ui, entry.path, desk);
    }
}

/// Share of a row's width that the label takes.
const LABEL_SHARE: f32 = 0.6;
/// The same where the row holds a choice, whose options are words.
const CHOICE_LABEL_SHARE: f32 = 0.4;
/// Greatest width of a field for a number [points].
const FIELD_WIDTH: f32 = 104.0;

fn row_ui(ui: &mut Ui, words: (&str, &str), share: f32, field: impl FnOnce(&mut Ui, f32)) {
    let room = ui.available_width();
    ui.allocate_ui_with_layout(vec2(room, theme::ROW), Layout::left_to_right(Align::Center), |ui| {
        ui.spacing_mut().item_spacing.x = 4.0;
        // A field needs no more than its number; what a wide column has beyond that is the label's.
        let number = if share < LABEL_SHARE { 0.0 } else { room - FIELD_WIDTH };
        let label_width = (room * share).max(number).round();
        label_ui(ui, words.0, words.1, label_width);
        field(ui, room - label_width - 4.0);
    });
}

/// The name of a row, with its explanation.
pub(super) fn label_ui(ui: &mut Ui, name: &str, help: &str, width: f32) {
    let (rect, response) = ui.allocate_exact_size(vec2(width, theme::ROW), Sense::hover());
    let mut inner = ui.new_child(UiBuilder::new().max_rect(rect).layout(Layout::left_to_right(Align::Center)));
    inner.add(egui::Label::new(RichText::new(name).color(palette(ui).weak)).truncate());
    response.on_hover_text(format!("{name}\n{help}"));
}

/// Identity of an entry's field, so that a finding can lead to it.
pub(super) fn field_id(path: &str) -> Id {
    Id::unique(("entry", path))
}

/// A field for one number.
pub(super) fn field_ui(ui: &mut Ui, entry: &'static Entry, width: f32, desk: &mut Desk<'_>) -> Response {
    let id = field_id(entry.path);
    let editing = desk.view.field.as_ref().is_some_and(|field| field.path == entry.path);
    let mut text = match &mut desk.view.field {
        Some(field) if editing => std::mem::take(&mut field.text),
        _ => resting_text(entry, desk),
    };
    let refused = desk.session.bad_text(entry.path).is_some() || desk.session.finding_at(entry.path).is_some();
    let response = ui
        .scope(|ui| {
            if refused {
                let stroke = Stroke::new(1.5, palette(ui).problem);
                let widgets = &mut ui.visuals_mut().widgets;
                widgets.inactive.bg_stroke = stroke;
                widgets.hovered.bg_stroke = stroke;
            }
            let edit = TextEdit::singleline(&mut text)
                .id(id)
                .font(FontSelection::FontId(theme::body()))
                .hint_text(match entry.path.split('.').next() {
                    Some("requirement") if entry.optional => "not asked",
                    _ if entry.optional => "empty",
                    _ => "",
                })
                .margin(egui::Margin::symmetric(4, 2))
                .desired_width(width)
                .clip_text(true);
            ui.add(edit)
        })
        .inner
        .accessible_name(entry.name);
    // A focus that was asked for in the frame before is no longer news, so having it counts, not gaining it.
    if response.has_focus() && !editing {
        text = exact_text(entry, desk);
        select_all(ui, id, &text);
        desk.view.field = Some(Field { path: entry.path, text });
    } else if editing {
        if response.lost_focus() || !response.has_focus() {
            leave_field(ui, entry, text, desk);
        } else {
            desk.view.field = Some(Field { path: entry.path, text });
        }
    }
    desk.view.point(Pointed::Entry(entry.path), &response);
    if desk.view.seek.as_deref() == Some(entry.path) {
        desk.view.seek = None;
        response.request_focus();
        response.scroll_to_me(Some(Align::Center));
    }
    if response.has_focus() { response } else { explain::described(ui, response, || help(entry).into_owned()) }
}

/// The help of an entry; that of a requirement with the formula of what it limits.
pub(super) fn help(entry: &Entry) -> Cow<'static, str> {
    match terms::of_entry(entry.path) {
        Some(term) => format!("{}\n{}", entry.help, term.formula).into(),
        None => entry.help.into(),
    }
}

/// What a field shows while nobody edits it.
fn resting_text(entry: &Entry, desk: &Desk<'_>) -> String {
    if let Some(bad) = desk.session.bad_text(entry.path) {
        return bad.text.clone();
    }
    let value = desk.session.design().values.get(entry.path);
    value.map_or_else(String::new, |value| quantity::print(value, entry.unit))
}

/// What a field shows while it is edited: every digit.
fn exact_text(entry: &Entry, desk: &Desk<'_>) -> String {
    if let Some(bad) = desk.session.bad_text(entry.path) {
        return bad.text.clone();
    }
    let value = desk.session.design().values.get(entry.path);
    value.map_or_else(String::new, |value| quantity::exact(value, entry.unit))
}

/// Takes over what was typed, unless it was escaped or is what stood there before.
fn leave_field(ui: &Ui, entry: &'static Entry, text: String, desk: &mut Desk<'_>) {
    desk.view.field = None;
    let escaped = ui.input(|input| input.key_pressed(Key::Escape));
    if !escaped && text != exact_text(entry, desk) {
        desk.ask(Command::Enter { path: entry.path, text });
    }
}

fn select_all(ui: &Ui, id: Id, text: &str) {
    let mut state = TextEdit::load_state(ui.ctx(), id).unwrap_or_default();
    let whole = CCursorRange::two(CCursor::new(0), CCursor::new(text.chars().count()));
    state.cursor.set_char_range(Some(whole));
    state.store(ui.ctx(), id);
}

/// The reason why an entry cannot be used, under its field.
pub(super) fn problem_ui(ui: &mut Ui, path: &str, desk: &Desk<'_>) {
    let Some(finding) = desk.session.finding_at(path) else { return };
    let palette = palette(ui);
    let mut text = finding.message.clone();
    if let Some(hint) = &finding.hint {
        text = format!("{text} {}", super::findings::sentence(hint));
    }
    let response = ui.label(RichText::new(text).font(theme::small()).color(palette.problem));
    let edge = response.rect.left() - 6.0;
    ui.painter().line_segment(
        [pos2(edge, response.rect.top() + 1.0), pos2(edge, response.rect.bottom() - 1.0)],
        Stroke::new(2.0, palette.problem),
    );
}
