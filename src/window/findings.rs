//! Findings: remarks about the design, each with its gravity, its place and, where one is clear, a remedy to press.

use eframe::egui::{self, Rect, RichText, Sense, Shape, Stroke, Ui, pos2, vec2};

use super::command::Command;
use super::theme::{self, palette};
use super::view::Desk;
use crate::design;
use crate::finding::{Finding, Severity};

/// Draws the findings of the latest analysis, after the problems of an unusable design.
pub(super) fn findings_ui(ui: &mut Ui, desk: &mut Desk<'_>) {
    let session = desk.session;
    let remarks = session.analysis().map_or(&[][..], |analysis| &analysis.findings);
    let exact = session.referee().and_then(|referee| referee.as_ref().ok()).map_or(&[][..], |exact| &exact.findings);
    let (remarks, exact) = if session.stale() { (&[][..], &[][..]) } else { (remarks, exact) };
    let mut all: Vec<&Finding> = session.problems().iter().chain(remarks).chain(exact).collect();
    all.sort_by_key(|finding| std::cmp::Reverse(finding.severity));
    ui.label(RichText::new("Findings").font(theme::strong(13.5)));
    let mut none = true;
    for finding in all {
        none = false;
        finding_ui(ui, finding, desk);
    }
    if none {
        ui.label(RichText::new("None.").color(palette(ui).weak));
    }
}

fn finding_ui(ui: &mut Ui, finding: &Finding, desk: &mut Desk<'_>) {
    let palette = palette(ui);
    ui.horizontal_top(|ui| {
        ui.spacing_mut().item_spacing.x = 6.0;
        let (rect, mark) = ui.allocate_exact_size(vec2(12.0, 15.0), Sense::hover());
        severity_mark(ui, rect, finding.severity);
        mark.on_hover_text(finding.severity.word());
        ui.vertical(|ui| {
            ui.spacing_mut().item_spacing.y = 1.0;
            let ink = if finding.is_problem() { palette.problem } else { palette.ink };
            let text = RichText::new(&finding.message).font(theme::small()).color(ink);
            ui.label(text).on_hover_text(finding.severity.word());
            if let Some(hint) = &finding.hint {
                ui.label(RichText::new(sentence(hint)).font(theme::small()).color(palette.weak));
            }
            if !desk.view.review {
                ui.horizontal_wrapped(|ui| actions_ui(ui, finding, desk));
            }
        });
    });
}

fn actions_ui(ui: &mut Ui, finding: &Finding, desk: &mut Desk<'_>) {
    let accent = palette(ui).accent;
    if let Some(remedy) = &finding.remedy {
        let text = RichText::new(&remedy.label).font(theme::small()).color(accent);
        if ui.add(egui::Button::new(text).small()).clicked() {
            desk.ask(Command::Mend((**remedy).clone()));
        }
    }
    if let Some(entry) = design::entry(&finding.place) {
        let text = RichText::new(format!("Go to {}", lower_first(entry.name))).font(theme::small()).color(accent);
        let response = ui.add(egui::Button::new(text).small().frame(false));
        super::legend::focus_ring(ui, &response);
        if response.clicked() {
            desk.view.go_to(entry.path);
        }
    }
}

/// A hint as a sentence of its own.
pub(super) fn sentence(hint: &str) -> String {
    let mut letters = hint.chars();
    let first = letters.next().map(|first| first.to_uppercase().to_string()).unwrap_or_default();
    let end = if hint.ends_with(['.', '?', '!']) { "" } else { "." };
    format!("{first}{}{end}", letters.as_str())
}

/// A name as it stands within a sentence: its first letter small, unless the word is an abbreviation.
pub(super) fn lower_first(name: &str) -> String {
    let mut letters = name.chars();
    match (letters.next(), letters.next()) {
        (Some(first), Some(second)) if second.is_lowercase() || second == ' ' => {
            first.to_lowercase().chain(std::iter::once(second)).chain(letters).collect()
        }
        _ => name.to_owned(),
    }
}

/// A filled square for a problem, a ring for a notice, a dot for a note: told apart without colour.
fn severity_mark(ui: &Ui, rect: Rect, severity: Severity) {
    let palette = palette(ui);
    let centre = pos2(rect.center().x, rect.top() + 7.5);
    let painter = ui.painter();
    match severity {
        Severity::Problem => {
            painter.rect_filled(Rect::from_center_size(centre, vec2(9.0, 9.0)), 1.5, palette.problem);
        }
        Severity::Notice => {
            let corners = vec![centre + vec2(0.0, -5.0), centre + vec2(5.0, 4.0), centre + vec2(-5.0, 4.0)];
            painter.add(Shape::closed_line(corners, Stroke::new(1.5, palette.ink)));
        }
        Severity::Note => {
            painter.circle_filled(centre, 2.0, palette.weak);
        }
    }
}
