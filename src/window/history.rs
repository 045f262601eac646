//! Undo and redo: named steps, each holding the document as it was before; a gesture such as a drag is one step.

/// Steps kept; older ones are forgotten.
const MOST_STEPS: usize = 500;

/// Marks changes that belong together: one drag of a handle, one run of arrow keys.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Gesture(u64);

impl Gesture {
    /// A gesture unlike this one.
    #[must_use]
    pub fn next(self) -> Self {
        Gesture(self.0.wrapping_add(1))
    }
}

#[derive(Clone, Debug)]
struct Step<T> {
    name: String,
    document: T,
    gesture: Option<Gesture>,
}

/// What can be undone and redone of a document.
#[derive(Clone, Debug)]
pub struct History<T> {
    done: Vec<Step<T>>,
    undone: Vec<Step<T>>,
}

impl<T> Default for History<T> {
    fn default() -> Self {
        History { done: Vec::new(), undone: Vec::new() }
    }
}

impl<T: Clone + PartialEq> History<T> {
    /// Takes note of a change from `before`. Changes of one gesture make one step; what was undone is forgotten.
    pub fn record(&mut self, name: &str, before: T, gesture: Option<Gesture>) {
        self.undone.clear();
        let same = gesture.is_some() && self.done.last().is_some_and(|step| step.gesture == gesture);
        if same {
            return;
        }
        if self.done.len() == MOST_STEPS {
            self.done.remove(0);
        }
        self.done.push(Step { name: name.to_owned(), document: before, gesture });
    }

    /// The document before the running gesture, when it has changed anything yet.
    pub fn before_gesture(&self, gesture: Gesture) -> Option<&T> {
        self.done.last().filter(|step| step.gesture == Some(gesture)).map(|step| &step.document)
    }

    /// Takes the last step back: hands out the document before it.
    pub fn undo(&mut self, present: &T) -> Option<T> {
        let step = self.done.pop()?;
        self.undone.push(Step { name: step.name, document: present.clone(), gesture: None });
        Some(step.document)
    }

    /// Does the last step taken back again: hands out the document after it.
    pub fn redo(&mut self, present: &T) -> Option<T> {
        let step = self.undone.pop()?;
        self.done.push(Step { name: step.name, document: present.clone(), gesture: None });
        Some(step.document)
    }

    /// Name of the step that undo would take back.
    pub fn undo_name(&self) -> Option<&str> {
        self.done.last().map(|step| step.name.as_str())
    }

    /// Name of the step that redo would do again.
    pub fn redo_name(&self) -> Option<&str> {
        self.undone.last().map(|step| step.name.as_str())
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn steps_go_back_and_forth() {
        let mut history = History::default();
        history.record("one", 1, None);
        history.record("two", 2, None);
        assert_eq!(history.undo_name(), Some("two"));
        assert_eq!(history.undo(&3), Some(2));
        assert_eq!(history.redo_name(), Some("two"));
        assert_eq!(history.redo(&2), Some(3));
        assert_eq!(history.undo(&3), Some(2));
        assert_eq!(history.undo(&2), Some(1));
        assert_eq!(history.undo(&1), None);
    }

    #[test]
    fn a_drag_is_one_step() {
        let mut history = History::default();
        let drag = Gesture::default().next();
        history.record("move zero 1", 1, Some(drag));
        history.record("move zero 1", 2, Some(drag));
        assert_eq!(history.before_gesture(drag), Some(&1));
        history.record("move zero 1", 3, Some(drag.next()));
        assert_eq!(history.undo(&4), Some(3));
        assert_eq!(history.undo(&3), Some(1));
    }

    #[test]
    fn a_change_forgets_what_was_undone() {
        let mut history = History::default();
        history.record("one", 1, None);
        assert_eq!(history.undo(&2), Some(1));
        history.record("other", 1, None);
        assert_eq!(history.redo(&5), None);
    }
}
