//! Work safety: what the window hands to the keeper each turn, and what it does with news about files and work left behind.

use std::cell::Cell;
use std::collections::BTreeMap;
use std::io;
use std::path::{Path, PathBuf};
use std::sync::mpsc::{Receiver, channel};

use eframe::egui;

use super::app::App;
use super::keep::{
    DataFolder, Keeper, Left, Look, News, OnDisk, Recent, RecentChange, Seen, Settings, Snapshot, Watch, find_left,
    load_recent, load_settings,
};
use super::on_disk::FileState;
use super::session::{BadText, Document, Session};
use super::view::{Dialog, Message};
use crate::design::{self, Design};

/// What was last handed to the journal.
#[derive(Debug, PartialEq, Eq)]
struct Mark {
    revision: u64,
    typed: Option<(&'static str, String)>,
    title: Option<String>,
}

type Search = Receiver<io::Result<Vec<Left>>>;

/// What outlives the window, and what is known about the open file.
#[derive(Debug)]
pub(super) struct Kept {
    folder: Option<DataFolder>,
    keeper: Option<Keeper>,
    watch: Option<Watch>,
    /// Journals left behind that are being offered.
    pub left: Vec<Left>,
    /// Files worked on last.
    pub recent: Vec<Recent>,
    /// The open file on the disk.
    pub file: FileState,
    /// Sum over a changed file that is to be kept out.
    pub refused: Option<u64>,
    /// The settings as they were last handed over.
    settings: Settings,
    /// The search for journals left behind; whether to say so when there are none.
    search: Option<(Search, bool)>,
    /// What the journal holds; none when there is no journal.
    journalled: Option<Mark>,
    /// Frame in which the recent files were last drawn.
    recent_drawn: Cell<u64>,
}

impl Kept {
    /// Nothing is kept.
    pub(super) fn nothing() -> Self {
        Kept {
            folder: None,
            keeper: None,
            watch: None,
            left: Vec::new(),
            recent: Vec::new(),
            file: FileState::AsKnown,
            refused: None,
            settings: Settings::default(),
            search: None,
            journalled: None,
            recent_drawn: Cell::new(0),
        }
    }

    /// Looks which of the recent files are still there, when their list has just been opened.
    pub(super) fn recent_shown(&self, ctx: &egui::Context) {
        let frame = ctx.cumulative_frame_nr();
        let before = self.recent_drawn.replace(frame);
        if before + 1 < frame
            && let Some(watch) = &self.watch
        {
            watch.exist(self.recent.iter().map(|recent| recent.path.clone()).collect());
        }
    }

    fn change_recent(&mut self, change: RecentChange) {
        let mut files = self.recent.iter().map(|recent| recent.path.clone()).collect();
        change.apply(&mut files);
        self.set_recent(files);
        if let Some(keeper) = &self.keeper {
            keeper.recent(change);
        }
    }

    /// Takes a new list; what is known about its files stays known.
    fn set_recent(&mut self, files: Vec<PathBuf>) {
        let known: BTreeMap<PathBuf, Option<bool>> = self.recent.drain(..).map(|r| (r.path, r.there)).collect();
        let recent = |path: PathBuf| Recent { there: known.get(&path).copied().flatten(), path };
        self.recent = files.into_iter().map(recent).collect();
    }

    /// Whether what stands in the file's place is what this window knows of.
    pub(super) fn expects(&self, session: &Session, sum: u64, found: &Result<Design, String>) -> bool {
        self.refused == Some(sum) || found.as_ref().is_ok_and(|design| design == session.saved())
    }

    fn look_for_left(&mut self, tell_none: bool, ctx: &egui::Context) -> io::Result<()> {
        let Some(folder) = self.folder.clone() else { return Ok(()) };
        let (tell, answer) = channel();
        let ctx = ctx.clone();
        let run = move || {
            if tell.send(find_left(&folder)).is_ok() {
                ctx.request_repaint();
            }
        };
        std::thread::Builder::new().name("left behind".to_owned()).spawn(run)?;
        self.search = Some((answer, tell_none));
        Ok(())
    }
}

/// A path that means the same after a change of the working folder.
pub(super) fn absolute(path: &Path) -> PathBuf {
    std::path::absolute(path).unwrap_or_else(|_| path.to_owned())
}

impl App {
    /// A window that keeps journal, settings and recent files in a folder, and takes up what is kept there.
    pub fn keeping(ctx: &egui::Context, design: Design, path: Option<PathBuf>, folder: DataFolder) -> Self {
        let mut app = App::new(ctx, design, path);
        let settings = load_settings(&folder);
        let broken = settings.as_ref().err().cloned();
        app.kept.settings = settings.unwrap_or_default();
        app.kept.settings.look.apply(&mut app.view, ctx);
        app.kept.set_recent(load_recent(&folder));
        app.kept.folder = Some(folder.clone());
        let waker = ctx.clone();
        match Keeper::start(folder, move || waker.request_repaint()) {
            Ok(keeper) => app.kept.keeper = Some(keeper),
            Err(error) => app.tell(format!("Unsaved changes cannot be journalled: {error}. Save often."), true),
        }
        if let Some(reason) = broken {
            app.tell(format!("{reason} The window looks as at first; new settings take their place."), true);
            app.keep_settings();
        }
        app.start_watch(ctx);
        if let Err(error) = app.kept.look_for_left(false, ctx) {
            app.tell(format!("Unsaved work left behind could not be looked for: {error}."), true);
        }
        app.note_recent();
        app
    }

    pub(super) fn tell(&mut self, text: String, failed: bool) {
        self.view.message = Some(Message { text, failed });
    }

    /// Starts to watch files, once.
    fn start_watch(&mut self, ctx: &egui::Context) {
        if self.kept.watch.is_some() {
            return;
        }
        let waker = ctx.clone();
        match Watch::start(move || waker.request_repaint()) {
            Ok(watch) => self.kept.watch = Some(watch),
            Err(error) => {
                self.tell(format!("Changes of the file by other programs will not be noticed: {error}."), true);
            }
        }
    }

    /// Takes note that the session has begun on another file, or is in its file: watches it and remembers it.
    pub(super) fn in_file(&mut self, ctx: &egui::Context) {
        self.kept.file = FileState::AsKnown;
        self.kept.refused = None;
        if self.session.path().is_some() {
            self.start_watch(ctx);
        }
        let path = self.session.path().map(|path| absolute(path));
        if let Some(watch) = &mut self.kept.watch {
            watch.file(path);
        }
        self.note_recent();
    }

    fn note_recent(&mut self) {
        if let Some(path) = self.session.path().map(|path| absolute(path)) {
            self.kept.settings_folder(path.parent());
            self.kept.change_recent(RecentChange::Used(path));
        }
    }

    /// The folder files were last opened from or saved in.
    pub(super) fn last_folder(&self) -> Option<PathBuf> {
        let of_file = self.session.path().and_then(|path| absolute(path).parent().map(Path::to_path_buf));
        of_file.or_else(|| self.kept.settings.folder.clone())
    }

    /// Hands over what has changed, and takes in what the threads have to tell. Costs a few comparisons when nothing has.
    pub(super) fn keep_up(&mut self, ctx: &egui::Context) {
        while let Some(news) = self.kept.keeper.as_ref().and_then(Keeper::news) {
            match news {
                News::Failed(text) => self.tell(text, true),
                News::Mended => self.tell("Unsaved changes are journalled again.".to_owned(), false),
                News::Recent(files) => self.kept.set_recent(files),
            }
        }
        while let Some(seen) = self.kept.watch.as_ref().and_then(Watch::seen) {
            match seen {
                Seen::File(_, on_disk) => self.take_note_of(on_disk),
                Seen::Exist(found) => {
                    for recent in &mut self.kept.recent {
                        let there = found.iter().find(|(path, _)| *path == recent.path).map(|(_, there)| *there);
                        recent.there = there.or(recent.there);
                    }
                }
            }
        }
        if self.view.dialog.is_none() {
            self.take_left_behind();
        }
        self.keep_journal();
        let look = Look::now(&self.view, ctx, &self.kept.settings.look);
        if look != self.kept.settings.look {
            self.kept.settings.look = look;
            self.keep_settings();
        }
    }

    fn keep_settings(&self) {
        if let Some(keeper) = &self.kept.keeper {
            keeper.settings(self.kept.settings.clone());
        }
    }

    /// Hands unsaved work to the journal when it moved, and has the journal removed when nothing is unsaved.
    fn keep_journal(&mut self) {
        let Some(keeper) = &self.kept.keeper else { return };
        let typed = self.typed();
        let title = self.view.title.as_ref().filter(|title| **title != self.session.design().title);
        if !self.session.unsaved() && typed.is_none() && title.is_none() {
            if self.kept.journalled.take().is_some() {
                keeper.no_journal();
            }
            return;
        }
        let known = self.kept.journalled.as_ref().is_some_and(|mark| {
            mark.revision == self.session.revision()
                && mark.typed.as_ref().map(|(path, text)| (*path, text.as_str())) == typed
                && mark.title.as_ref() == title
        });
        if known {
            return;
        }
        keeper.journal(self.snapshot(typed, title));
        self.kept.journalled = Some(Mark {
            revision: self.session.revision(),
            typed: typed.map(|(path, text)| (path, text.to_owned())),
            title: title.cloned(),
        });
    }

    /// The work as it stands, with what is being typed taken over as Enter would.
    fn snapshot(&self, typed: Option<(&'static str, &str)>, title: Option<&String>) -> Snapshot {
        let Document { mut design, bad_texts } = self.session.document().clone();
        let mut bad_texts: BTreeMap<String, String> =
            bad_texts.into_iter().map(|(path, bad)| (path, bad.text)).collect();
        if let Some((path, text)) = typed {
            if design.set_from_text(path, text).is_ok() {
                bad_texts.remove(path);
            } else {
                bad_texts.insert(path.to_owned(), text.to_owned());
            }
        }
        if let Some(title) = title {
            design.title.clone_from(title);
        }
        Snapshot { design, bad_texts, path: self.session.path().map(|path| absolute(path)) }
    }

    /// What is typed in a field and not yet taken over: the entry's path and the text.
    pub(super) fn typed(&self) -> Option<(&'static str, &str)> {
        let field = self.view.field.as_ref()?;
        let bad = self.session.bad_text(field.path).map(|bad| bad.text.clone());
        let number = || {
            let value = self.session.design().values.get(field.path)?;
            Some(crate::quantity::exact(value, design::entry(field.path)?.unit))
        };
        let before = bad.or_else(number).unwrap_or_default();
        (before != field.text).then_some((field.path, field.text.as_str()))
    }

    /// The window closes: the journal goes with work that was saved or given up, and stays with any other.
    pub(super) fn keep_on_exit(&mut self) {
        if let Some(keeper) = &self.kept.keeper
            && (self.leaving || !self.session.unsaved())
        {
            keeper.no_journal();
        }
        // Waits until all is written.
        self.kept.keeper = None;
    }

    fn take_left_behind(&mut self) {
        let Some((answer, tell_none)) = &self.kept.search else { return };
        let Ok(found) = answer.try_recv() else { return };
        let tell_none = *tell_none;
        self.kept.search = None;
        match found {
            Ok(left) if left.is_empty() => {
                if tell_none {
                    self.tell("No unsaved work was left behind.".to_owned(), false);
                }
            }
            Ok(left) => {
                self.kept.left = left;
                self.view.dialog = Some(Dialog::Recovery { discarding: None });
            }
            Err(error) => self.tell(format!("Unsaved work left behind could not be looked for: {error}."), true),
        }
    }

    /// Looks again for unsaved work, because it was asked for.
    pub(super) fn find_unsaved(&mut self, ctx: &egui::Context) {
        self.view.dialog = None;
        self.kept.left.clear();
        if self.kept.folder.is_none() {
            self.tell("There is no folder to keep unsaved work in.".to_owned(), true);
        } else if let Err(error) = self.kept.look_for_left(true, ctx) {
            self.tell(format!("Unsaved work left behind could not be looked for: {error}."), true);
        }
    }

    /// Takes up the work in a journal. It stays there until this window's own journal holds it.
    pub(super) fn recover(&mut self, file: &Path, ctx: &egui::Context) {
        let Some(at) = self.kept.left.iter().position(|left| left.file == file) else { return };
        let left = self.kept.left.swap_remove(at);
        let Ok(content) = &left.content else { return };
        let Snapshot { mut design, bad_texts, path } = content.snapshot.clone();
        let mut refused = BTreeMap::new();
        for (path, text) in bad_texts {
            if let Err(finding) = design.set_from_text(&path, &text) {
                refused.insert(path, BadText { text, finding });
            }
        }
        let saved = match &content.on_disk {
            Some(OnDisk::There { design, .. }) => design.as_ref().as_ref().ok().cloned(),
            _ => None,
        };
        let more = self.kept.left.len();
        self.kept.left.clear();
        let document = Document { design, bad_texts: refused };
        self.begin(Session::recovered(document, path, saved), ctx);
        self.keep_journal();
        if let Some(keeper) = &self.kept.keeper {
            keeper.done_with(vec![left]);
        }
        let rest = match more {
            0 => String::new(),
            1 => " One more is kept for later.".to_owned(),
            more => format!(" {more} more are kept for later."),
        };
        self.tell(format!("Recovered and not yet saved.{rest}"), false);
    }

    /// Removes a journal for good.
    pub(super) fn discard_journal(&mut self, file: &Path) {
        if let Some(at) = self.kept.left.iter().position(|left| left.file == file) {
            let left = self.kept.left.remove(at);
            if let Some(keeper) = &self.kept.keeper {
                keeper.done_with(vec![left]);
            }
        }
        let none_left = self.kept.left.is_empty();
        self.view.dialog = (!none_left).then_some(Dialog::Recovery { discarding: None });
    }

    /// The offer was put off: others may take it up.
    pub(super) fn put_off_recovery(&mut self) {
        if !self.kept.left.is_empty() {
            self.kept.left.clear();
            self.tell("Unsaved work stays kept; the Design menu offers it again.".to_owned(), false);
        }
    }

    /// Takes files off the list of recent files.
    pub(super) fn forget_recent(&mut self, path: Option<PathBuf>) {
        self.kept.change_recent(path.map_or(RecentChange::ForgetAll, RecentChange::Forget));
    }
}

impl Kept {
    fn settings_folder(&mut self, folder: Option<&Path>) {
        if folder != self.settings.folder.as_deref() {
            self.settings.folder = folder.map(Path::to_path_buf);
            if let Some(keeper) = &self.keeper {
                keeper.settings(self.settings.clone());
            }
        }
    }

    /// A new document: what the journal held is not of this one.
    pub(super) fn new_document(&mut self) {
        // A mark that no revision meets: the journal is removed or written anew, whichever is due.
        if let Some(mark) = &mut self.journalled {
            mark.revision = u64::MAX;
        }
    }
}
