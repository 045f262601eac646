//! What the window works on: the document and its history, the file it belongs to, and the latest analysis of it.
//!
//! A changed document gets a new generation number; [`Session::refresh`] checks and analyses it when the number moved.
//! When the document cannot be used, the last good results stay and the problems say why they are stale.

use std::collections::BTreeMap;
use std::path::PathBuf;

use super::drawing::Drawing;
use super::history::{Gesture, History};
use super::placing::Hand;
use crate::analysis::{self, Analysis, Level, Request, Shown};
use crate::compensator::{Compensator, Lane};
use crate::design::Design;
use crate::finding::Finding;

/// Text that could not be read as a number; it stays with its field until it is mended or undone.
#[derive(Clone, Debug, PartialEq)]
pub struct BadText {
    /// What was typed.
    pub text: String,
    /// Why it cannot be read, and what would help.
    pub finding: Finding,
}

/// What undo goes back to: a design, and the texts that stand in fields without being numbers.
#[derive(Clone, Debug, PartialEq)]
pub struct Document {
    /// The design.
    pub design: Design,
    /// Unreadable texts by entry path.
    pub bad_texts: BTreeMap<String, BadText>,
}

/// Curves kept to compare with.
#[derive(Clone, Debug)]
pub struct Held {
    /// What was held: the name of the last change, or the title.
    pub name: String,
    /// The results.
    pub analysis: Analysis,
}

/// The document, its file and its latest results.
#[derive(Debug)]
pub struct Session {
    document: Document,
    saved: Design,
    path: Option<PathBuf>,
    history: History<Document>,
    shown: (Level, Level),
    frequencies_hz: Vec<f64>,
    generation: u64,
    analysed: Option<u64>,
    analysis: Option<Analysis>,
    drawing: Drawing,
    lanes: Vec<Lane>,
    problems: Vec<Finding>,
    held: Option<Held>,
    pub(super) hand: Hand,
}

/// Decades shown below the switching frequency: from the integrator to where switching hides the rest.
const DECADES: f64 = 1e4;
/// The whole range before any switching frequency is known [Hz].
const USUAL_RANGE_HZ: (f64, f64) = (30.0, 300e3);

impl Session {
    /// A session on a design, and the file it came from.
    pub fn new(design: Design, path: Option<PathBuf>) -> Self {
        Session {
            saved: design.clone(),
            document: Document { design, bad_texts: BTreeMap::new() },
            path,
            history: History::default(),
            shown: (Level::Nominal, Level::Nominal),
            frequencies_hz: Vec::new(),
            generation: 0,
            analysed: None,
            analysis: None,
            drawing: Drawing::default(),
            lanes: Vec::new(),
            problems: Vec::new(),
            held: None,
            hand: Hand::default(),
        }
    }

    /// The design as it stands.
    pub fn design(&self) -> &Design {
        &self.document.design
    }

    /// Text in a field that could not be read.
    pub fn bad_text(&self, path: &str) -> Option<&BadText> {
        self.document.bad_texts.get(path)
    }

    /// The unreadable texts of all fields.
    pub fn bad_texts(&self) -> impl Iterator<Item = &BadText> {
        self.document.bad_texts.values()
    }

    /// The file the design belongs to.
    pub fn path(&self) -> Option<&PathBuf> {
        self.path.as_ref()
    }

    /// True when the design differs from its file, or a field holds text that is in no file.
    pub fn unsaved(&self) -> bool {
        self.document.design != self.saved || !self.document.bad_texts.is_empty()
    }

    /// The condition shown in full.
    pub fn shown(&self) -> (Level, Level) {
        self.shown
    }

    /// Shows another condition.
    pub fn show(&mut self, input: Level, load: Level) {
        if self.shown != (input, load) {
            self.shown = (input, load);
            self.generation += 1;
        }
    }

    /// Asks for curves at these frequencies [Hz].
    pub fn ask_frequencies(&mut self, frequencies_hz: Vec<f64>) {
        if self.frequencies_hz != frequencies_hz {
            self.frequencies_hz = frequencies_hz;
            self.generation += 1;
        }
    }

    /// The latest results; stale when [`Session::stale`] says so.
    pub fn analysis(&self) -> Option<&Analysis> {
        self.analysis.as_ref()
    }

    /// What is worked out once per analysis for drawing it.
    pub(super) fn drawing(&self) -> &Drawing {
        &self.drawing
    }

    /// The compensator's lanes; of the last usable compensator while the present one cannot be used.
    pub fn lanes(&self) -> &[Lane] {
        &self.lanes
    }

    /// Why the present document cannot be used.
    pub fn problems(&self) -> &[Finding] {
        &self.problems
    }

    /// True when the results shown are those of an earlier document.
    pub fn stale(&self) -> bool {
        !self.problems.is_empty()
    }

    /// The problem or remark at an entry, the gravest first.
    pub fn finding_at(&self, path: &str) -> Option<&Finding> {
        self.problems.iter().find(|finding| finding.place == path)
    }

    /// Undo and redo.
    pub fn history(&self) -> &History<Document> {
        &self.history
    }

    /// Frequencies of the whole range [Hz]: four decades up to the switching frequency.
    pub fn whole_range_hz(&self) -> (f64, f64) {
        let switching = self.document.design.values.get("stage.switching-frequency");
        switching.filter(|hz| (1.0..1e10).contains(hz)).map_or(USUAL_RANGE_HZ, |hz| (hz / DECADES, hz))
    }

    /// Shows the condition `steps` further in the list of nine.
    pub fn step_condition(&mut self, steps: usize) {
        let (input, load) = super::perform::condition_after(self.shown, steps);
        self.show(input, load);
    }

    /// What is held to compare with.
    pub fn held(&self) -> Option<&Held> {
        self.held.as_ref()
    }

    /// Keeps the present results to compare with.
    pub fn hold(&mut self) {
        let name = self.history.undo_name().unwrap_or(&self.document.design.title).to_owned();
        self.held = self.analysis.clone().map(|analysis| Held { name, analysis });
    }

    /// Drops what is held.
    pub fn drop_held(&mut self) {
        self.held = None;
    }

    /// Changes the document as one named step.
    pub fn change(&mut self, name: &str, gesture: Option<Gesture>, change: impl FnOnce(&mut Document)) {
        let before = self.document.clone();
        change(&mut self.document);
        if self.document != before {
            self.history.record(name, before, gesture);
            self.generation += 1;
        }
    }

    /// The design a gesture began with: of before its first change.
    pub fn design_before(&self, gesture: Gesture) -> &Design {
        self.history.before_gesture(gesture).map_or(&self.document.design, |document| &document.design)
    }

    /// Takes the last step back.
    pub fn undo(&mut self) {
        if let Some(document) = self.history.undo(&self.document) {
            self.document = document;
            self.generation += 1;
        }
    }

    /// Does the last step taken back again.
    pub fn redo(&mut self) {
        if let Some(document) = self.history.redo(&self.document) {
            self.document = document;
            self.generation += 1;
        }
    }

    /// Takes note that the design is in this file.
    pub fn saved_as(&mut self, path: PathBuf, design: Design) {
        self.path = Some(path);
        self.saved = design;
    }

    /// Checks and analyses the document when it, the condition or the frequencies changed. True when results moved.
    pub fn refresh(&mut self) -> bool {
        if self.analysed == Some(self.generation) || self.frequencies_hz.is_empty() {
            return false;
        }
        self.analysed = Some(self.generation);
        self.problems = self.document.bad_texts.values().map(|bad| bad.finding.clone()).collect();
        let design = &self.document.design;
        if let Ok(compensator) = Compensator::from_values(&design.values, &design.choices) {
            self.lanes = compensator.lanes();
        }
        match design.check() {
            Ok(checked) => {
                let request = Request {
                    shown: Shown::Levels(self.shown.0, self.shown.1),
                    frequencies_hz: self.frequencies_hz.clone(),
                    band_frequencies_hz: self.frequencies_hz.iter().copied().step_by(BAND_STEP).collect(),
                    step_points: STEP_POINTS,
                };
                let analysis = analysis::analyse(&checked, &request);
                self.drawing = Drawing::new(&analysis);
                self.hand.usual_goal = Some(analysis::usual_goal(&checked, &analysis));
                self.analysis = Some(analysis);
            }
            Err(problems) => self.problems.extend(problems),
        }
        true
    }
}

/// The band is drawn with a quarter of the curves' points: it is wide and soft.
const BAND_STEP: usize = 4;
/// Points of a step response: about as many as its plot has columns, the straight lines between them are not seen.
const STEP_POINTS: usize = 400;
