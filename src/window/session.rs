//! What the window works on: the document and its history, the file it belongs to, and the latest analysis of it.
//!
//! A changed document gets a new generation number; [`Session::refresh`] checks and analyses it when the number moved.
//! When the document cannot be used, the last good results stay and the problems say why they are stale.

use std::collections::BTreeMap;
use std::path::PathBuf;
use std::sync::atomic::{AtomicU64, Ordering};

use super::drawing::Drawing;
use super::exact::{Exact, Found, Wanted, beside};
use super::held::{Held, Tries};
use super::history::{Gesture, History};
use super::placing::Hand;
use crate::analysis::{self, Analysis, Level, Referee, Request, Shown, Steady};
use crate::compensator::Lane;
use crate::design::{CheckedDesign, Design};
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

/// The document, its file and its latest results.
#[derive(Debug)]
pub struct Session {
    document: Document,
    saved: Design,
    /// The file does not hold what was last read or saved: it changed, vanished, or the work was recovered.
    adrift: bool,
    /// Counts the changes of the document.
    revision: u64,
    path: Option<PathBuf>,
    history: History<Document>,
    shown: (Level, Level),
    what_if: Option<(f64, f64)>,
    frequencies_hz: Vec<f64>,
    generation: u64,
    subject: u64,
    analysed: Option<u64>,
    analysis: Option<Analysis>,
    drawing: Drawing,
    lanes: Vec<Lane>,
    problems: Vec<Finding>,
    /// What the latest results belong to.
    worked_out: Option<(CheckedDesign, Request)>,
    tries: Tries,
    reviewed: Option<usize>,
    /// The exact results beside the averaged ones.
    exact: Exact,
    pub(super) hand: Hand,
}

/// The next number for something to look at.
fn next_subject() -> u64 {
    static LAST: AtomicU64 = AtomicU64::new(0);
    LAST.fetch_add(1, Ordering::Relaxed) + 1
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
            adrift: false,
            revision: 0,
            path,
            history: History::default(),
            shown: (Level::Nominal, Level::Nominal),
            what_if: None,
            frequencies_hz: Vec::new(),
            generation: 0,
            subject: next_subject(),
            analysed: None,
            analysis: None,
            drawing: Drawing::default(),
            lanes: Vec::new(),
            problems: Vec::new(),
            worked_out: None,
            tries: Tries::default(),
            reviewed: None,
            exact: Exact::default(),
            hand: Hand::default(),
        }
    }

    /// A session on work that was recovered, its file, and the design in that file. It counts as unsaved.
    pub(super) fn recovered(document: Document, path: Option<PathBuf>, saved: Option<Design>) -> Self {
        let mut session = Session::new(document.design, path);
        session.document.bad_texts = document.bad_texts;
        session.saved = saved.unwrap_or_else(|| session.saved.clone());
        session.adrift = true;
        session
    }

    /// The document as it stands.
    pub fn document(&self) -> &Document {
        &self.document
    }

    /// Moves with every change of the document.
    pub(super) fn revision(&self) -> u64 {
        self.revision
    }

    /// The design as it was last read or saved.
    pub(super) fn saved(&self) -> &Design {
        &self.saved
    }

    /// Takes note that the file no longer holds what was read or saved, or holds it again.
    pub(super) fn set_adrift(&mut self, adrift: bool) {
        self.adrift = adrift;
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
        self.adrift || self.document.design != self.saved || !self.document.bad_texts.is_empty()
    }

    /// A session on a design that is in no file yet.
    pub fn created(design: Design) -> Self {
        Session { saved: Design::default(), ..Session::new(design, None) }
    }

    /// The one of the nine conditions that is shown in full, or was before a what-if.
    pub fn shown(&self) -> (Level, Level) {
        self.shown
    }

    /// True when this one of the nine conditions is shown.
    pub fn shows(&self, input: Level, load: Level) -> bool {
        self.what_if.is_none() && self.shown == (input, load)
    }

    /// Shows another condition.
    pub fn show(&mut self, input: Level, load: Level) {
        if !self.shows(input, load) {
            self.what_if = None;
            self.shown = (input, load);
            self.moved();
        }
    }

    /// Input voltage [V] and load current [A] of the what-if that is shown.
    pub fn what_if(&self) -> Option<(f64, f64)> {
        self.what_if
    }

    /// Shows a condition beside the nine: input voltage [V] and load current [A], both positive.
    pub fn show_what_if(&mut self, input_voltage: f64, load_current: f64) {
        if self.what_if != Some((input_voltage, load_current)) {
            self.what_if = Some((input_voltage, load_current));
            self.moved();
        }
    }

    /// What is looked at has changed: the document, the condition, or which try.
    fn moved(&mut self) {
        self.generation += 1;
        self.subject = next_subject();
    }

    /// A number for what is looked at: it moves with document, condition and try, and no two windows or documents share one.
    pub(super) fn subject(&self) -> u64 {
        self.subject
    }

    /// The design that the latest results belong to, a held one while that is reviewed.
    pub(super) fn examined(&self) -> Option<&CheckedDesign> {
        self.reviewed().map(|held| held.worked_out().0).or(self.worked_out.as_ref().map(|worked_out| &worked_out.0))
    }

    /// Asks for curves at these frequencies [Hz].
    pub fn ask_frequencies(&mut self, frequencies_hz: Vec<f64>) {
        if self.frequencies_hz != frequencies_hz {
            self.frequencies_hz = frequencies_hz;
            self.generation += 1;
        }
    }

    /// Asks for exact results beside the averaged ones.
    pub(super) fn ask_exact(&mut self, wanted: Wanted) {
        if self.exact.ask(wanted) {
            self.generation += 1;
        }
    }

    /// What the exact switched model says beside the latest results, where it was asked for.
    pub fn referee(&self) -> Option<&Result<Referee, Finding>> {
        self.exact.referee()
    }

    /// Decimal logarithms of the frequencies of its curves [Hz].
    pub(super) fn exact_log_hz(&self) -> &[f64] {
        self.exact.log_hz()
    }

    /// One steady period of the switched loop, where it was asked for.
    pub fn steady(&self) -> Option<&Result<Steady, Finding>> {
        self.exact.steady()
    }

    /// The latest results; stale when [`Session::stale`] says so.
    pub fn analysis(&self) -> Option<&Analysis> {
        self.reviewed().map(|held| &held.analysis).or(self.analysis.as_ref())
    }

    /// What is worked out once per analysis for drawing it.
    pub(super) fn drawing(&self) -> &Drawing {
        self.reviewed().map_or(&self.drawing, |held| &held.drawing)
    }

    /// The compensator's lanes; of the last usable compensator while the present one cannot be used.
    pub fn lanes(&self) -> &[Lane] {
        &self.lanes
    }

    /// A number that moves with every change of document, condition or frequencies.
    pub(super) fn generation(&self) -> u64 {
        self.generation
    }

    /// Why the present document cannot be used.
    pub fn problems(&self) -> &[Finding] {
        &self.problems
    }

    /// True when the results shown are those of an earlier document.
    pub fn stale(&self) -> bool {
        !self.problems.is_empty() && self.reviewed().is_none()
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

    /// Shows the condition `steps` further in the list of nine; from a what-if, the one that was left for it.
    pub fn step_condition(&mut self, steps: usize) {
        let steps = if self.what_if.is_some() { 0 } else { steps };
        let (input, load) = super::perform::condition_after(self.shown, steps);
        self.show(input, load);
    }

    /// Shows the condition this many levels of input and load higher, as far as there are any; from a what-if, the one that was
    /// left for it.
    pub fn step_levels(&mut self, input: isize, load: isize) {
        let (by_input, by_load) = if self.what_if.is_some() { (0, 0) } else { (input, load) };
        let moved = |level: Level, by: isize| {
            let at = Level::ALL.iter().position(|other| *other == level).unwrap_or(0);
            at.checked_add_signed(by).and_then(|at| Level::ALL.get(at)).copied().unwrap_or(level)
        };
        self.show(moved(self.shown.0, by_input), moved(self.shown.1, by_load));
    }

    /// The held try that is drawn beside the present design; none beside a held one.
    pub fn held(&self) -> Option<&Held> {
        self.tries.beside().filter(|_| self.reviewed.is_none())
    }

    /// All held tries, oldest first.
    pub fn tries(&self) -> &[Held] {
        self.tries.all()
    }

    /// The held try that stands in the place of the present design, as the review shows it.
    pub fn reviewed(&self) -> Option<&Held> {
        self.reviewed.and_then(|number| self.tries.get(number))
    }

    /// Puts a held try, by its number, or the present design in the place of what is shown.
    pub fn review(&mut self, number: Option<usize>) {
        self.reviewed = number;
        self.moved();
    }

    /// Reviews the next of present design and held tries, or the one before, round and round.
    pub fn step_try(&mut self, forward: bool) {
        let all: Vec<_> = std::iter::once(None).chain(self.tries().iter().map(|held| Some(held.number))).collect();
        let at = all.iter().position(|number| *number == self.reviewed).unwrap_or(0);
        let by = if forward { 1 } else { all.len() - 1 };
        if let Some(next) = all.get((at + by) % all.len()) {
            self.review(*next);
        }
    }

    /// Keeps the design of the present results with them, to compare with.
    pub fn hold(&mut self) {
        let name = self.history.undo_name().unwrap_or(&self.document.design.title).to_owned();
        if let (Some((design, request)), Some(analysis), None) = (&self.worked_out, &self.analysis, self.reviewed) {
            self.tries.hold(name, design.clone(), analysis.clone(), request.clone());
        }
    }

    /// Draws this held try beside the present design; asked again, none.
    pub fn compare_with(&mut self, number: usize) {
        self.tries.compare_with(number);
        self.tries.follow(self.reviewed, &self.request());
    }

    /// Drops one held try.
    pub fn drop_try(&mut self, number: usize) {
        self.reviewed = self.reviewed.filter(|reviewed| *reviewed != number);
        self.tries.drop_one(number);
        self.tries.follow(self.reviewed, &self.request());
    }

    /// Drops all that is held.
    pub fn drop_held(&mut self) {
        self.reviewed = None;
        self.tries.clear();
    }

    /// Changes the document as one named step.
    pub fn change(&mut self, name: &str, gesture: Option<Gesture>, change: impl FnOnce(&mut Document)) {
        let before = self.document.clone();
        change(&mut self.document);
        if self.document != before {
            self.history.record(name, before, gesture);
            self.moved();
            self.revision += 1;
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
            self.moved();
            self.revision += 1;
        }
    }

    /// Does the last step taken back again.
    pub fn redo(&mut self) {
        if let Some(document) = self.history.redo(&self.document) {
            self.document = document;
            self.moved();
            self.revision += 1;
        }
    }

    /// Takes note that the design is in this file.
    pub fn saved_as(&mut self, path: PathBuf, design: Design) {
        self.path = Some(path);
        self.saved = design;
        self.adrift = false;
    }

    /// Checks and analyses the document when it, the condition or the frequencies changed. True when results moved.
    pub fn refresh(&mut self) -> bool {
        if self.analysed == Some(self.generation) || self.frequencies_hz.is_empty() {
            return false;
        }
        self.analysed = Some(self.generation);
        self.problems = self.document.bad_texts.values().map(|bad| bad.finding.clone()).collect();
        let design = &self.document.design;
        if let Ok(compensator) = design.compensator() {
            self.lanes = compensator.lanes();
        }
        let request = self.request();
        match self.document.design.check() {
            Ok(checked) => {
                let wanted = self.exact.wanted_now(self.reviewed.is_none());
                let (analysis, exact) = beside(&checked, &request, wanted);
                self.exact.take(exact);
                self.drawing = Drawing::new(&analysis);
                self.hand.usual_goal = Some(analysis::usual_goal(&checked, &analysis));
                self.analysis = Some(analysis);
                self.worked_out = Some((checked, request.clone()));
            }
            Err(problems) => self.problems.extend(problems),
        }
        self.tries.follow(self.reviewed, &request);
        if let Some((design, request)) = self.reviewed().map(Held::worked_out) {
            let found = Found::work_out(design, request, self.exact.wanted_now(true));
            self.exact.take(found);
        }
        true
    }

    /// What an analysis is asked for at present.
    pub(super) fn request(&self) -> Request {
        let levels = Shown::Levels(self.shown.0, self.shown.1);
        let at = |(input_voltage, load_current)| Shown::At { input_voltage, load_current };
        Request {
            shown: self.what_if.map_or(levels, at),
            frequencies_hz: self.frequencies_hz.clone(),
            band_frequencies_hz: self.frequencies_hz.iter().copied().step_by(BAND_STEP).collect(),
            step_points: STEP_POINTS,
        }
    }
}

/// The band is drawn with a quarter of the curves' points: it is wide and soft.
const BAND_STEP: usize = 4;
/// Points of a step response: about as many as its plot has columns, the straight lines between them are not seen.
const STEP_POINTS: usize = 400;
