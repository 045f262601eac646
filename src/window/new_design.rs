//! The form of a new design: what is asked at the left, what is assumed from it at the right, each with its reason.
//!
//! *Bad input*: text that is no number stays in its field with the reason under it, as a number that makes no sense does; the
//! list of assumptions is then empty and nothing can be created.

use std::collections::BTreeMap;

use eframe::egui::{
    self, Align, ComboBox, Frame, Key, Layout, Margin, RichText, ScrollArea, Stroke, TextEdit, Ui, vec2,
};

use super::command::Command;
use super::form::{LIST_SHARE, option_ui};
use super::theme::{self, palette};
use super::view::Desk;
use super::{bar, findings, form};
use crate::analysis::proposal::{Assumption, Brief, Parts, Proposal, propose};
use crate::design::{self, Design};
use crate::finding::Finding;
use crate::quantity::{self, Entry, Unit, Values};

/// Path of the choice of topology.
const TOPOLOGY: &str = "stage.topology";
/// Width of the dialog at most [points].
const WIDTH: f32 = 980.0;
/// Width from which assumptions stand beside the form [points].
const SIDE_BY_SIDE: f32 = 680.0;
/// Width of the form beside the assumptions [points].
const FORM: f32 = 318.0;
/// Width of a field [points].
const FIELD: f32 = 92.0;

/// What is typed into the form of a new design.
#[derive(Clone, Debug)]
pub(super) struct NewDesign {
    topology: String,
    parts: Parts,
    texts: BTreeMap<&'static str, String>,
    problems: Vec<Finding>,
    proposal: Option<Box<Proposal>>,
    changed: bool,
}

impl Default for NewDesign {
    fn default() -> Self {
        let topology = design::choice(TOPOLOGY).map_or_else(String::new, |choice| choice.default.to_owned());
        let mut form = NewDesign {
            topology,
            parts: Parts::default(),
            texts: BTreeMap::new(),
            problems: Vec::new(),
            proposal: None,
            changed: true,
        };
        form.offer();
        form
    }
}

impl NewDesign {
    /// The design that is proposed.
    pub(super) fn design(&self) -> Option<Design> {
        self.proposal.as_ref().map(|proposal| proposal.design.clone())
    }

    /// Fills rows that are empty with usual numbers.
    fn offer(&mut self) {
        let usual = Brief::usual(&self.topology, self.parts);
        for row in Brief::rows(self.parts) {
            let value = usual.values.get(row.path).unwrap_or(row.default);
            self.texts.entry(row.path).or_insert_with(|| quantity::print(value, row.unit));
        }
    }

    /// Takes another topology; numbers nobody touched become those that are usual for it.
    fn choose(&mut self, key: &str) {
        let before = Brief::usual(&self.topology, self.parts);
        self.texts.retain(|path, text| {
            let unit = Brief::rows(self.parts).into_iter().find(|row| row.path == *path).map(|row| row.unit);
            let usual = unit.zip(before.values.get(path)).map(|(unit, value)| quantity::print(value, unit));
            usual.as_ref() != Some(text)
        });
        key.clone_into(&mut self.topology);
        self.offer();
        self.changed = true;
    }

    /// Works out what the texts propose.
    fn refresh(&mut self) {
        if !std::mem::take(&mut self.changed) {
            return;
        }
        (self.proposal, self.problems) = (None, Vec::new());
        let mut brief = Brief { topology: self.topology.clone(), parts: self.parts, values: Values::new() };
        for row in Brief::rows(self.parts) {
            let text = self.texts.get(row.path).map_or("", String::as_str);
            if text.trim().is_empty() {
                continue;
            }
            match row.read(text) {
                // What is read is finite.
                Ok(value) => drop(brief.values.set(row.path, value)),
                Err(error) => {
                    let told = format!("{}: {}.", row.name, error.reason);
                    self.problems.push(Finding::problem(row.path, told).with_hint(error.hint));
                }
            }
        }
        if self.problems.is_empty() {
            match propose(&brief) {
                Ok(proposal) => self.proposal = Some(Box::new(proposal)),
                Err(problems) => self.problems = problems,
            }
        }
    }
}

/// Draws the dialog.
pub(super) fn new_design_ui(ui: &mut Ui, desk: &mut Desk<'_>) {
    let screen = ui.ctx().content_rect();
    let room = vec2((screen.width() - 70.0).min(WIDTH), (screen.height() - 76.0).min(680.0));
    ui.set_width(room.x);
    let mut form = std::mem::take(&mut desk.view.new_design);
    ui.horizontal(|ui| {
        ui.label(RichText::new("New design").font(theme::strong(16.0)));
        if room.x > SIDE_BY_SIDE {
            let text =
                "Say what the converter has to do. All else is assumed, told here, and can be changed afterwards.";
            ui.label(RichText::new(text).color(palette(ui).weak));
        }
    });
    ui.add_space(6.0);
    let height = room.y - 84.0;
    if room.x > SIDE_BY_SIDE {
        ui.horizontal_top(|ui| {
            ui.allocate_ui_with_layout(vec2(FORM, height), Layout::top_down(Align::Min), |ui| {
                ui.set_width(FORM);
                ScrollArea::vertical().id_salt("brief").max_height(height).show(ui, |ui| form_ui(ui, &mut form));
            });
            ui.add_space(10.0);
            ui.vertical(|ui| {
                ui.set_width(room.x - FORM - 34.0);
                ui.set_min_height(height);
                proposal_ui(ui, &form, height);
            });
        });
    } else {
        ScrollArea::vertical().id_salt("brief").max_height(height).show(ui, |ui| {
            ui.set_max_width(room.x - 10.0);
            form_ui(ui, &mut form);
            ui.add_space(8.0);
            proposal_ui(ui, &form, f32::INFINITY);
        });
    }
    ui.add_space(8.0);
    buttons_ui(ui, room.x > SIDE_BY_SIDE, &mut form, desk);
    form.refresh();
    desk.view.new_design = form;
}

fn buttons_ui(ui: &mut Ui, wide: bool, form: &mut NewDesign, desk: &mut Desk<'_>) {
    ui.horizontal(|ui| {
        let primary = super::dialogs::primary(ui, "Create");
        if ui.add_enabled(form.proposal.is_some() && !form.changed, primary).clicked() {
            desk.ask(Command::CreateDesign);
        }
        if ui.button("Cancel").clicked() {
            desk.ask(Command::Dismiss);
        }
        ui.add_space(14.0);
        ui.menu_button(RichText::new("Begin with a sample").color(palette(ui).accent), |ui| {
            ScrollArea::vertical().max_height(360.0).show(ui, |ui| {
                ui.with_layout(Layout::top_down(Align::Min), |ui| {
                    if bar::samples_ui(ui, desk) {
                        ui.close();
                    }
                });
            });
        });
        // Where the assumptions stand below the form, a word says that they are there.
        if let (false, Some(proposal)) = (wide, &form.proposal) {
            let (met, colour) = match proposal.shortfalls.len() {
                0 => ("all met".to_owned(), palette(ui).good),
                count => (format!("{count} missed"), palette(ui).amber),
            };
            let text = format!("{met}, {} assumptions below", proposal.assumptions.len());
            ui.add(egui::Label::new(RichText::new(text).color(colour)).truncate());
        }
    });
}

fn form_ui(ui: &mut Ui, form: &mut NewDesign) {
    ui.spacing_mut().item_spacing.y = 4.0;
    topology_ui(ui, form);
    ui.horizontal_wrapped(|ui| {
        let options = [
            (
                Parts::Proposed,
                "Propose L and C",
                "Inductor and output bank are sized by ripple, load step and resonance.",
            ),
            (Parts::Known, "I know L and C", "Inductor and output capacitance are entered."),
        ];
        for (parts, name, help) in options {
            if ui.selectable_label(form.parts == parts, name).on_hover_text(help).clicked() && form.parts != parts {
                form.parts = parts;
                form.offer();
                form.changed = true;
            }
        }
    });
    ui.add_space(2.0);
    for row in Brief::rows(form.parts) {
        row_ui(ui, row, form);
    }
}

fn topology_ui(ui: &mut Ui, form: &mut NewDesign) {
    let Some(choice) = design::choice(TOPOLOGY) else { return };
    let chosen = choice.option(&form.topology).map_or("", |option| option.name);
    let mut wanted = None;
    ui.horizontal(|ui| {
        ui.label(RichText::new(choice.name).color(palette(ui).weak)).on_hover_text(choice.help);
        ui.with_layout(Layout::right_to_left(Align::Center), |ui| {
            let text = RichText::new(chosen).color(palette(ui).accent);
            let response = ComboBox::from_id_salt("new topology")
                .selected_text(text)
                .width(190.0)
                .height(ui.ctx().content_rect().height() * LIST_SHARE)
                .show_ui(ui, |ui| {
                    for option in choice.options {
                        let chosen = option.key == form.topology;
                        if option_ui(ui, option, chosen) && !chosen {
                            wanted = Some(option.key);
                        }
                    }
                });
            response.response.widget_info(|| {
                let mut info = egui::WidgetInfo::labeled(egui::Role::ComboBox, true, "Topology of the new design");
                info.current_text_value = Some(chosen.to_owned());
                info
            });
        });
    });
    if let Some(key) = wanted {
        form.choose(key);
    }
}

fn row_ui(ui: &mut Ui, row: &'static Entry, new: &mut NewDesign) {
    let palette = palette(ui);
    let problem = new.problems.iter().find(|problem| problem.place == row.path).cloned();
    ui.horizontal(|ui| {
        let width = (ui.available_width() - FIELD - 24.0).max(40.0);
        form::label_ui(ui, row.name, row.help, width);
        ui.with_layout(Layout::right_to_left(Align::Center), |ui| {
            if problem.is_some() {
                let stroke = Stroke::new(1.5, palette.problem);
                ui.visuals_mut().widgets.inactive.bg_stroke = stroke;
                ui.visuals_mut().widgets.hovered.bg_stroke = stroke;
            }
            let text = new.texts.entry(row.path).or_default();
            let edit = TextEdit::singleline(text).margin(Margin::symmetric(4, 2)).desired_width(FIELD);
            let response = ui.add(edit).accessible_name(format!("{}, of the new design", row.name));
            let entered = response.has_focus() && ui.input(|input| input.key_pressed(Key::Enter));
            new.changed |= response.lost_focus() || entered;
            response.on_hover_text(row.help);
        });
    });
    if let Some(problem) = problem {
        let hint = problem.hint.as_deref().map(findings::sentence).unwrap_or_default();
        let text = format!("{} {hint}", problem.message);
        ui.label(RichText::new(text).font(theme::small()).color(palette.problem));
    }
}

/// What is met, and every assumption.
fn proposal_ui(ui: &mut Ui, form: &NewDesign, height: f32) {
    let palette = palette(ui);
    let Some(proposal) = &form.proposal else {
        let rows = Brief::rows(form.parts);
        let elsewhere = form.problems.iter().filter(|problem| !rows.iter().any(|row| row.path == problem.place));
        let text = if form.problems.is_empty() { "" } else { "Nothing can be proposed yet." };
        ui.label(RichText::new(text).color(palette.weak));
        for problem in elsewhere {
            ui.label(RichText::new(&problem.message).color(palette.problem));
        }
        return;
    };
    outcome_ui(ui, proposal);
    ui.add_space(4.0);
    let heading = format!("{} assumptions", proposal.assumptions.len());
    ui.horizontal(|ui| {
        ui.label(RichText::new(heading).font(theme::strong(13.5)));
        let text = "they become the notes of the design";
        ui.label(RichText::new(text).font(theme::small()).color(palette.weak));
    });
    if height.is_finite() {
        let below = (ui.max_rect().top() + height - ui.cursor().top()).max(80.0);
        ScrollArea::vertical().id_salt("assumptions").max_height(below).auto_shrink([false, true]).show(ui, |ui| {
            ui.set_max_width(ui.available_width() - 8.0);
            assumptions_ui(ui, &proposal.assumptions);
        });
    } else {
        assumptions_ui(ui, &proposal.assumptions);
    }
}

fn outcome_ui(ui: &mut Ui, proposal: &Proposal) {
    let palette = palette(ui);
    if proposal.shortfalls.is_empty() {
        let text =
            format!("Stable and within all {} requirements at the nine conditions.", proposal.requirements.len());
        ui.label(RichText::new(text).font(theme::strong(13.5)).color(palette.good));
    }
    for told in &proposal.shortfalls {
        ui.label(RichText::new(told).color(palette.amber));
    }
    let values: Vec<String> = proposal
        .requirements
        .iter()
        .filter_map(|verdict| {
            let value = match verdict.unit {
                Unit::Degree | Unit::Decibel => (verdict.value? * 10.0).round() / 10.0,
                _ => verdict.value?,
            };
            let name = verdict.name.split(',').next().unwrap_or(verdict.name);
            Some(format!("{} {}", findings::lower_first(name), quantity::print_digits(value, verdict.unit, 3)))
        })
        .collect();
    let text = format!("At the worst condition: {}.", values.join(", "));
    ui.label(RichText::new(text).font(theme::small()).color(palette.weak));
}

/// Groups of assumptions by the first word of their path; what has none belongs to the compensator.
const GROUPS: [(&str, &str); 4] =
    [("stage", "Power stage"), ("control", "Control"), ("compensator", "Compensator"), ("requirement", "Requirements")];

fn assumptions_ui(ui: &mut Ui, assumptions: &[Assumption]) {
    let palette = palette(ui);
    ui.spacing_mut().item_spacing.y = 2.0;
    for (group, heading) in GROUPS {
        ui.add_space(4.0);
        ui.label(RichText::new(heading).font(theme::strong(12.5)).color(palette.weak));
        let of_group = |assumption: &&Assumption| match assumption.path.split('.').next() {
            Some("") | None => group == "compensator",
            Some(first) => first == group,
        };
        for assumption in assumptions.iter().filter(of_group) {
            assumption_ui(ui, assumption);
        }
    }
}

fn assumption_ui(ui: &mut Ui, assumption: &Assumption) {
    let palette = palette(ui);
    Frame::new().fill(palette.bar).inner_margin(Margin::symmetric(7, 3)).corner_radius(3).show(ui, |ui| {
        ui.set_width(ui.available_width());
        ui.horizontal(|ui| {
            ui.label(RichText::new(&assumption.name).font(theme::body()));
            ui.label(RichText::new(&assumption.value).font(theme::strong(13.0)));
            if assumption.common_practice {
                ui.with_layout(Layout::right_to_left(Align::Center), |ui| {
                    ui.label(RichText::new("common practice").font(theme::small()).color(palette.weak));
                });
            }
        });
        ui.label(RichText::new(&assumption.reason).font(theme::small()).color(palette.weak));
    });
}
