//! A watch over the open file: a thread looks at it each second and wakes the window only when its content has changed.
//!
//! The user's files may stand on a share that hangs. Only this thread waits for them then.

use std::path::{Path, PathBuf};
use std::sync::mpsc::{Receiver, RecvTimeoutError, Sender, TryRecvError, channel};
use std::time::{Duration, SystemTime};

use super::journal::checksum;
use crate::design::{Design, file};

/// Time between two looks.
const PAUSE: Duration = Duration::from_secs(1);

/// What stands on the disk in the place of a file.
#[derive(Clone, Debug, PartialEq)]
pub(in crate::window) enum OnDisk {
    /// A file.
    There {
        /// Sum over its bytes.
        sum: u64,
        /// The design in it, or why there is none.
        design: Box<Result<Design, String>>,
    },
    /// Nothing, or nothing that can be read: why.
    Gone(String),
}

/// What the watch saw.
#[derive(Debug)]
pub(in crate::window) enum Seen {
    /// The content of the watched file, when it is not what was last told. The number is that of the request.
    File(u64, OnDisk),
    /// Which files are there.
    Exist(Vec<(PathBuf, bool)>),
}

enum Ask {
    File(Option<PathBuf>, u64),
    Exist(Vec<PathBuf>),
}

/// The thread that looks, and what it saw.
#[derive(Debug)]
pub(in crate::window) struct Watch {
    ask: Sender<Ask>,
    seen: Receiver<Seen>,
    /// Number of the last request: what was seen for an earlier one no longer counts.
    request: u64,
}

impl Watch {
    /// Starts the thread; `wake` is called when it has seen something.
    ///
    /// # Errors
    /// When no thread can be started.
    pub(in crate::window) fn start(wake: impl Fn() + Send + 'static) -> std::io::Result<Self> {
        let (ask, asked) = channel();
        let (tell, seen) = channel();
        let run = move || {
            let tell = |news| {
                let told = tell.send(news).is_ok();
                wake();
                told
            };
            watch(&asked, &tell);
        };
        std::thread::Builder::new().name("file watch".to_owned()).spawn(run)?;
        Ok(Watch { ask, seen, request: 0 })
    }

    /// Watches this file from now on, or none; tells its present content once.
    pub(in crate::window) fn file(&mut self, path: Option<PathBuf>) {
        self.request += 1;
        let _ = self.ask.send(Ask::File(path, self.request));
    }

    /// Asks which of these files are there.
    pub(in crate::window) fn exist(&self, paths: Vec<PathBuf>) {
        let _ = self.ask.send(Ask::Exist(paths));
    }

    /// What was seen since, unless it is out of date.
    pub(in crate::window) fn seen(&self) -> Option<Seen> {
        loop {
            match self.seen.try_recv() {
                Ok(Seen::File(request, _)) if request != self.request => {}
                Ok(seen) => return Some(seen),
                Err(TryRecvError::Empty | TryRecvError::Disconnected) => return None,
            }
        }
    }
}

/// What the system says about a file without reading it.
type About = Result<(Option<SystemTime>, u64), std::io::ErrorKind>;

/// The file being watched, and what was last told of it.
struct Watched {
    path: PathBuf,
    request: u64,
    about: About,
    told: OnDisk,
}

fn watch(asked: &Receiver<Ask>, tell: &impl Fn(Seen) -> bool) {
    let mut watched: Option<Watched> = None;
    loop {
        // With nothing to look at there is nothing to wake for.
        let ask = match &watched {
            Some(_) => asked.recv_timeout(PAUSE),
            None => asked.recv().map_err(|_closed| RecvTimeoutError::Disconnected),
        };
        let going_on = match ask {
            Ok(Ask::File(path, request)) => {
                watched = path.map(|path| begin(path, request));
                watched.as_ref().is_none_or(|watched| tell(Seen::File(watched.request, watched.told.clone())))
            }
            Ok(Ask::Exist(paths)) => {
                let there = |path: PathBuf| {
                    let there = path.is_file();
                    (path, there)
                };
                tell(Seen::Exist(paths.into_iter().map(there).collect()))
            }
            Err(RecvTimeoutError::Timeout) => watched.as_mut().is_none_or(|watched| look_again(watched, tell)),
            Err(RecvTimeoutError::Disconnected) => false,
        };
        if !going_on {
            return;
        }
    }
}

fn begin(path: PathBuf, request: u64) -> Watched {
    // First what the system says: a change between the two is then seen at the next look.
    let about = about(&path);
    let told = look_at(&path);
    Watched { path, request, about, told }
}

fn look_again(watched: &mut Watched, tell: &impl Fn(Seen) -> bool) -> bool {
    let about = about(&watched.path);
    if about == watched.about {
        return true;
    }
    watched.about = about;
    let now = look_at(&watched.path);
    if now == watched.told {
        return true;
    }
    watched.told = now.clone();
    tell(Seen::File(watched.request, now))
}

fn about(path: &Path) -> About {
    let about = std::fs::metadata(path).map_err(|error| error.kind())?;
    Ok((about.modified().ok(), about.len()))
}

/// Looks at a file once.
pub(in crate::window) fn look_at(path: &Path) -> OnDisk {
    // A pipe would keep the reader waiting, and what is far too large is no design.
    let about = match std::fs::metadata(path) {
        Ok(about) => about,
        Err(error) if error.kind() == std::io::ErrorKind::NotFound => {
            return OnDisk::Gone("it is not there".to_owned());
        }
        Err(error) => return OnDisk::Gone(error.to_string()),
    };
    if !about.is_file() {
        return OnDisk::Gone("something else than a file stands in its place".to_owned());
    }
    if about.len() > file::LARGEST_FILE {
        let design = Box::new(Err("it is larger than any design".to_owned()));
        return OnDisk::There { sum: about.len(), design };
    }
    match std::fs::read(path) {
        Ok(bytes) => {
            let design = file::read(&mut bytes.as_slice());
            let reason =
                |error: file::FileError| error.findings().first().map_or_else(String::new, ToString::to_string);
            OnDisk::There { sum: checksum(&bytes), design: Box::new(design.map_err(reason)) }
        }
        Err(error) => OnDisk::Gone(error.to_string()),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use std::sync::Arc;
    use std::sync::atomic::{AtomicUsize, Ordering};

    fn next(watch: &Watch) -> Seen {
        for _ in 0..2000 {
            if let Some(seen) = watch.seen() {
                return seen;
            }
            std::thread::sleep(Duration::from_millis(10));
        }
        panic!("nothing was seen");
    }

    #[test]
    fn a_change_is_seen_and_a_touch_is_not() {
        let folder = tempfile::tempdir().expect("a folder");
        let path = folder.path().join("design.ron");
        let design = Design::default();
        file::save(&design, &path).expect("saved");
        let wakes = Arc::new(AtomicUsize::new(0));
        let counter = Arc::clone(&wakes);
        let mut watch = Watch::start(move || {
            counter.fetch_add(1, Ordering::SeqCst);
        })
        .expect("a thread");
        watch.file(Some(path.clone()));
        assert!(
            matches!(next(&watch), Seen::File(1, OnDisk::There { design: found, .. }) if *found == Ok(design.clone()))
        );

        // The same bytes again: the time of the file moves, its content does not.
        file::save(&design, &path).expect("saved");
        std::thread::sleep(2 * PAUSE);
        assert!(watch.seen().is_none());
        assert_eq!(wakes.load(Ordering::SeqCst), 1, "nothing woke the window");

        let other = Design { title: "other".to_owned(), ..Design::default() };
        file::save(&other, &path).expect("saved");
        assert!(matches!(next(&watch), Seen::File(1, OnDisk::There { design: found, .. }) if *found == Ok(other)));
        std::fs::write(&path, "half a des").expect("written");
        assert!(matches!(next(&watch), Seen::File(1, OnDisk::There { design: found, .. }) if found.is_err()));
        std::fs::remove_file(&path).expect("removed");
        assert!(matches!(next(&watch), Seen::File(1, OnDisk::Gone(_))));

        watch.exist(vec![path.clone(), folder.path().to_owned()]);
        assert!(matches!(next(&watch), Seen::Exist(found) if found.iter().all(|(_, there)| !there)));
    }

    #[test]
    fn what_was_seen_for_an_earlier_file_does_not_count() {
        let folder = tempfile::tempdir().expect("a folder");
        let mut watch = Watch::start(|| {}).expect("a thread");
        watch.file(Some(folder.path().join("one.ron")));
        watch.file(Some(folder.path().join("two.ron")));
        assert!(matches!(next(&watch), Seen::File(2, OnDisk::Gone(_))));
        watch.file(None);
        assert!(watch.seen().is_none());
    }
}
