//! Tests of what is kept: processes killed while they edit, windows side by side, folders and disks that fail.

use std::fs;
use std::hash::{BuildHasher, Hasher};
use std::io::Write;
use std::path::{Path, PathBuf};
use std::process::{Command as Process, Stdio};
use std::time::{Duration, Instant, SystemTime, UNIX_EPOCH};

use eframe::egui;

use super::left::find;
use super::*;
use crate::design::{Design, file};
use crate::window::{App, Command};

/// Names the folder in which the child of a test edits.
const EDIT_IN: &str = "POLEWRIGHT_TEST_EDIT_IN";
/// Most that may be lost.
const LOST: Duration = Duration::from_secs(2);
const PROCESSES: usize = 20;
const ROUNDS: usize = 5;

fn design_file(folder: &Path) -> PathBuf {
    folder.join("design.ron")
}

fn log_file(folder: &Path) -> PathBuf {
    folder.join("log")
}

fn now_ms() -> u128 {
    SystemTime::now().duration_since(UNIX_EPOCH).expect("after 1970").as_millis()
}

/// Not a test of its own: the process that the next test kills. Edits without end, saves now and then, and notes each edit.
#[test]
fn edits_until_it_is_killed() {
    let Some(folder) = std::env::var_os(EDIT_IN).map(PathBuf::from) else { return };
    let ctx = egui::Context::default();
    let design = file::load(&design_file(&folder)).expect("whole");
    let data = DataFolder::at(folder.join("data"));
    let mut app = App::keeping(&ctx, design, Some(design_file(&folder)), data);
    let mut log = fs::File::options().create(true).append(true).open(log_file(&folder)).expect("a log");
    for edit in 1_u32.. {
        app.perform(Command::Title(format!("edit {edit}")), &ctx);
        // The log first: an edit may be missing in the journal, but none is in the journal and not in the log.
        log.write_all(format!("{edit} {}\n", now_ms()).as_bytes()).expect("noted");
        let text = if edit % 3 == 0 { "4x7".to_owned() } else { format!("{edit}u") };
        app.perform(Command::Enter { path: "stage.inductor.inductance", text }, &ctx);
        app.keep_up(&ctx);
        if edit % 97 == 0 {
            app.perform(Command::Save, &ctx);
            app.keep_up(&ctx);
        }
        std::thread::sleep(Duration::from_millis(u64::from(edit % 7)));
    }
}

fn edit_of(design: &Design) -> u32 {
    design.title.strip_prefix("edit ").and_then(|number| number.parse().ok()).unwrap_or(0)
}

/// Lets a process edit, kills it after a time, and looks at what it left. Returns whether a journal was there.
fn kill_one(folder: &Path, after: Duration) -> Result<bool, String> {
    let _ = fs::remove_dir_all(folder);
    fs::create_dir_all(folder).map_err(|e| e.to_string())?;
    file::save(&Design::default(), &design_file(folder)).map_err(|e| e.to_string())?;
    let mut child = Process::new(std::env::current_exe().map_err(|e| e.to_string())?)
        .args(["--exact", "window::keep::tests::edits_until_it_is_killed"])
        .env(EDIT_IN, folder)
        .stdout(Stdio::null())
        .stderr(Stdio::null())
        .spawn()
        .map_err(|e| e.to_string())?;
    let begun = Instant::now();
    while !log_file(folder).exists() && begun.elapsed() < Duration::from_mins(1) {
        std::thread::sleep(Duration::from_millis(1));
    }
    std::thread::sleep(after);
    let killed_ms = now_ms();
    // SIGKILL on Unix: nothing of the process runs after it.
    child.kill().map_err(|e| e.to_string())?;
    let ended = child.wait().map_err(|e| e.to_string())?;
    if ended.code().is_some() {
        return Err(format!("it ended by itself: {ended}"));
    }
    let saved = edit_of(&file::load(&design_file(folder)).map_err(|e| format!("the design file: {e}"))?);
    let left = find(&DataFolder::at(folder.join("data"))).map_err(|e| e.to_string())?;
    let mut journalled = 0;
    for left in &left {
        let content = left.content.as_ref().map_err(|e| format!("the journal: {e}"))?;
        journalled = journalled.max(edit_of(&content.snapshot.design));
    }
    let kept = saved.max(journalled);
    let log = fs::read_to_string(log_file(folder)).map_err(|e| e.to_string())?;
    let edits = log
        .lines()
        .filter_map(|line| line.split_once(' '))
        .filter_map(|(edit, ms)| Some((edit.parse::<u32>().ok()?, ms.parse::<u128>().ok()?)));
    let (mut last, mut first_lost_ms) = (0, None);
    for (edit, ms) in edits {
        last = edit;
        if edit > kept && first_lost_ms.is_none() {
            first_lost_ms = Some(ms);
        }
    }
    if last == 0 || kept > last {
        return Err(format!("edit {kept} was kept of {last}"));
    }
    let lost_ms = first_lost_ms.map_or(0, |ms| killed_ms.saturating_sub(ms));
    if lost_ms > LOST.as_millis() {
        return Err(format!("{lost_ms} ms of work were lost: {kept} of {last} edits kept, {saved} saved"));
    }
    Ok(!left.is_empty())
}

#[test]
fn of_a_hundred_processes_killed_at_random_none_loses_more_than_two_seconds_nor_a_file() {
    let folder = tempfile::tempdir().expect("a folder");
    let outcomes: Vec<Result<bool, String>> = std::thread::scope(|scope| {
        let run = |number: usize| {
            let own = folder.path().join(number.to_string());
            (0..ROUNDS)
                .map(|_| {
                    let random = std::collections::hash_map::RandomState::new().build_hasher().finish();
                    kill_one(&own, Duration::from_millis(random % 3000))
                })
                .collect::<Vec<_>>()
        };
        let threads: Vec<_> = (0..PROCESSES).map(|number| scope.spawn(move || run(number))).collect();
        threads.into_iter().flat_map(|thread| thread.join().expect("no panic")).collect()
    });
    let failures: Vec<&String> = outcomes.iter().filter_map(|outcome| outcome.as_ref().err()).collect();
    assert!(failures.is_empty(), "{failures:#?}");
    let journals = outcomes.iter().filter(|outcome| matches!(outcome, Ok(true))).count();
    assert_eq!(outcomes.len(), PROCESSES * ROUNDS);
    assert!(journals > PROCESSES * ROUNDS / 2, "only {journals} left a journal: the test tests little");
}

fn snapshot(title: &str) -> Snapshot {
    let design = Design { title: title.to_owned(), ..Design::default() };
    Snapshot { design, bad_texts: std::collections::BTreeMap::new(), path: None }
}

/// Journals in a data folder, however they came there.
fn journals(folder: &DataFolder) -> usize {
    let entries = fs::read_dir(folder.path().join("journals")).map(Iterator::collect::<Vec<_>>).unwrap_or_default();
    let journal = |entry: &std::io::Result<fs::DirEntry>| {
        entry.as_ref().is_ok_and(|entry| entry.path().extension().is_some_and(|extension| extension == "ron"))
    };
    entries.iter().filter(|entry| journal(entry)).count()
}

fn wait_for(what: &str, condition: impl Fn() -> bool) {
    let begun = Instant::now();
    while !condition() {
        assert!(begun.elapsed() < Duration::from_mins(1), "{what}");
        std::thread::sleep(Duration::from_millis(5));
    }
}

#[test]
fn the_journal_of_a_living_window_is_not_offered_and_that_of_a_dead_one_once() {
    let folder = tempfile::tempdir().expect("a folder");
    let data = DataFolder::at(folder.path().to_owned());
    let (one, two) = (Keeper::start(data.clone(), || {}), Keeper::start(data.clone(), || {}));
    let (one, two) = (one.expect("a thread"), two.expect("a thread"));
    one.journal(snapshot("one"));
    two.journal(snapshot("two"));
    wait_for("two journals", || journals(&data) == 2);
    assert!(find(&data).expect("readable").is_empty(), "both live");
    drop(one);
    let offered = find(&data).expect("readable");
    assert_eq!(offered.len(), 1);
    assert_eq!(offered[0].content.as_ref().expect("whole").snapshot, snapshot("one"));
    assert!(find(&data).expect("readable").is_empty(), "offered by one window, not by another");
    drop(offered);
    let offered = find(&data).expect("readable");
    assert_eq!(offered.len(), 1, "put off");
    two.done_with(offered);
    two.no_journal();
    drop(two);
    assert_eq!(fs::read_dir(folder.path().join("journals")).expect("there").count(), 0, "nothing stays");
}

#[test]
fn work_that_stands_in_its_file_is_not_offered() {
    let folder = tempfile::tempdir().expect("a folder");
    let data = DataFolder::at(folder.path().join("data"));
    let path = folder.path().join("design.ron");
    file::save(&Design::default(), &path).expect("saved");
    let keeper = Keeper::start(data.clone(), || {}).expect("a thread");
    keeper.journal(Snapshot { design: Design::default(), path: Some(path.clone()), ..snapshot("") });
    drop(keeper);
    assert_eq!(journals(&data), 1);
    assert!(find(&data).expect("readable").is_empty());
    assert_eq!(journals(&data), 0);

    let keeper = Keeper::start(data.clone(), || {}).expect("a thread");
    keeper.journal(Snapshot { path: Some(path), ..snapshot("changed") });
    drop(keeper);
    let left = find(&data).expect("readable");
    let content = left[0].content.as_ref().expect("whole");
    let differences = content.differences.as_ref().expect("compared");
    assert_eq!(differences.len(), 1);
    assert_eq!((differences[0].before.as_str(), differences[0].after.as_str()), ("Untitled", "changed"));
}

#[test]
fn a_broken_journal_is_told_and_stays_until_discarded() {
    let folder = tempfile::tempdir().expect("a folder");
    let data = DataFolder::at(folder.path().to_owned());
    let keeper = Keeper::start(data.clone(), || {}).expect("a thread");
    keeper.journal(snapshot("one"));
    drop(keeper);
    let journal = find(&data).expect("readable")[0].file.clone();
    let whole = fs::read(&journal).expect("there");
    for broken in [&whole[..whole.len() / 2], b"", b"\n", b"(journal:9)\n"] {
        fs::write(&journal, broken).expect("written");
        let left = find(&data).expect("readable");
        assert!(left[0].content.is_err());
        assert!(journal.exists());
    }
    let keeper = Keeper::start(data.clone(), || {}).expect("a thread");
    keeper.done_with(find(&data).expect("readable"));
    drop(keeper);
    assert!(!journal.exists());
}

#[test]
fn a_data_folder_that_cannot_be_written_is_told_once_and_tried_again() {
    let folder = tempfile::tempdir().expect("a folder");
    let blocked = folder.path().join("data");
    fs::write(&blocked, "a file where the folder should be").expect("written");
    let data = DataFolder::at(blocked.clone());
    let keeper = Keeper::start(data.clone(), || {}).expect("a thread");
    for round in 0..3 {
        keeper.journal(snapshot(&format!("round {round}")));
        keeper.recent(RecentChange::Used(PathBuf::from("/a.ron")));
        std::thread::sleep(Duration::from_millis(400));
    }
    let Some(News::Failed(text)) = keeper.news() else { panic!("it must be told") };
    assert!(text.contains("journalled") && text.contains("data"), "{text}");
    assert_eq!(keeper.news(), None, "told once");
    fs::remove_file(&blocked).expect("removed");
    wait_for("written at last", || journals(&data) == 1);
    wait_for("and told", || keeper.news() == Some(News::Mended));
    drop(keeper);
    let left = find(&data).expect("readable");
    assert_eq!(left[0].content.as_ref().expect("whole").snapshot, snapshot("round 2"));
}

#[test]
fn a_writer_without_work_writes_nothing() {
    let folder = tempfile::tempdir().expect("a folder");
    let data = DataFolder::at(folder.path().join("data"));
    let keeper = Keeper::start(data, || panic!("there is nothing to wake for")).expect("a thread");
    keeper.no_journal();
    drop(keeper);
    assert!(!folder.path().join("data").exists());
}
