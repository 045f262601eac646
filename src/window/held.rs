//! Held tries: designs kept with their results to compare with, a few of them, the latest drawn beside the present one.

use super::drawing::Drawing;
use crate::analysis::{self, Analysis, Request};
use crate::design::CheckedDesign;

/// Most tries kept; holding one more drops the oldest.
pub const MOST_HELD: usize = 6;

/// A design and its results kept to compare with.
#[derive(Clone, Debug)]
pub struct Held {
    /// Which try it was, counted from 1 within a session.
    pub number: usize,
    /// What was held: the name of the last change, or the title.
    pub name: String,
    /// The results, at the condition that is shown.
    pub analysis: Analysis,
    /// The same made ready to be drawn.
    pub(super) drawing: Drawing,
    design: CheckedDesign,
    request: Request,
}

impl Held {
    /// Its number and name: "2: Move first zero".
    pub fn title(&self) -> String {
        format!("{}: {}", self.number, self.name)
    }

    /// The design and what was asked of it.
    pub(super) fn worked_out(&self) -> (&CheckedDesign, &Request) {
        (&self.design, &self.request)
    }

    /// Works the design out again when another condition or other frequencies are shown, so that like stands beside like.
    fn follow(&mut self, request: &Request) {
        if self.request != *request {
            self.analysis = analysis::analyse(&self.design, request);
            self.drawing = Drawing::new(&self.analysis);
            self.request = request.clone();
        }
    }
}

/// The tries kept, oldest first.
#[derive(Debug, Default)]
pub(super) struct Tries {
    list: Vec<Held>,
    made: usize,
    /// Number of the try that is drawn beside the present design.
    beside: Option<usize>,
}

impl Tries {
    /// Keeps a design with its results; it becomes the one drawn beside the present design.
    pub(super) fn hold(&mut self, name: String, design: CheckedDesign, analysis: Analysis, request: Request) {
        self.made += 1;
        if self.list.len() == MOST_HELD {
            self.list.remove(0);
        }
        let drawing = Drawing::new(&analysis);
        self.list.push(Held { number: self.made, name, analysis, drawing, design, request });
        self.beside = Some(self.made);
    }

    /// All of them, oldest first.
    pub(super) fn all(&self) -> &[Held] {
        &self.list
    }

    /// The try with this number.
    pub(super) fn get(&self, number: usize) -> Option<&Held> {
        self.list.iter().find(|held| held.number == number)
    }

    /// The try drawn beside the present design.
    pub(super) fn beside(&self) -> Option<&Held> {
        self.beside.and_then(|number| self.get(number))
    }

    /// Draws this try beside the present design; asked again, none.
    pub(super) fn compare_with(&mut self, number: usize) {
        self.beside = if self.beside == Some(number) { None } else { Some(number) };
    }

    /// Drops one try. Where it was drawn, the latest of the rest is.
    pub(super) fn drop_one(&mut self, number: usize) {
        self.list.retain(|held| held.number != number);
        if self.beside == Some(number) {
            self.beside = self.list.last().map(|held| held.number);
        }
    }

    /// Drops all tries.
    pub(super) fn clear(&mut self) {
        self.list.clear();
        self.beside = None;
    }

    /// Brings what is drawn to the condition and frequencies shown: the try beside the present design, or the one reviewed.
    pub(super) fn follow(&mut self, reviewed: Option<usize>, request: &Request) {
        let wanted = reviewed.or(self.beside);
        if let Some(held) = self.list.iter_mut().find(|held| Some(held.number) == wanted) {
            held.follow(request);
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::analysis::{Level, Shown};
    use crate::design::sample;

    #[test]
    fn the_latest_tries_are_kept_and_each_can_be_dropped() {
        let design = sample::built_in().check().expect("usable");
        let request = Request::spanning(Shown::Levels(Level::Nominal, Level::Nominal), 300e3, 20);
        let mut tries = Tries::default();
        for k in 0..MOST_HELD + 2 {
            let analysis = analysis::analyse(&design, &request);
            tries.hold(format!("try {k}"), design.clone(), analysis, request.clone());
        }
        let numbers = |tries: &Tries| tries.all().iter().map(|held| held.number).collect::<Vec<_>>();
        assert_eq!(numbers(&tries), [3, 4, 5, 6, 7, 8]);
        assert_eq!(tries.beside().map(|held| held.number), Some(8));
        tries.drop_one(8);
        assert_eq!(tries.beside().map(|held| held.number), Some(7));
        tries.compare_with(4);
        let elsewhere = Request { shown: Shown::Levels(Level::Least, Level::Greatest), ..request };
        tries.follow(None, &elsewhere);
        let levels = |number| tries.get(number).and_then(|held: &Held| held.analysis.condition.levels);
        assert_eq!(levels(4), Some((Level::Least, Level::Greatest)), "it follows the condition shown");
        assert_eq!(levels(5), Some((Level::Nominal, Level::Nominal)), "what is not drawn costs nothing");
        tries.compare_with(4);
        assert!(tries.beside().is_none());
        tries.clear();
        assert!(tries.all().is_empty());
    }
}
