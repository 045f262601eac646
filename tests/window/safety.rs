//! Work safety in the window: work left behind, recent files, files that change under it, and how it looked at the last start.

use std::path::{Path, PathBuf};
use std::time::{Duration, Instant};

use eframe::egui::{Key, Modifiers, Role, ThemePreference, ViewportEvent, ViewportId, vec2};
use egui_kittest::Harness;
use egui_kittest::kittest::Queryable;
use polewright::design::{Design, file, sample};
use polewright::window::{App, Command, Curve, DataFolder};

use super::{enter, field, value};

/// A folder of designs and a data folder, gone after the test.
struct Place {
    folder: tempfile::TempDir,
}

impl Place {
    fn new() -> Self {
        let place = Place { folder: tempfile::tempdir().unwrap() };
        file::save(&sample::built_in(), &place.file("rail.ron")).unwrap();
        place
    }

    fn file(&self, name: &str) -> PathBuf {
        self.folder.path().join(name)
    }

    fn data(&self) -> PathBuf {
        self.file("data")
    }

    /// A window that keeps its things here, on one of the files here.
    fn window(&self, name: Option<&str>) -> Harness<'static, App> {
        let path = name.map(|name| self.file(name));
        let design = path.as_ref().map_or_else(sample::built_in, |path| file::load(path).unwrap());
        let data = DataFolder::at(self.data());
        let mut harness = Harness::builder()
            .with_size(vec2(1280.0, 800.0))
            // Threads wake the window whenever they have news.
            .with_max_steps(64)
            .build_eframe(|cc| App::keeping(&cc.egui_ctx, design, path, data));
        harness.run();
        harness
    }

    fn journals(&self) -> usize {
        let entries = std::fs::read_dir(self.data().join("journals")).map(Iterator::collect::<Vec<_>>);
        let journal = |path: PathBuf| path.extension().is_some_and(|extension| extension == "ron");
        entries.unwrap_or_default().iter().filter(|entry| journal(entry.as_ref().unwrap().path())).count()
    }
}

/// Goes on until something is so; threads look and write meanwhile.
fn wait(harness: &mut Harness<'static, App>, what: &str, condition: impl Fn(&Harness<'static, App>) -> bool) {
    let begun = Instant::now();
    loop {
        harness.run();
        if condition(harness) {
            return;
        }
        assert!(begun.elapsed() < Duration::from_mins(1), "waited in vain: {what}");
        std::thread::sleep(Duration::from_millis(10));
    }
}

fn shows(harness: &Harness<'_, App>, text: &str) -> bool {
    harness.query_all_by_label_contains(text).next().is_some()
}

fn click(harness: &mut Harness<'static, App>, label: &str) {
    harness.get_by_label(label).click();
    harness.run();
}

fn ask(harness: &mut Harness<'static, App>, command: Command) {
    harness.state_mut().ask(command);
    harness.run();
}

fn message(harness: &Harness<'_, App>) -> String {
    harness.state().message().map(|message| message.text.clone()).unwrap_or_default()
}

/// Leaves a window with unsaved work behind, as a crash does: nobody closes it.
fn leave_unsaved(place: &Place) {
    let mut harness = place.window(Some("rail.ron"));
    enter(&mut harness, "Inductor", "12u");
    enter(&mut harness, "Winding resistance", "4x7");
    // Typed, and not taken over by Enter.
    field(&harness, "Title").focus();
    harness.run();
    field(&harness, "Title").type_text("half a ti");
    harness.run();
    drop(harness);
    assert_eq!(place.journals(), 1);
}

fn offered(harness: &mut Harness<'static, App>) {
    wait(harness, "the offer", |harness| shows(harness, "Unsaved work was left behind"));
}

#[test]
fn work_left_behind_is_offered_with_its_differences_and_recovered() {
    let place = Place::new();
    leave_unsaved(&place);
    let mut harness = place.window(None);
    offered(&mut harness);
    assert!(shows(&harness, "less than a minute ago"));
    assert!(shows(&harness, &place.file("rail.ron").display().to_string()));
    assert!(shows(&harness, "12 µH; in its file 10 µH"));
    assert!(shows(&harness, "the text “4x7”"));
    harness.check_accessibility();
    click(&mut harness, "Recover");

    let session = harness.state().session();
    assert!(session.unsaved());
    assert_eq!(session.path(), Some(&place.file("rail.ron")));
    assert!((value(&harness, "stage.inductor.inductance") - 12e-6).abs() < 1e-15);
    assert!(session.design().title.contains("half a ti"), "{}", session.design().title);
    assert!(session.bad_texts().any(|bad| bad.text == "4x7" && !bad.finding.message.is_empty()));
    assert_eq!(file::load(&place.file("rail.ron")).unwrap(), sample::built_in(), "the file is as it was");

    // A second crash right away loses nothing either.
    drop(harness);
    assert_eq!(place.journals(), 1);
    let mut harness = place.window(None);
    offered(&mut harness);
    click(&mut harness, "Recover");
    ask(&mut harness, Command::Save);
    enter(&mut harness, "Winding resistance", "5m");
    ask(&mut harness, Command::Save);
    assert!(!harness.state().session().unsaved());
    wait(&mut harness, "the journal goes with the save", |_| place.journals() == 0);
    let saved = file::load(&place.file("rail.ron")).unwrap();
    assert!((saved.values.get("stage.inductor.inductance").unwrap() - 12e-6).abs() < 1e-15);
}

#[test]
fn an_offer_can_be_put_off_and_turned_down() {
    let place = Place::new();
    leave_unsaved(&place);
    let mut harness = place.window(None);
    offered(&mut harness);
    click(&mut harness, "Not now");
    assert!(!shows(&harness, "Unsaved work was left behind"));
    assert!(message(&harness).contains("stays kept"));
    assert_eq!(place.journals(), 1);

    // The menu offers it again.
    click(&mut harness, "Design");
    click(&mut harness, "Recover unsaved work…");
    offered(&mut harness);
    click(&mut harness, "Discard");
    assert_eq!(place.journals(), 1, "a second word is asked for");
    click(&mut harness, "Discard for good");
    wait(&mut harness, "discarded", |_| place.journals() == 0);
    assert!(!shows(&harness, "Unsaved work was left behind"));
    ask(&mut harness, Command::FindUnsaved);
    wait(&mut harness, "told", |harness| message(harness).contains("No unsaved work"));
}

#[test]
fn recovering_asks_before_it_ends_unsaved_work_here() {
    let place = Place::new();
    leave_unsaved(&place);
    let mut harness = place.window(None);
    offered(&mut harness);
    click(&mut harness, "Not now");
    enter(&mut harness, "Inductor", "15u");
    ask(&mut harness, Command::FindUnsaved);
    offered(&mut harness);
    click(&mut harness, "Recover");
    assert!(shows(&harness, "There are unsaved changes"));
    click(&mut harness, "Discard changes");
    assert!((value(&harness, "stage.inductor.inductance") - 12e-6).abs() < 1e-15);
    wait(&mut harness, "one journal, of the recovered work", |_| place.journals() == 1);
}

#[test]
fn a_broken_journal_is_told_and_nothing_panics() {
    let place = Place::new();
    let journals = place.data().join("journals");
    std::fs::create_dir_all(&journals).unwrap();
    std::fs::write(journals.join("1-1-0.ron"), "(journal:1,wri").unwrap();
    std::fs::write(journals.join("1-2-0.ron"), b"(journal:7)\nwhat is to come").unwrap();
    std::fs::create_dir(journals.join("1-3-0.ron")).unwrap();
    let mut harness = place.window(None);
    offered(&mut harness);
    assert!(shows(&harness, "ends too early") && shows(&harness, "later release") && shows(&harness, "not a file"));
    assert!(harness.query_by_label("Recover").is_none());
    harness.key_press(Key::Escape);
    harness.run();
    assert!(!shows(&harness, "Unsaved work was left behind"));
    assert_eq!(place.journals(), 3);
}

#[test]
fn undoing_everything_removes_the_journal() {
    let place = Place::new();
    let mut harness = place.window(Some("rail.ron"));
    enter(&mut harness, "Inductor", "12u");
    wait(&mut harness, "a journal", |_| place.journals() == 1);
    ask(&mut harness, Command::Undo);
    wait(&mut harness, "no journal", |_| place.journals() == 0);
}

#[test]
fn an_idle_window_that_keeps_things_asks_for_no_frame_and_writes_nothing() {
    let place = Place::new();
    let mut harness = place.window(Some("rail.ron"));
    enter(&mut harness, "Inductor", "12u");
    wait(&mut harness, "a journal", |_| place.journals() == 1);
    let content = || {
        let mut files = Vec::new();
        for folder in [place.data(), place.data().join("journals")] {
            for entry in std::fs::read_dir(folder).unwrap() {
                let entry = entry.unwrap();
                files.push((entry.path(), entry.metadata().unwrap().modified().unwrap()));
            }
        }
        files.sort();
        files
    };
    std::thread::sleep(Duration::from_millis(1500));
    harness.run_steps(3);
    let before = content();
    std::thread::sleep(Duration::from_millis(2500));
    harness.run_steps(3);
    assert_eq!(content(), before);
    let output = harness.output();
    let delay = output.viewport_output.values().map(|viewport| viewport.repaint_delay).min().unwrap();
    assert!(delay > Duration::from_secs(10), "{delay:?}");
}

#[test]
fn closing_asks_for_what_is_still_being_typed() {
    let place = Place::new();
    let mut harness = place.window(Some("rail.ron"));
    field(&harness, "Inductor").focus();
    harness.run();
    field(&harness, "Inductor").type_text("4k7x");
    harness.run();
    harness.input_mut().viewports.entry(ViewportId::ROOT).or_default().events.push(ViewportEvent::Close);
    harness.run();
    assert!(shows(&harness, "There are unsaved changes"));
    assert!(harness.state().session().bad_texts().any(|bad| bad.text.contains("4k7x")));
}

/// The list of recent files in the menu opens under the pointer.
fn open_recent(harness: &mut Harness<'static, App>) {
    click(harness, "Design");
    harness.get_by_label_contains("Recent files").hover();
    harness.run();
}

#[test]
fn recent_files_are_kept_and_missing_ones_marked_and_removed() {
    let place = Place::new();
    let second = Design { title: "Second rail".to_owned(), ..sample::built_in() };
    file::save(&second, &place.file("second.ron")).unwrap();
    let mut harness = place.window(Some("rail.ron"));
    ask(&mut harness, Command::OpenPath(place.file("second.ron")));
    drop(harness);
    std::fs::remove_file(place.file("rail.ron")).unwrap();

    let mut harness = place.window(None);
    open_recent(&mut harness);
    assert!(shows(&harness, "second.ron") && shows(&harness, "rail.ron"));
    let remove = "Remove rail.ron from the recent files";
    wait(&mut harness, "marked", |harness| shows(harness, "not there") && harness.query_by_label(remove).is_some());
    assert!(harness.query_by_label("Remove second.ron from the recent files").is_none());
    click(&mut harness, remove);
    open_recent(&mut harness);
    assert!(harness.query_by_role_and_label(Role::Button, "rail.ron").is_none());
    click(&mut harness, "second.ron");
    assert_eq!(harness.state().session().design().title, "Second rail");

    // In the list of commands as well.
    ask(&mut harness, Command::OpenSample(sample::all()[0].file));
    harness.key_press_modifiers(Modifiers::COMMAND, Key::K);
    harness.run();
    field(&harness, "Search a command").type_text("second");
    harness.run();
    click(&mut harness, "Open second.ron");
    assert_eq!(harness.state().session().path(), Some(&place.file("second.ron")));
    ask(&mut harness, Command::ForgetAllRecent);
    drop(harness);
    let mut harness = place.window(None);
    open_recent(&mut harness);
    assert!(shows(&harness, "No file was opened or saved yet."));
}

#[test]
fn the_window_looks_as_it_was_left() {
    let place = Place::new();
    let mut harness = place.window(None);
    ask(&mut harness, Command::Theme(ThemePreference::Dark));
    ask(&mut harness, Command::ToggleReadouts);
    ask(&mut harness, Command::Toggle(Curve::Plant));
    ask(&mut harness, Command::Larger);
    click(&mut harness, "Line step");
    drop(harness);
    let mut harness = place.window(None);
    assert!(harness.ctx.options(|options| options.theme_preference) == ThemePreference::Dark);
    assert!((harness.ctx.zoom_factor() - 1.1).abs() < 1e-6);
    assert!(harness.query_by_role_and_label(Role::TextInput, "Inductor").is_some());
    let settings = std::fs::read_to_string(place.data().join("settings.ron")).unwrap();
    for line in ["readout_column: false", "plant: false", "event: line", "colours: dark"] {
        assert!(settings.contains(line), "{line}: {settings}");
    }
    ask(&mut harness, Command::NormalSize);
    drop(harness);

    std::fs::write(place.data().join("settings.ron"), "(look: (plan").unwrap();
    let harness = place.window(None);
    assert!(message(&harness).contains("settings.ron"), "{}", message(&harness));
    drop(harness);
    let settings = std::fs::read_to_string(place.data().join("settings.ron")).unwrap();
    assert!(settings.contains("plant: true"), "{settings}");
}

fn change_elsewhere(path: &Path, henries: f64) {
    let mut design = file::load(path).unwrap();
    design.values.set("stage.inductor.inductance", henries).unwrap();
    file::save(&design, path).unwrap();
}

#[test]
fn a_change_on_disk_is_noticed_and_reloaded_as_one_step() {
    let place = Place::new();
    let path = place.file("rail.ron");
    let mut harness = place.window(Some("rail.ron"));
    change_elsewhere(&path, 22e-6);
    wait(&mut harness, "the notice", |harness| shows(harness, "rail.ron was changed by another program."));
    assert!(harness.state().session().unsaved(), "what stands here is in no file any more");
    harness.check_accessibility();
    click(&mut harness, "Reload");
    assert!((value(&harness, "stage.inductor.inductance") - 22e-6).abs() < 1e-15);
    assert!(!harness.state().session().unsaved() && !shows(&harness, "another program"));
    click(&mut harness, "Undo");
    assert!((value(&harness, "stage.inductor.inductance") - 10e-6).abs() < 1e-15);
    assert!(harness.state().session().unsaved());
    assert_eq!(harness.state().session().history().undo_name(), None, "one step");
}

#[test]
fn my_own_design_can_be_kept_and_then_saved() {
    let place = Place::new();
    let path = place.file("rail.ron");
    let mut harness = place.window(Some("rail.ron"));
    enter(&mut harness, "Inductor", "12u");
    change_elsewhere(&path, 22e-6);
    wait(&mut harness, "the notice", |harness| shows(harness, "changed by another program."));
    click(&mut harness, "Keep mine");
    assert!(!shows(&harness, "another program") && harness.state().session().unsaved());
    ask(&mut harness, Command::Save);
    assert!(!harness.state().session().unsaved());
    let saved = file::load(&path).unwrap();
    assert!((saved.values.get("stage.inductor.inductance").unwrap() - 12e-6).abs() < 1e-15);
}

#[test]
fn saving_over_a_file_that_changed_asks_first() {
    let place = Place::new();
    let path = place.file("rail.ron");
    let mut harness = place.window(Some("rail.ron"));
    enter(&mut harness, "Inductor", "12u");
    // Saved before the watch has looked: the file itself is asked.
    change_elsewhere(&path, 22e-6);
    ask(&mut harness, Command::Save);
    assert!(shows(&harness, "The file was changed by another program"));
    let on_disk = || file::load(&path).unwrap().values.get("stage.inductor.inductance").unwrap();
    assert!((on_disk() - 22e-6).abs() < 1e-15, "not replaced yet");
    click(&mut harness, "Cancel");
    assert!((on_disk() - 22e-6).abs() < 1e-15);
    ask(&mut harness, Command::Save);
    click(&mut harness, "Save over it");
    assert!((on_disk() - 12e-6).abs() < 1e-15);
    assert!(!harness.state().session().unsaved());
}

#[test]
fn a_file_that_vanished_is_told_and_the_work_kept() {
    let place = Place::new();
    let path = place.file("rail.ron");
    let mut harness = place.window(Some("rail.ron"));
    std::fs::remove_file(&path).unwrap();
    wait(&mut harness, "the notice", |harness| shows(harness, "The work is kept here."));
    assert!(harness.state().session().unsaved());
    wait(&mut harness, "a journal", |_| place.journals() == 1);
    click(&mut harness, "Save again");
    assert_eq!(file::load(&path).unwrap(), sample::built_in());
    assert!(!harness.state().session().unsaved() && !shows(&harness, "The work is kept here."));

    std::fs::write(&path, "(format: 1, title: \"half").unwrap();
    // A look may fall between emptying and writing the file; the next one sees all of it.
    wait(&mut harness, "the notice", |harness| {
        shows(harness, "cannot be read now") && shows(harness, "opened with a quotation mark and never closed")
    });
}

#[test]
fn a_data_folder_that_cannot_be_used_is_told_and_work_goes_on() {
    let place = Place::new();
    std::fs::write(place.data(), "no folder").unwrap();
    let mut harness = place.window(Some("rail.ron"));
    enter(&mut harness, "Inductor", "12u");
    wait(&mut harness, "told", |harness| message(harness).contains("cannot be journalled"));
    click(&mut harness, "Close");
    enter(&mut harness, "Inductor", "13u");
    std::thread::sleep(Duration::from_millis(700));
    harness.run();
    assert_eq!(message(&harness), "", "told once");
    ask(&mut harness, Command::Save);
    assert!(!harness.state().session().unsaved());
}

#[test]
fn the_hint_is_shown_until_it_was_closed_once() {
    let place = Place::new();
    let mut harness = place.window(None);
    assert!(harness.state().hinting());
    click(&mut harness, "Got it");
    wait(&mut harness, "the settings are written", |_| {
        std::fs::read_to_string(place.data().join("settings.ron")).is_ok_and(|text| text.contains("hint_closed: true"))
    });
    drop(harness);
    let mut harness = place.window(None);
    assert!(!harness.state().hinting());
    ask(&mut harness, Command::Hint(true));
    assert!(harness.state().hinting());
}
