//! What placements aim at: crossover and phase margin typed beside the parts, and the buttons of the methods.
//!
//! *Conventions*: an empty field aims at what stands in it in grey, the middle of the crossover window and the required margin
//! with some to spare. What is typed is the hand's and is not saved.

use eframe::egui::{Align, Button, Layout, Response, RichText, TextEdit, Ui, vec2};

use super::app::App;
use super::command::Command;
use super::placing::Method;
use super::theme::{self, palette};
use super::view::Desk;
use crate::analysis::Goal;
use crate::finding::Finding;
use crate::quantity::{self, Unit};

/// The fields as typed, and what the last placement said.
#[derive(Clone, Debug, Default)]
pub(super) struct GoalFields {
    /// Wanted crossover.
    pub crossover: String,
    /// Wanted phase margin.
    pub margin: String,
    /// What the last placement said.
    pub said: Option<Said>,
}

/// What a placement said.
#[derive(Clone, Debug, PartialEq)]
pub(super) enum Said {
    /// It cannot be done, and why.
    Refused(Finding),
    /// It was done, but lanes are not where the method wants them.
    Short(String),
}

impl GoalFields {
    /// Reads the fields; an empty one means the usual aim.
    fn read(&self, usual: Goal) -> Result<Goal, Finding> {
        let read = |text: &str, usual: f64, unit: Unit, name: &str| {
            if text.trim().is_empty() {
                return Ok(usual);
            }
            quantity::parse(text, unit).map_err(|error| {
                Finding::problem("", format!("The {name} aimed at: {}.", error.reason)).with_hint(error.hint)
            })
        };
        Ok(Goal {
            crossover_hz: read(&self.crossover, usual.crossover_hz, Unit::Hertz, "crossover")?,
            phase_margin_deg: read(&self.margin, usual.phase_margin_deg, Unit::Degree, "phase margin")?,
        })
    }
}

impl App {
    /// Places all lanes by a method and keeps what it said.
    pub(super) fn place(&mut self, method: Method) {
        let usual = self.session.usual_goal();
        let nothing = || Finding::problem("", "There is no usable design to place poles and zeros for.");
        let goal = usual.ok_or_else(nothing).and_then(|usual| self.view.goal.read(usual));
        self.view.goal.said = match goal.and_then(|goal| self.session.place(method, goal)) {
            Ok(why) => why.map(Said::Short),
            Err(finding) => Some(Said::Refused(finding)),
        };
    }

    /// Returns a lane to the rules; the gain to the crossover aimed at.
    pub(super) fn return_lane(&mut self, key: &'static str) {
        let Some(usual) = self.session.usual_goal() else { return };
        self.view.gesture = self.view.gesture.next();
        match self.view.goal.read(usual) {
            Ok(goal) => self.session.return_lane(key, goal.crossover_hz, self.view.gesture),
            Err(finding) => self.view.goal.said = Some(Said::Refused(finding)),
        }
    }
}

/// Draws the line of the aim, the methods, and what the last of them said.
pub(super) fn goal_ui(ui: &mut Ui, desk: &mut Desk<'_>) {
    let usual = desk.session.usual_goal();
    let room = ui.available_width();
    ui.allocate_ui_with_layout(vec2(room, theme::ROW), Layout::left_to_right(Align::Center), |ui| {
        ui.spacing_mut().item_spacing.x = 4.0;
        let hint = |value: f64, unit| quantity::print_digits(value, unit, 3);
        let crossover = usual.map(|goal| hint(goal.crossover_hz, Unit::Hertz)).unwrap_or_default();
        let margin = usual.map(|goal| hint(goal.phase_margin_deg, Unit::Degree)).unwrap_or_default();
        label_ui(ui, "Aim");
        let fields = &mut desk.view.goal;
        let help = "Crossover that placements aim at, at the shown condition. Empty: the middle of the crossover window.";
        let one = field_ui(ui, (&mut fields.crossover, &crossover), ("Crossover aimed at", help), 74.0);
        label_ui(ui, "with");
        let help = "Phase margin that the K factor aims at, at the shown condition. Empty: 60°, or the required margin and 10°.";
        let other = field_ui(ui, (&mut fields.margin, &margin), ("Phase margin aimed at", help), 52.0);
        label_ui(ui, "margin");
        if one.changed() || other.changed() {
            fields.said = None;
        }
    });
    ui.horizontal(|ui| {
        ui.spacing_mut().item_spacing.x = 5.0;
        let methods = [
            (Method::KFactor, "K factor", "Place by K factor", K_FACTOR),
            (Method::Rules, "Pole-zero rules", "Place by pole-zero rules", RULES),
        ];
        for (method, word, name, help) in methods {
            let button = Button::new(RichText::new(word).color(palette(ui).accent));
            if ui.add(button).accessible_name(name).on_hover_text(help).clicked() {
                desk.ask(Command::Place(method));
            }
        }
    });
    said_ui(ui, desk);
}

const K_FACTOR: &str = "Places poles, zeros and gain so that the loop crosses at the aim with the margin aimed at. Type II: \
     fz = fc/K, fp = fc·K, K = tan(boost/2 + 45°); type III: double zero and pole, √k = tan(boost/4 + 45°) \
     (Venable 1983). Boost is margin − plant phase − 90°.";
const RULES: &str = "Common practice: zeros on the highest LC resonance of the nine conditions, one pole on the ESR zero, else \
     on the right-half-plane zero, the other at half the switching frequency, and the gain for a crossover at the aim.";

fn label_ui(ui: &mut Ui, text: &str) {
    ui.label(RichText::new(text).font(theme::small()).color(palette(ui).weak));
}

fn field_ui(ui: &mut Ui, texts: (&mut String, &str), words: (&str, &str), width: f32) -> Response {
    let (text, hint) = texts;
    let (name, help) = words;
    let hint = RichText::new(hint).color(palette(ui).weak);
    let edit = TextEdit::singleline(text).hint_text(hint).margin(vec2(4.0, 2.0)).desired_width(width);
    ui.add(edit).accessible_name(name).on_hover_text(help)
}

fn said_ui(ui: &mut Ui, desk: &Desk<'_>) {
    let (text, colour) = match &desk.view.goal.said {
        None => return,
        Some(Said::Short(why)) => (why.clone(), palette(ui).ink),
        Some(Said::Refused(finding)) => {
            let hint = finding.hint.as_ref().map(|hint| format!(" {}", super::findings::sentence(hint)));
            let message = super::findings::sentence(&finding.message);
            (format!("{message}{}", hint.unwrap_or_default()), palette(ui).problem)
        }
    };
    ui.label(RichText::new(text).font(theme::small()).color(colour));
}
