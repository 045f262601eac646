//! Journals that an earlier window left behind, and the lock that tells them from those of windows still at work.
//!
//! Beside every journal stands a lock file, held by its window as long as that lives; the system lets go of it however the
//! process ends. Whoever can take the lock knows that the window is gone, and keeps the lock while the journal is offered, so
//! that no other window offers it as well.

use std::ffi::OsStr;
use std::fs::{File, TryLockError};
use std::io;
use std::path::{Path, PathBuf};
use std::time::{Duration, SystemTime};

use super::folder::DataFolder;
use super::journal::{self, JournalError, Snapshot};
use super::watch::{OnDisk, look_at};
use crate::design::{Difference, differences};

/// Age from which lock files without a journal, and temporary files of a writer that was killed, are swept away.
const OLD: Duration = Duration::from_hours(24);

/// A lock that is held.
#[derive(Debug)]
pub(super) struct Lock {
    path: PathBuf,
    file: File,
}

impl Lock {
    /// The lock file of a journal.
    fn file_of(journal: &Path) -> PathBuf {
        journal.with_extension("lock")
    }

    /// Takes the lock of a journal; none while another window has it. Where locks do not work, nothing tells a window at work
    /// from one that is gone, and every lock counts as taken: rather a journal offered too often than work lost.
    pub(super) fn take(journal: &Path) -> io::Result<Option<Self>> {
        let path = Self::file_of(journal);
        let file = File::options().create(true).append(true).open(&path)?;
        match file.try_lock() {
            Ok(()) | Err(TryLockError::Error(_)) => Ok(Some(Lock { path, file })),
            Err(TryLockError::WouldBlock) => Ok(None),
        }
    }

    /// Lets go and removes the lock file: nothing is left to be locked.
    pub(super) fn remove(self) {
        let _ = std::fs::remove_file(&self.path);
    }
}

impl Drop for Lock {
    fn drop(&mut self) {
        // Closing alone would leave it locked while a process that was just started still has a copy of the open file.
        let _ = self.file.unlock();
    }
}

/// What a journal holds that can be used, beside what stands in its file now.
#[derive(Debug)]
pub(in crate::window) struct Content {
    /// The work.
    pub snapshot: Snapshot,
    /// When it was written.
    pub written: SystemTime,
    /// What stands in the file it belongs to; none without one.
    pub on_disk: Option<OnDisk>,
    /// What differs from the file, when there is a design in it.
    pub differences: Option<Vec<Difference>>,
}

/// A journal left behind.
#[derive(Debug)]
pub(in crate::window) struct Left {
    /// The journal.
    pub file: PathBuf,
    /// What it holds.
    pub content: Result<Content, JournalError>,
    lock: Lock,
}

impl Left {
    /// Removes the journal.
    ///
    /// # Errors
    /// What the system says; a journal that is gone already is no error.
    pub(super) fn remove(self) -> io::Result<()> {
        match std::fs::remove_file(&self.file) {
            Err(error) if error.kind() != io::ErrorKind::NotFound => Err(error),
            _ => {
                self.lock.remove();
                Ok(())
            }
        }
    }
}

/// The journals left behind, oldest first. One whose work stands in its file already is removed without a word.
///
/// # Errors
/// What the system says when the folder is there and cannot be read.
pub(in crate::window) fn find(folder: &DataFolder) -> io::Result<Vec<Left>> {
    let entries = match std::fs::read_dir(folder.journals()) {
        Ok(entries) => entries,
        // No journal was ever written there; that none can be written now is told when one is due.
        Err(error) if matches!(error.kind(), io::ErrorKind::NotFound | io::ErrorKind::NotADirectory) => {
            return Ok(Vec::new());
        }
        Err(error) => return Err(error),
    };
    let mut files: Vec<PathBuf> = entries.filter_map(|entry| Some(entry.ok()?.path())).collect();
    files.sort();
    sweep(&files);
    let ours = |file: &PathBuf| file.extension() == Some(OsStr::new("ron"));
    Ok(files.into_iter().filter(ours).filter_map(open).collect())
}

fn open(file: PathBuf) -> Option<Left> {
    // In a folder that cannot be written no window is at work.
    let lock = match Lock::take(&file) {
        Ok(lock) => lock?,
        Err(_) => Lock { path: Lock::file_of(&file), file: File::open(&file).ok()? },
    };
    // Its window may have ended well between the listing and the lock.
    if !file.exists() {
        lock.remove();
        return None;
    }
    let content = journal::load(&file).map(|(snapshot, written)| {
        let on_disk = snapshot.path.as_deref().map(look_at);
        let differences = match &on_disk {
            Some(OnDisk::There { design, .. }) => {
                design.as_ref().as_ref().ok().map(|design| differences(design, &snapshot.design))
            }
            _ => None,
        };
        Content { snapshot, written, on_disk, differences }
    });
    let left = Left { file, content, lock };
    if left.content.as_ref().is_ok_and(Content::is_saved) {
        // When it cannot be removed it is found again at the next start.
        let _ = left.remove();
        return None;
    }
    Some(left)
}

impl Content {
    /// True when the file holds all of the work.
    fn is_saved(&self) -> bool {
        let same = match &self.on_disk {
            Some(OnDisk::There { design, .. }) => design.as_ref().as_ref().is_ok_and(|d| *d == self.snapshot.design),
            _ => false,
        };
        same && self.snapshot.bad_texts.is_empty()
    }
}

/// Removes what killed writers left behind and nobody needs.
fn sweep(files: &[PathBuf]) {
    for file in files {
        let old = || {
            let modified = std::fs::metadata(file).and_then(|about| about.modified()).ok()?;
            modified.elapsed().ok().filter(|age| *age > OLD)
        };
        let journal = file.with_extension("ron");
        match file.extension().and_then(OsStr::to_str) {
            Some("tmp") if old().is_some() => {
                let _ = std::fs::remove_file(file);
            }
            Some("lock") if !journal.exists() && old().is_some() => {
                if let Ok(Some(lock)) = Lock::take(&journal) {
                    lock.remove();
                }
            }
            _ => {}
        }
    }
}
