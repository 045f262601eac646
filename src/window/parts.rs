//! The compensator's panel: network, amplifier, its parts with their locks, rounding to preferred values.

use eframe::egui::{self, Align, Layout, Rect, RichText, Role, Sense, Stroke, StrokeKind, Ui, WidgetInfo, pos2, vec2};

use super::command::Command;
use super::form;
use super::pointed::{Pointed, Sheet};
use super::schematic;
use super::theme::{self, palette};
use super::view::Desk;
use crate::compensator::Part;
use crate::quantity::Entry;

/// Draws the panel.
pub(super) fn parts_ui(ui: &mut Ui, desk: &mut Desk<'_>) {
    heading_ui(ui, desk);
    ui.add_space(3.0);
    schematic::schematic_ui(ui, Sheet::Compensator, desk);
    let parts: Vec<_> = desk.session.design().entries().into_iter().filter(|entry| is_part(entry.path)).collect();
    let room = ui.available_width();
    for pair in parts.chunks(2) {
        ui.allocate_ui_with_layout(vec2(room, theme::ROW), Layout::left_to_right(Align::Center), |ui| {
            ui.spacing_mut().item_spacing.x = 3.0;
            for entry in pair {
                part_ui(ui, entry, (room - 10.0) / 2.0, desk);
                ui.add_space(4.0);
            }
        });
        for entry in pair {
            form::problem_ui(ui, entry.path, desk);
        }
    }
    ui.add_space(3.0);
    round_ui(ui, desk);
    coefficients_ui(ui, desk);
    ui.add_space(3.0);
    super::goal::goal_ui(ui, desk);
    // Where little more than a divider is made of parts, what the rest is made of stands open.
    let few = parts.len() <= 2;
    let title = if few { "Method, words, converters" } else { "Divider, amplifier, anchor" };
    let header = egui::CollapsingHeader::new(RichText::new(title).color(palette(ui).weak))
        .id_salt(("compensator entries", few))
        .default_open(few)
        .open(sought(desk).then_some(true))
        .show_unindented(ui, |ui| {
            form::section_ui(ui, "compensator", |path| !is_part(path) && !in_heading(path), desk);
        });
    super::legend::focus_ring(ui, &header.header_response);
}

/// True when something leads to an entry below the fold.
fn sought(desk: &Desk<'_>) -> bool {
    desk.view.seek.as_deref().is_some_and(|path| path.starts_with("compensator.") && !is_part(path))
}

fn is_part(path: &str) -> bool {
    Part::ALL.iter().any(|part| part.path() == path)
}

/// Choices that stand in the heading or in the line of rounding.
fn in_heading(path: &str) -> bool {
    matches!(path, "compensator.type" | "compensator.amplifier") || path.starts_with("compensator.series.")
}

/// Network and amplifier with the least widths of their fields [points].
const CHOICES: [(&str, f32); 2] = [("compensator.type", 74.0), ("compensator.amplifier", 76.0)];
/// Room of a choice's field beside its word [points].
const CHOICE_EDGE: f32 = 36.0;

/// The heading with the two choices at its right, or under it where a long word leaves no room.
fn heading_ui(ui: &mut Ui, desk: &mut Desk<'_>) {
    let design = desk.session.design();
    let wide = |(path, least): (&str, f32)| {
        let choice = design.choice_rows().into_iter().find(|row| row.path == path)?;
        let option = choice.option(design.choices.get_or_default(choice))?;
        let galley = ui.painter().layout_no_wrap(option.name.to_owned(), theme::body(), palette(ui).ink);
        Some((galley.size().x + CHOICE_EDGE).max(least))
    };
    let needed: f32 = CHOICES.into_iter().filter_map(wide).map(|width| width + 4.0).sum();
    let mut beside = false;
    ui.horizontal(|ui| {
        ui.label(RichText::new("Compensator").font(theme::strong(13.5)));
        beside = ui.available_width() >= needed;
        if beside {
            ui.with_layout(Layout::right_to_left(Align::Center), |ui| {
                CHOICES.into_iter().rev().for_each(|choice| heading_choice_ui(ui, choice, desk));
            });
        }
    });
    if !beside {
        ui.horizontal(|ui| CHOICES.into_iter().for_each(|choice| heading_choice_ui(ui, choice, desk)));
    }
}

fn heading_choice_ui(ui: &mut Ui, (path, width): (&str, f32), desk: &mut Desk<'_>) {
    ui.spacing_mut().item_spacing.x = 4.0;
    if let Some(choice) = desk.session.design().choice_rows().into_iter().find(|row| row.path == path) {
        form::choice_ui(ui, choice, width, desk);
    }
}

/// Name of a part without its explanation: "R2" of "R2, sets the first zero".
pub(super) fn short_name(entry: &Entry) -> &'static str {
    match entry.path {
        "compensator.divider.upper" => "Rupper",
        "compensator.divider.lower" => "Rlower",
        "compensator.cff" => "Cff",
        _ => entry.name.split(',').next().unwrap_or(entry.name),
    }
}

/// Width of a part's name [points].
const LABEL: f32 = 38.0;

fn part_ui(ui: &mut Ui, entry: &'static Entry, width: f32, desk: &mut Desk<'_>) {
    let lit = desk.lit_entry(entry.path);
    let palette = palette(ui);
    let (rect, response) = ui.allocate_exact_size(vec2(LABEL, theme::ROW), Sense::hover());
    let ink = if lit { palette.compensator } else { palette.weak };
    ui.painter().text(rect.left_center(), egui::Align2::LEFT_CENTER, short_name(entry), theme::small(), ink);
    desk.view.point(Pointed::Entry(entry.path), &response);
    response.on_hover_text(format!("{}\n{}", entry.name, entry.help));
    form::field_ui(ui, entry, width - LABEL - 21.0, desk);
    lock_ui(ui, entry, desk);
}

/// The padlock beside a part: closed, the part stays when lanes move and parts are rounded.
fn lock_ui(ui: &mut Ui, entry: &'static Entry, desk: &mut Desk<'_>) {
    let palette = palette(ui);
    let locked = desk.session.design().locks.contains(entry.path);
    let (rect, response) = ui.allocate_exact_size(vec2(14.0, theme::ROW), Sense::click());
    let label = format!("Keep {}", short_name(entry));
    response.widget_info(|| WidgetInfo::selected(Role::CheckBox, true, locked, &label));
    super::legend::focus_ring(ui, &response);
    let faint = if response.hovered() { palette.accent } else { palette.rail };
    let colour = if locked { palette.accent } else { faint };
    let body = Rect::from_center_size(rect.center() + vec2(0.0, 2.5), vec2(9.0, 7.0));
    let shackle =
        Rect::from_min_max(pos2(body.left() + 1.8, body.top() - 5.0), pos2(body.right() - 1.8, body.top() + 2.0));
    let lift = if locked { 0.0 } else { 2.0 };
    ui.painter().rect_stroke(
        shackle.translate(vec2(lift, -lift * 0.5)),
        2.5,
        Stroke::new(1.3, colour),
        StrokeKind::Middle,
    );
    ui.painter().rect_filled(body, 1.5, colour);
    let help = if locked {
        "Kept: neither lanes nor rounding change it. Press to let it go."
    } else {
        "Press to keep this part as it is."
    };
    if response.on_hover_text(help).clicked() {
        desk.ask(Command::Lock { path: entry.path, locked: !locked });
    }
}

/// The coefficients of a difference equation, to be taken to where they are typed in.
fn coefficients_ui(ui: &mut Ui, desk: &mut Desk<'_>) {
    if desk.session.design().compensator().ok().and_then(|compensator| compensator.digital()).is_none() {
        return;
    }
    let button = egui::Button::new(RichText::new("Copy coefficients").color(palette(ui).accent));
    let help = "The difference equation with its coefficients as values, codes and scale, onto the clipboard.";
    if ui.add(button).on_hover_text(help).clicked() {
        desk.ask(Command::CopyParts);
    }
}

fn round_ui(ui: &mut Ui, desk: &mut Desk<'_>) {
    ui.horizontal(|ui| {
        ui.spacing_mut().item_spacing.x = 5.0;
        let button = egui::Button::new(RichText::new("Round to").color(palette(ui).accent));
        let response = ui.add(button).accessible_name("Round parts to their series");
        if response.on_hover_text("Set all parts that are not kept to values of these series.").clicked() {
            desk.ask(Command::RoundParts);
        }
        for (path, word) in [("compensator.series.resistors", "R"), ("compensator.series.capacitors", "C")] {
            if let Some(choice) = desk.session.design().choice_rows().into_iter().find(|row| row.path == path) {
                ui.label(RichText::new(word).color(palette(ui).weak));
                form::choice_ui(ui, choice, 44.0, desk);
            }
        }
    });
}
