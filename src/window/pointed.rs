//! What the pointer or the keyboard is at, and what else belongs to it: a part lights its lane, landmark and ledger row, and
//! each of them lights its parts.
//!
//! What is drawn before the thing pointed at has to know as well, so a frame lights what the frame before it found.

use super::view::{Desk, View};
use crate::analysis::LedgerRow;
use crate::compensator::Lane;
use crate::converter::Landmark;
use crate::figure::Place;

/// Which schematic.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub(super) enum Sheet {
    /// Of the power stage.
    Stage,
    /// Of the compensator.
    Compensator,
}

/// A thing that can be pointed at.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Pointed {
    /// A part of a schematic, by its number.
    Part(Sheet, usize),
    /// The field of an entry, by its path.
    Entry(&'static str),
    /// A lane, by its key.
    Lane(&'static str),
    /// A landmark, by its key.
    Landmark(&'static str),
}

/// What a frame has found so far.
#[derive(Clone, Copy, Debug, Default)]
pub(super) struct Pointing {
    hovered: Option<Pointed>,
    focused: Option<Pointed>,
}

impl Pointing {
    fn result(self) -> Option<Pointed> {
        self.hovered.or(self.focused)
    }
}

impl View {
    /// Takes over what the last frame found.
    pub(super) fn begin_pointing(&mut self) {
        self.pointed = std::mem::take(&mut self.pointing).result();
    }

    /// Notes what a response says about a thing.
    pub(super) fn point(&mut self, at: Pointed, response: &eframe::egui::Response) {
        if response.hovered() {
            self.pointing.hovered = Some(at);
        } else if response.has_focus() {
            self.pointing.focused = Some(at);
        }
    }

    /// Whether something else is pointed at than what this frame lit.
    pub(super) fn pointed_elsewhere(&self) -> bool {
        self.pointing.result() != self.pointed
    }
}

impl Desk<'_> {
    /// Whether something that is pointed at has a part among these entries.
    fn lit_parts<T: AsRef<str>>(&self, parts: &[T]) -> bool {
        let has = |path: &str| parts.iter().any(|part| part.as_ref() == path);
        match self.view.pointed {
            Some(Pointed::Part(sheet, index)) => {
                let place = self.view.schematics.places(sheet).get(index);
                place.is_some_and(|place| place.paths.iter().any(|path| has(path)))
            }
            Some(Pointed::Entry(path)) => has(path),
            Some(Pointed::Lane(_) | Pointed::Landmark(_)) | None => false,
        }
    }

    /// Whether a lane belongs to what is pointed at.
    pub(super) fn lit_lane(&self, lane: &Lane) -> bool {
        self.view.pointed == Some(Pointed::Lane(lane.key)) || self.lit_parts(&lane.parts)
    }

    /// Whether a landmark belongs to what is pointed at.
    pub(super) fn lit_landmark(&self, landmark: &Landmark) -> bool {
        self.view.pointed == Some(Pointed::Landmark(landmark.key)) || self.lit_parts(&landmark.parts)
    }

    /// Whether a row of the ledger belongs to what is pointed at.
    pub(super) fn lit_row(&self, row: &LedgerRow) -> bool {
        let lane = row.lane.and_then(|key| self.session.lanes().iter().find(|lane| lane.key == key));
        let landmark = row.landmark.and_then(|key| self.landmark(key));
        lane.is_some_and(|lane| self.lit_lane(lane)) || landmark.is_some_and(|landmark| self.lit_landmark(landmark))
    }

    /// Whether an entry makes what is pointed at elsewhere.
    pub(super) fn lit_entry(&self, path: &str) -> bool {
        match self.view.pointed {
            Some(Pointed::Lane(key)) => self.lane(key).is_some_and(|lane| lane.parts.contains(&path)),
            Some(Pointed::Landmark(key)) => {
                self.landmark(key).is_some_and(|landmark| landmark.parts.iter().any(|part| part == path))
            }
            Some(Pointed::Part(..)) => self.lit_parts(&[path]),
            Some(Pointed::Entry(_)) | None => false,
        }
    }

    /// Whether a part of a schematic makes what is pointed at.
    pub(super) fn lit_place(&self, sheet: Sheet, index: usize, place: &Place) -> bool {
        match self.view.pointed {
            Some(Pointed::Part(at, number)) => (at, number) == (sheet, index),
            Some(Pointed::Entry(path)) => place.paths.iter().any(|own| own == path),
            Some(Pointed::Lane(_) | Pointed::Landmark(_)) => place.paths.iter().any(|path| self.lit_entry(path)),
            None => false,
        }
    }

    /// Names of all that is lit.
    pub(super) fn lit(&self) -> Vec<String> {
        let mut names = Vec::new();
        for sheet in [Sheet::Stage, Sheet::Compensator] {
            for (index, place) in self.view.schematics.places(sheet).iter().enumerate() {
                if self.lit_place(sheet, index, place) {
                    names.push(place.name.clone());
                }
            }
        }
        let lanes = self.session.lanes().iter().filter(|lane| self.lit_lane(lane));
        names.extend(lanes.map(|lane| lane.name.to_owned()));
        let detail = self.session.analysis().and_then(|analysis| analysis.shown.as_ref().ok());
        let landmarks = detail.map_or(&[][..], |detail| &detail.landmarks);
        let landmarks = landmarks.iter().filter(|landmark| self.lit_landmark(landmark));
        names.extend(landmarks.map(|landmark| landmark.name.to_owned()));
        let rows = detail.and_then(|detail| detail.ledger.as_ref()).map_or(&[][..], |ledger| &ledger.rows);
        names.extend(rows.iter().filter(|row| self.lit_row(row)).map(|row| row.label.clone()));
        names
    }

    fn lane(&self, key: &str) -> Option<&Lane> {
        self.session.lanes().iter().find(|lane| lane.key == key)
    }

    fn landmark(&self, key: &str) -> Option<&Landmark> {
        let detail = self.session.analysis()?.shown.as_ref().ok()?;
        detail.landmarks.iter().find(|landmark| landmark.key == key)
    }
}
