//! Tests of design files: whole round trips, every kind of wrong file, the oldest file, saving.

use super::*;
use crate::design::Design;
use crate::design::{all_choices, all_entries};
use proptest::prelude::*;
use std::fs::File;
use std::path::{Path, PathBuf};

fn text_of(design: &Design) -> String {
    let mut bytes = Vec::new();
    write(design, &mut bytes).expect("a design made from the table can be written");
    String::from_utf8(bytes).expect("RON is UTF-8")
}

fn refused(text: impl AsRef<[u8]>) -> FileErrorKind {
    read(&mut text.as_ref()).expect_err("must be refused").kind
}

/// The wrong entries of an otherwise sound file whose line `from` is replaced.
fn wrong_entries(from: &str, to: &str) -> Vec<EntryError> {
    let text = text_of(&Design::default());
    assert!(text.contains(from), "{from} is not in\n{text}");
    match refused(text.replace(from, to)) {
        FileErrorKind::Entries(entries) => entries,
        other => panic!("{other:?}"),
    }
}

#[test]
fn a_file_is_readable_by_people() {
    let mut design = Design { title: "Rail".into(), ..Design::default() };
    design.set_from_text("stage.inductor.inductance", "8.2u").expect("a number");
    design.locks.insert("compensator.r2".into());
    design.aims.set("zero-1", 1500.0).expect("finite");
    let text = text_of(&design);
    assert!(text.starts_with("(\n    format: 1,\n    title: \"Rail\",\n"), "{text}");
    assert!(text.contains("\n        \"stage.inductor.inductance\": \"8.2 µH\",\n"), "{text}");
    assert!(text.contains("\"zero-1\": \"1.5 kHz\""), "{text}");
    assert_eq!(read(&mut text.as_bytes()).expect("its own file"), design);
}

#[test]
fn bom_and_comments_and_other_line_ends_are_taken() {
    let design = Design::default();
    let text = format!("\u{feff}// kept by hand\n{}", text_of(&design)).replace('\n', "\r\n");
    assert_eq!(read(&mut text.as_bytes()).expect("readable"), design);
}

#[test]
fn absent_notes_locks_aims_and_choices_have_defaults() {
    let design = read(&mut "(format: 1, title: \"T\", choices: {}, values: {})".as_bytes()).expect("short but sound");
    assert_eq!(design.title, "T");
    assert!(design.values.is_empty());
    for choice in all_choices().filter(|choice| crate::converter::is_common(choice.path)) {
        assert_eq!(design.choices.get(choice.path), Some(choice.default));
    }
    let problems = design.check().expect_err("nothing is entered");
    assert!(problems.iter().all(|p| p.is_problem() && p.hint.is_some()), "{problems:?}");
    assert!(problems.iter().any(|p| p.place == "stage.inductor.inductance"));
}

#[test]
fn wrong_files_say_what_is_wrong() {
    let whole = text_of(&Design::default());
    assert_eq!(refused(""), FileErrorKind::Empty);
    assert_eq!(refused(" \n\t\n"), FileErrorKind::Empty);
    assert_eq!(refused([0xFF, 0xFE, b'(', 0]), FileErrorKind::Utf16);
    assert_eq!(refused(b"(\nformat: 1,\ntitle: \"K\xf6nig\")"), FileErrorKind::NotText { line: 3 });
    assert_eq!(refused(b"(\nformat\0"), FileErrorKind::NulByte { line: 2 });
    assert_eq!(refused(whole.replacen("format: 1", "format: 2", 1)), FileErrorKind::Newer { format: 2 });
    assert_eq!(refused("(format: 7, whatever: [1, 2], title: (3, \"x\"))"), FileErrorKind::Newer { format: 7 });
    assert_eq!(refused(whole.replacen("format: 1", "format: 0", 1)), FileErrorKind::NoSuchFormat { format: 0 });

    let syntax = |text: &str, line: usize, hint: &str| match refused(text) {
        FileErrorKind::Syntax { line: at, hint: given, reason, .. } => {
            assert!(!reason.is_empty());
            assert_eq!(at, line, "{reason}");
            assert!(given.contains(hint), "{reason}: {given}");
        }
        other => panic!("{other:?}"),
    };
    syntax("just words\n", 1, "RON text");
    syntax(&whole.replacen("title:", "titel:", 1), 3, "misspelt");
    syntax(&whole.replacen("    title:", "    extra: 5,\n    title:", 1), 3, "misspelt");
    syntax("(\n    format: 1,\n    title: 5,\n    choices: {},\n    values: {},\n)", 3, "as text");
    syntax("(\nformat: 1,\ntitle: \"\",\nchoices: {},\nvalues: {\n\"stage.output.voltage\": 24.0})", 6, "\"10 µH\"");
    syntax("(format: 1, title: \"\")", 1, "every design file has");
    syntax(&whole.replacen("    notes:", "    title: \"again\",\n    notes:", 1), 4, "one of the two");
    let twice = whole.replacen("    values: {\n", "    values: {\n        \"stage.load.least\": \"1 A\",\n", 1);
    assert!(matches!(refused(twice), FileErrorKind::Syntax { reason, hint, .. }
        if reason.contains("stands twice") && hint == "keep one of the two"));
}

#[test]
fn no_word_of_the_libraries_reaches_the_user() {
    let deep = format!("(format: 1, title: {}", "[".repeat(1000));
    let texts = [
        &deep,
        "(title: \"\")",
        "hello",
        "{}",
        "[1, 2]",
        "(1, 2)",
        "Other(format: 1)",
        "(format: -1)",
        "(format: 1.5)",
        "(format: \"1\")",
        "(format: 1, titel: \"\")",
        "(format: 1, title: \"\")",
        "(format: 1, title: \"",
        "(format: 1) /*",
        "(format: 1, title: \"\", choices: [], values: {})",
        "(format: 1, title: \"\", choices: {}, values: {}) more",
        "(format: 1, title: \"\", title: \"\", choices: {}, values: {})",
        "(format: 1, title: \"\\q\")",
        "(format: 1, title: \"\", locks: \"x\")",
        "#![enable(that)](format: 1)",
    ];
    for text in texts {
        let error = FileError::from(refused(text));
        let said = error.to_string();
        assert!(error.kind.line().is_some(), "{said}");
        for word in ["Head", "struct", "ron::", "serde", "Unexpected", "identifier", "DesignV1", "see the message", "`"]
        {
            assert!(!said.contains(word), "{text:.60}: {said}");
        }
    }
}

#[test]
fn a_file_cut_anywhere_is_refused() {
    let whole = text_of(&Design::default());
    let end = whole.rfind(')').expect("closes");
    for cut in (1..end).step_by(17).filter(|cut| whole.is_char_boundary(*cut)) {
        assert!(read(&mut &whole.as_bytes()[..cut]).is_err(), "cut at {cut}");
    }
}

#[test]
fn wrong_entries_name_line_path_reason_and_hint() {
    let slip = wrong_entries("\"stage.inductor.inductance\"", "\"stage.inductor.inductence\"");
    assert_eq!(slip[0].entry, "stage.inductor.inductence");
    assert_eq!(slip[0].hint, "did you mean stage.inductor.inductance?");
    assert!(slip[0].line.is_some_and(|line| line > 5));

    let option = wrong_entries("\"stage.topology\": \"boost\"", "\"stage.topology\": \"boots\"");
    assert!(option[0].reason.contains("boots") && option[0].hint.contains("did you mean boost"), "{option:?}");

    for (text, reason) in [
        ("NaN", "not a number"),
        ("inf", "not a number"),
        ("1e999 V", "too large"),
        ("24,0 V", "comma"),
        ("24 A", "a current in A"),
        ("", "nothing is entered"),
    ] {
        let wrong =
            wrong_entries("\"stage.output.voltage\": \"24 V\"", &format!("\"stage.output.voltage\": \"{text}\""));
        assert_eq!(wrong.len(), 1);
        assert!(wrong[0].reason.contains(reason) && !wrong[0].hint.is_empty(), "{wrong:?}");
    }

    let text = text_of(&Design::default()).replace("Ω\"", "F\"");
    let FileErrorKind::Entries(all) = refused(text) else { panic!("wrong units are wrong entries") };
    assert!(all.len() > 3, "all are reported at once");
}

#[test]
fn deep_and_huge_files_are_refused() {
    for deep in ["(format: 1, title: ", "(format: 1, locks: "] {
        let text = format!("{deep}{}", "[".repeat(200_000));
        assert!(matches!(refused(&text), FileErrorKind::Syntax { .. }));
    }
    let nested = format!("(title: {}{}, format: 1)", "[".repeat(50_000), "]".repeat(50_000));
    assert!(matches!(refused(&nested), FileErrorKind::Syntax { hint, .. } if hint.contains("nested")));
    let mut endless = std::io::repeat(b'(');
    assert_eq!(read(&mut endless).expect_err("endless").kind, FileErrorKind::TooLarge);
}

#[test]
fn files_that_cannot_be_opened_are_named() {
    let folder = tempfile::tempdir().expect("a folder");
    let missing = load(&folder.path().join("none.ron")).expect_err("missing");
    assert_eq!(missing.kind, FileErrorKind::Missing);
    assert!(missing.to_string().contains("none.ron"));
    assert!(matches!(load(folder.path()).expect_err("a folder").kind, FileErrorKind::Folder));

    let large = folder.path().join("large.ron");
    File::create(&large).and_then(|file| file.set_len(100 << 20)).expect("sparse file of 100 MB");
    assert_eq!(load(&large).expect_err("large").kind, FileErrorKind::TooLarge);
}

#[test]
fn the_oldest_file_of_format_1_opens() {
    let old =
        load(&PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("tests/designs/format-1.ron")).expect("opens for ever");
    assert_eq!(old.title, "Format 1, kept for ever");
    assert_eq!(old.notes.lines().count(), 2);
    assert_eq!(old.choices.get("stage.topology"), Some("boost"));
    let held =
        |path: &str, value: f64| assert_eq!(old.values.get(path).map(f64::to_bits), Some(value.to_bits()), "{path}");
    held("stage.inductor.inductance", 10e-6);
    held("stage.bank.2.esl", 800e-12);
    held("stage.bank.2.remaining", 0.55);
    held("compensator.c1", 56e-9);
    held("event.load-step.change", -0.5);
    held("event.load-step.slew", 1e6);
    held("requirement.crossover.greatest.worst", 15e3);
    assert_eq!(old.values.len(), 61);
    assert!(old.locks.contains("compensator.divider.upper"));
    assert_eq!(old.aims.get("zero-1").map(f64::to_bits), Some(1300.0_f64.to_bits()));
    old.check().expect("usable as it stands");
}

#[test]
fn saving_replaces_the_file_and_keeps_what_it_is() {
    let folder = tempfile::tempdir().expect("a folder");
    let path = folder.path().join("design.ron");
    let mut design = Design::default();
    save(&design, &path).expect("a new file");
    assert_eq!(load(&path).expect("saved"), design);
    design.title = "second".into();
    save(&design, &path).expect("the same file");
    assert_eq!(load(&path).expect("saved"), design);
    assert_eq!(std::fs::read_dir(folder.path()).expect("folder").count(), 1, "no temporary file stays");
}

#[cfg(unix)]
#[test]
fn saving_keeps_permissions_and_links_and_respects_read_only() {
    use std::fs;
    use std::os::unix::fs::{PermissionsExt, symlink};
    let folder = tempfile::tempdir().expect("a folder");
    let (path, link) = (folder.path().join("design.ron"), folder.path().join("link.ron"));
    save(&Design::default(), &path).expect("a new file");
    let mode = |path: &Path| fs::metadata(path).expect("there").permissions().mode() & 0o777;
    assert_ne!(mode(&path) & 0o044, 0, "a new file is not private");
    fs::set_permissions(&path, fs::Permissions::from_mode(0o640)).expect("mode");
    symlink("design.ron", &link).expect("link");
    let design = Design { title: "through the link".into(), ..Design::default() };
    save(&design, &link).expect("through the link");
    assert!(fs::symlink_metadata(&link).expect("there").is_symlink());
    assert_eq!(load(&path).expect("saved").title, "through the link");
    assert_eq!(mode(&path), 0o640);

    fs::set_permissions(&path, fs::Permissions::from_mode(0o440)).expect("mode");
    let error = save(&Design::default(), &path).expect_err("read-only");
    assert!(error.to_string().contains("read-only"), "{error}");
    assert_eq!(load(&path).expect("untouched").title, "through the link");

    symlink("round.ron", folder.path().join("round.ron")).expect("link");
    assert!(save(&design, &folder.path().join("round.ron")).is_err());
}

#[test]
fn saving_into_a_missing_folder_names_the_folder() {
    let folder = tempfile::tempdir().expect("a folder");
    let error = save(&Design::default(), &folder.path().join("no-such-folder/design.ron")).expect_err("no folder");
    assert_eq!(error.kind, FileErrorKind::NoFolder { folder: folder.path().join("no-such-folder") });
    let said = error.to_string();
    assert!(said.contains("does not exist") && !said.contains(".polewright-") && !said.contains("old file"), "{said}");
}

#[cfg(unix)]
#[test]
fn a_device_is_neither_read_nor_replaced() {
    let device = Path::new("/dev/null");
    assert_eq!(load(device).expect_err("a device").kind, FileErrorKind::NotAFile);
    let error = save(&Design::default(), device).expect_err("a device");
    assert!(error.to_string().contains("device"), "{error}");
}

fn any_design() -> impl Strategy<Value = Design> {
    let numbers = proptest::collection::vec(proptest::option::of(any::<f64>()), all_entries().count());
    let keys = proptest::collection::vec(any::<usize>(), all_choices().count());
    ("(\\PC|\t|\"#|\0){0,40}", "(\\PC|\n|\r|\"|\\\\){0,80}", numbers, keys).prop_map(|(title, notes, numbers, keys)| {
        let mut design = Design { title, notes, ..Design::default() };
        for (row, number) in all_entries().zip(numbers) {
            design.values.remove(row.path);
            if let Some(number) = number {
                let _ = design.values.set(row.path, number);
                design.locks.insert(row.path.to_owned());
            }
        }
        for (row, key) in all_choices().zip(keys) {
            design.choices.set(row.path, row.options[key % row.options.len()].key);
        }
        design
    })
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(64))]

    #[test]
    fn any_design_survives_its_file_bit_for_bit(design in any_design()) {
        let back = read(&mut text_of(&design).as_bytes()).map_err(|e| TestCaseError::fail(e.to_string()))?;
        let bits = |d: &Design| d.values.iter().map(|(p, v)| (p.to_owned(), v.to_bits())).collect::<Vec<_>>();
        prop_assert_eq!(bits(&back), bits(&design));
        prop_assert_eq!(back, design);
    }

    #[test]
    fn checking_any_design_never_panics(design in any_design()) {
        if let Err(problems) = design.check() {
            prop_assert!(!problems.is_empty());
            prop_assert!(problems.iter().all(|problem| problem.is_problem() && !problem.message.is_empty()));
        }
    }

    #[test]
    fn no_bytes_panic(bytes in proptest::collection::vec(any::<u8>(), 0..200)) {
        let _ = read(&mut bytes.as_slice());
    }
}
