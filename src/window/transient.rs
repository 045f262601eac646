//! The transient page: an event of one's choice, the switched loop cycle by cycle after it, the figures beside the prediction.
//!
//! *The run.* It starts by itself when the page, the event, the design or the condition changes, on a worker; its waveforms
//! grow in the plot. What was shown of an earlier design stands back until the first part of the new run is there.

use eframe::egui::{self, Rect, RichText, Ui, UiBuilder, vec2};

use super::app::App;
use super::command::Command;
use super::pages::Page;
use super::steps::{self, tab_ui};
use super::theme::{self, palette};
use super::time_plot::TimePlot;
use super::transient_figures;
use super::view::Desk;
use super::worker::{News, Worker};
use crate::analysis::{self, Condition, Transient, TransientEvent, TransientRequest};
use crate::figure;
use crate::finding::Finding;
use crate::switched::Waveforms;

/// Least height of the page before it scrolls [points].
pub(super) const LEAST: f32 = 460.0;
/// Width below which the names of the events are short [points].
const NARROW: f32 = 420.0;
/// Height of the row of events [points].
const HEAD: f32 = 26.0;
/// Time between frames while a run is under way and its progress is shown [s].
const PROGRESS_FRAMES: f32 = 0.1;
/// Columns of the waveforms at least: as many as a plot is wide.
const COLUMNS: usize = 800;

/// What the page shows, and the run behind it.
#[derive(Debug)]
pub(super) struct TransientPage {
    /// The event that was chosen.
    pub event: TransientEvent,
    worker: Worker<Waveforms, Result<Transient, Finding>>,
    /// What the latest run was asked for, and its number.
    asked: Option<(u64, TransientEvent)>,
    number: u64,
    /// Whether what is shown belongs to the latest run.
    fresh: bool,
    condition: Option<Condition>,
    growing: Option<Waveforms>,
    outcome: Option<Result<Transient, Finding>>,
    plot: TimePlot,
    /// Moves with what is shown.
    shown: u64,
}

impl Default for TransientPage {
    fn default() -> Self {
        TransientPage {
            event: TransientEvent::LoadStep,
            worker: Worker::default(),
            asked: None,
            number: 0,
            fresh: false,
            condition: None,
            growing: None,
            outcome: None,
            plot: TimePlot::default(),
            shown: 0,
        }
    }
}

impl TransientPage {
    /// The result that is shown, when it is that of the present design.
    pub(super) fn result(&self) -> Option<&Transient> {
        self.outcome.as_ref().filter(|_| self.fresh)?.as_ref().ok()
    }

    /// Whether a run is under way.
    pub(super) fn runs(&self) -> bool {
        self.worker.number().is_some()
    }

    /// Stops the run; what it has handed over stays.
    pub(super) fn stop(&mut self) {
        self.worker.cancel();
    }

    /// Lets the next turn start anew.
    pub(super) fn again(&mut self) {
        self.asked = None;
    }

    /// Takes over what the worker has handed over.
    fn collect(&mut self) {
        for news in self.worker.news(self.number) {
            self.shown += 1;
            self.fresh = true;
            match news {
                News::Part(waveforms) => {
                    self.outcome = None;
                    self.growing = Some(waveforms);
                }
                News::Done(outcome) => {
                    self.growing = None;
                    self.outcome = Some(outcome);
                }
                News::Lost => {
                    let message = "The run ended without a result; this is an error of the program.";
                    self.outcome = Some(Err(Finding::problem("", message)));
                }
            }
        }
    }
}

impl App {
    /// Starts a run where the page shows something else than the latest one was asked for, and takes over what it hands over.
    pub(super) fn follow_transient(&mut self, ctx: &egui::Context) {
        let page = &mut self.view.transient;
        if self.view.page != Page::Transient || self.view.review {
            page.worker.cancel();
            page.asked = page.asked.filter(|_| page.outcome.is_some());
            return;
        }
        let wanted = (self.session.subject(), page.event);
        if page.asked != Some(wanted) {
            // What an older run hands over from now on is thrown away.
            page.worker.cancel();
            page.fresh = false;
            page.number += 1;
            page.asked = Some(wanted);
            let Some(analysis) = self.session.analysis().filter(|_| !self.session.stale()) else { return };
            let Some(design) = self.session.examined() else { return };
            let (design, condition) = (design.clone(), analysis.condition.clone());
            page.condition = Some(condition.clone());
            let request = TransientRequest { event: page.event, columns: COLUMNS, span_s: None };
            let started = page.worker.start(page.number, "transient", ctx, move |hand| {
                let (cancel, progress) = (hand.cancel.clone(), hand.progress.clone());
                let mut stream = |waveforms: &Waveforms| hand.part(waveforms.clone());
                analysis::transient(&design, &condition, &request, &cancel, &progress, &mut stream)
            });
            if let Err(error) = started {
                page.fresh = true;
                page.outcome = Some(Err(Finding::problem("", format!("No thread could be started: {error}."))));
            }
        }
        page.collect();
    }
}

/// Draws the page into a rectangle.
pub(super) fn transient_ui(ui: &mut Ui, rect: Rect, desk: &mut Desk<'_>) {
    let (head, rest) = rect.split_top_bottom_at_y(rect.top() + HEAD);
    head_ui(ui, head, desk);
    let figures = desk.view.transient.result().map(transient_figures::lines);
    let height = figures.as_ref().map_or(0.0, transient_figures::height).min(rest.height() * 0.42);
    let (chart, below) = rest.split_top_bottom_at_y(rest.bottom() - height);
    chart_ui(ui, chart, desk);
    if let Some(lines) = &figures {
        transient_figures::figures_ui(ui, below, lines, desk.session.stale());
    }
}

fn head_ui(ui: &mut Ui, rect: Rect, desk: &mut Desk<'_>) {
    let inner = rect.with_min_x(rect.left() + theme::GUTTER + 2.0).with_max_x(rect.right() - theme::RIGHT_GUTTER - 4.0);
    let mut row =
        ui.new_child(UiBuilder::new().max_rect(inner).layout(egui::Layout::left_to_right(egui::Align::Center)));
    let narrow = inner.width() < NARROW;
    row.spacing_mut().item_spacing.x = if narrow { 7.0 } else { 12.0 };
    for event in TransientEvent::ALL {
        let chosen = desk.view.transient.event == event;
        let shown = if narrow { event.name().trim_end_matches(" step") } else { event.name() };
        if tab_ui(&mut row, (event.name(), shown), event.key(), chosen) && !chosen {
            desk.view.transient.event = event;
            ui.ctx().request_repaint();
        }
    }
}

/// How far the run is and its stop, or its start anew, at the right end of a row.
pub(super) fn run_ui(ui: &mut Ui, rect: Rect, desk: &mut Desk<'_>) {
    let mut right =
        ui.new_child(UiBuilder::new().max_rect(rect).layout(egui::Layout::right_to_left(egui::Align::Center)));
    let ui = &mut right;
    let accent = palette(ui).accent;
    let Some(share) = desk.view.transient.worker.share() else {
        if ui.button(RichText::new("Run again").color(accent)).clicked() {
            desk.ask(Command::RunTransient);
        }
        return;
    };
    if ui.button(RichText::new("Stop").color(accent)).clicked() {
        desk.ask(Command::StopTransient);
    }
    let width = ui.available_width().min(120.0);
    #[expect(clippy::cast_possible_truncation, reason = "a share between 0 and 1")]
    let bar = egui::ProgressBar::new(share as f32).desired_width(width).desired_height(8.0);
    ui.add(bar);
    ui.ctx().request_repaint_after(std::time::Duration::from_secs_f32(PROGRESS_FRAMES));
}

fn chart_ui(ui: &mut Ui, rect: Rect, desk: &mut Desk<'_>) {
    let title = &desk.session.design().title;
    let page = &mut desk.view.transient;
    let stands_back = !page.fresh || desk.session.stale();
    let condition = page.condition.as_ref().map_or("", |condition| condition.label.as_str());
    let (waveforms, prediction) = match (&page.growing, &page.outcome) {
        (Some(growing), _) => (growing, None),
        (None, Some(Ok(done))) => (&done.waveforms, done.prediction.as_ref()),
        (None, Some(Err(finding))) => {
            steps::empty(ui, steps::frame_of(rect), &finding.message, palette(ui));
            return;
        }
        (None, None) => {
            steps::empty(ui, steps::frame_of(rect), "The run has just begun.", palette(ui));
            return;
        }
    };
    ui.scope_builder(UiBuilder::new().max_rect(rect), |ui| {
        ui.multiply_opacity(if stands_back { theme::STALE } else { 1.0 });
        let said = format!("{} at {condition}.", page.event.name());
        let make = || figure::transient(title, &said, waveforms, prediction);
        page.plot.ui(ui, rect.shrink2(vec2(4.0, 0.0)), page.shown, ("Transient plot", &said), make);
    });
}
