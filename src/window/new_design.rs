//! The form of a new design, and the design it proposes.

use crate::design::Design;

/// What is typed into the form of a new design.
#[derive(Clone, Debug, Default)]
pub(super) struct NewDesign {
    proposed: Option<Design>,
}

impl NewDesign {
    /// The design proposed.
    pub(super) fn design(&self) -> Option<Design> {
        self.proposed.clone()
    }
}
