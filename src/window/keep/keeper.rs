//! The thread that writes into the data folder: journal, settings, recent files.
//!
//! The window hands over what has changed and goes on; only the newest of several journals is written, with a pause between two
//! so that a drag does not keep the disk busy. Without work the thread sleeps.

use std::io;
use std::path::PathBuf;
use std::sync::mpsc::{Receiver, RecvTimeoutError, Sender, channel};
use std::time::{Duration, Instant, SystemTime, UNIX_EPOCH};

use super::folder::DataFolder;
use super::journal::{self, Snapshot};
use super::left::{Left, Lock};
use super::recent::{self, RecentChange};
use super::settings::{self, Settings};
use crate::design::file::replace;

/// Pause between two rounds of writing: with the time of one write, far below the two seconds that may be lost.
const PAUSE: Duration = Duration::from_millis(250);
/// Time until what failed is tried again.
const AGAIN: Duration = Duration::from_secs(5);
/// Longest wait for the last round when the window closes.
const LAST: Duration = Duration::from_secs(5);
/// Names tried for a journal.
const MOST_NAMES: u32 = 100;

enum Job {
    Journal(Box<Snapshot>),
    NoJournal,
    DoneWith(Vec<Left>),
    Settings(Box<Settings>),
    Recent(RecentChange),
}

/// What the writer has to tell.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(in crate::window) enum News {
    /// Something could not be kept, as a sentence; told once until it works again.
    Failed(String),
    /// The journal works again.
    Mended,
    /// The recent files, as they are kept now.
    Recent(Vec<PathBuf>),
}

/// The writer and its news.
#[derive(Debug)]
pub(in crate::window) struct Keeper {
    jobs: Option<Sender<Job>>,
    news: Receiver<News>,
    ended: Receiver<()>,
}

impl Keeper {
    /// Starts the writer; `wake` is called when it has something to tell.
    ///
    /// # Errors
    /// When no thread can be started.
    pub(in crate::window) fn start(folder: DataFolder, wake: impl Fn() + Send + 'static) -> io::Result<Self> {
        let (jobs, asked) = channel();
        let (tell, news) = channel();
        let (alive, ended) = channel();
        let run = move || {
            let tell = move |news| {
                if tell.send(news).is_ok() {
                    wake();
                }
            };
            let mut writer =
                Writer { folder, own: None, written: false, journal_failing: false, rest_failing: false, tell: &tell };
            writer.work(&asked);
            drop(alive);
        };
        std::thread::Builder::new().name("keeper".to_owned()).spawn(run)?;
        Ok(Keeper { jobs: Some(jobs), news, ended })
    }

    fn send(&self, job: Job) {
        if let Some(jobs) = &self.jobs {
            let _ = jobs.send(job);
        }
    }

    /// Has the unsaved work journalled.
    pub(in crate::window) fn journal(&self, snapshot: Snapshot) {
        self.send(Job::Journal(Box::new(snapshot)));
    }

    /// Has the journal removed: nothing is unsaved.
    pub(in crate::window) fn no_journal(&self) {
        self.send(Job::NoJournal);
    }

    /// Has journals that were left behind removed, once the present journal is written.
    pub(in crate::window) fn done_with(&self, left: Vec<Left>) {
        self.send(Job::DoneWith(left));
    }

    /// Has the settings kept.
    pub(in crate::window) fn settings(&self, settings: Settings) {
        self.send(Job::Settings(Box::new(settings)));
    }

    /// Has a change of the recent files kept.
    pub(in crate::window) fn recent(&self, change: RecentChange) {
        self.send(Job::Recent(change));
    }

    /// What the writer has to tell.
    pub(in crate::window) fn news(&self) -> Option<News> {
        self.news.try_recv().ok()
    }
}

impl Drop for Keeper {
    /// Waits for what is still to be written, but not for ever.
    fn drop(&mut self) {
        self.jobs = None;
        let _ = self.ended.recv_timeout(LAST);
    }
}

/// What is to become of the journal.
#[derive(Default)]
enum DueJournal {
    #[default]
    AsItIs,
    Write(Box<Snapshot>),
    Remove,
}

/// What is to be written next.
#[derive(Default)]
struct Due {
    journal: DueJournal,
    done_with: Vec<Left>,
    settings: Option<Box<Settings>>,
    recent: Vec<RecentChange>,
}

impl Due {
    fn add(&mut self, job: Job) {
        match job {
            Job::Journal(snapshot) => self.journal = DueJournal::Write(snapshot),
            Job::NoJournal => self.journal = DueJournal::Remove,
            Job::DoneWith(left) => self.done_with.extend(left),
            Job::Settings(settings) => self.settings = Some(settings),
            Job::Recent(change) => self.recent.push(change),
        }
    }

    fn is_empty(&self) -> bool {
        matches!(self.journal, DueJournal::AsItIs)
            && self.done_with.is_empty()
            && self.settings.is_none()
            && self.recent.is_empty()
    }
}

/// Takes the next job that comes before a moment.
fn take(jobs: &Receiver<Job>, until: Instant, due: &mut Due) -> Result<(), RecvTimeoutError> {
    due.add(jobs.recv_timeout(until.saturating_duration_since(Instant::now()))?);
    Ok(())
}

struct Writer<'a> {
    folder: DataFolder,
    /// This window's journal, once it was needed.
    own: Option<(PathBuf, Lock)>,
    /// The journal is there.
    written: bool,
    journal_failing: bool,
    rest_failing: bool,
    tell: &'a dyn Fn(News),
}

impl Writer<'_> {
    fn work(&mut self, jobs: &Receiver<Job>) {
        let mut due = Due::default();
        let mut open = true;
        while open {
            if due.is_empty() {
                open = jobs.recv().map(|job| due.add(job)).is_ok();
            } else if self.journal_failing {
                open = take(jobs, Instant::now() + AGAIN, &mut due) != Err(RecvTimeoutError::Disconnected);
            }
            for job in jobs.try_iter() {
                due.add(job);
            }
            self.write(&mut due);
            let until = Instant::now() + PAUSE;
            while open {
                match take(jobs, until, &mut due) {
                    Ok(()) => {}
                    Err(RecvTimeoutError::Timeout) => break,
                    Err(RecvTimeoutError::Disconnected) => open = false,
                }
            }
        }
        if !due.is_empty() {
            self.write(&mut due);
        }
        if let (false, Some((_, lock))) = (self.written, self.own.take()) {
            lock.remove();
        }
    }

    /// Writes what is due, and tells when that begins to fail or works again. A journal that fails stays due; the rest is
    /// written again when it next changes.
    fn write(&mut self, due: &mut Due) {
        let journal = self.write_due_journal(due);
        let rest = self.write_rest(due);
        if let (Err(reason), false) = (&journal, self.journal_failing) {
            let text = format!("Unsaved changes cannot be journalled: {reason}. Save often; work goes on.");
            (self.tell)(News::Failed(text));
        } else if journal.is_ok() && self.journal_failing {
            (self.tell)(News::Mended);
        } else if let (Some(Err(text)), false) = (&rest, self.journal_failing || self.rest_failing) {
            (self.tell)(News::Failed(text.clone()));
        }
        self.journal_failing = journal.is_err();
        self.rest_failing = rest.map_or(self.rest_failing, |rest| rest.is_err());
    }

    fn write_due_journal(&mut self, due: &mut Due) -> Result<(), String> {
        match &due.journal {
            DueJournal::AsItIs => {}
            DueJournal::Write(snapshot) => self.write_journal(snapshot)?,
            DueJournal::Remove => self.remove_journal()?,
        }
        due.journal = DueJournal::AsItIs;
        // One that cannot be removed is offered again: that loses nothing.
        due.done_with.drain(..).for_each(|left| drop(left.remove()));
        Ok(())
    }

    /// Writes settings and recent files; none when neither is due.
    fn write_rest(&self, due: &mut Due) -> Option<Result<(), String>> {
        if due.settings.is_none() && due.recent.is_empty() {
            return None;
        }
        let save = |settings: Box<Settings>| settings::save(&self.folder.settings(), &settings);
        let mut kept = self.prepare().and_then(|()| due.settings.take().map_or(Ok(()), save));
        if kept.is_ok() && !due.recent.is_empty() {
            kept = self.write_recent(&due.recent);
        }
        due.settings = None;
        due.recent.clear();
        Some(
            kept.map_err(|error| {
                format!("Recent files and the look of the window cannot be kept: {}.", self.told(&error))
            }),
        )
    }

    fn write_recent(&self, changes: &[RecentChange]) -> io::Result<()> {
        let file = self.folder.recent();
        // Another window may have changed the list since.
        let mut files = recent::load_file(&file);
        for change in changes {
            change.apply(&mut files);
        }
        recent::save(&file, &files)?;
        (self.tell)(News::Recent(files));
        Ok(())
    }

    /// What the system says, with the folder it says it of.
    fn told(&self, error: &io::Error) -> String {
        format!("{}: {error}", self.folder.path().display())
    }

    fn prepare(&self) -> io::Result<()> {
        std::fs::create_dir_all(self.folder.journals())
    }

    fn write_journal(&mut self, snapshot: &Snapshot) -> Result<(), String> {
        let text = journal::write(snapshot, SystemTime::now())?;
        if self.own.is_none() {
            self.own = Some(own_journal(&self.folder).map_err(|error| self.told(&error))?);
        }
        if let Some((file, _)) = &self.own {
            // The folder may have been removed meanwhile.
            self.prepare().and_then(|()| replace(file, &text)).map_err(|error| self.told(&error))?;
        }
        self.written = true;
        Ok(())
    }

    fn remove_journal(&mut self) -> Result<(), String> {
        let Some((file, _)) = self.own.as_ref().filter(|_| self.written) else { return Ok(()) };
        match std::fs::remove_file(file) {
            Err(error) if error.kind() != io::ErrorKind::NotFound => Err(format!("{}: {error}", file.display())),
            _ => {
                self.written = false;
                Ok(())
            }
        }
    }
}

/// A journal's name that no other window has, and its lock.
fn own_journal(folder: &DataFolder) -> io::Result<(PathBuf, Lock)> {
    let journals = folder.journals();
    std::fs::create_dir_all(&journals)?;
    let seconds = SystemTime::now().duration_since(UNIX_EPOCH).map_or(0, |time| time.as_secs());
    for number in 0..MOST_NAMES {
        let file = journals.join(format!("{seconds}-{}-{number}.ron", std::process::id()));
        // The lock first: a journal is never there without it. One left behind under the same name is kept.
        if let Some(lock) = Lock::take(&file)?
            && !file.exists()
        {
            return Ok((file, lock));
        }
    }
    Err(io::Error::other("no free name for a journal"))
}
