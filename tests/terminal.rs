//! The program from outside: what it prints, how it ends, what it leaves on disk.
//!
//! Runs the built binary on samples and on every kind of wrong input, and kills a process that saves. Needs no display.
#![expect(clippy::expect_used, clippy::panic, reason = "a test may stop at a wrong value")]

use polewright::analysis::{Level, Request, Shown, analyse};
use polewright::design::file::{load, save};
use polewright::design::{Design, sample};
use serde_json::Value;
use std::collections::{BTreeMap, BTreeSet};
use std::fs;
use std::io::{BufRead, BufReader};
use std::path::{Path, PathBuf};
use std::process::{Command, Output, Stdio};

#[path = "terminal/switched.rs"]
mod switched;

#[path = "terminal/transient.rs"]
mod transient;

fn program() -> Command {
    let mut command = Command::new(env!("CARGO_BIN_EXE_polewright"));
    command.stdin(Stdio::null());
    for name in ["DISPLAY", "WAYLAND_DISPLAY", "WAYLAND_SOCKET"] {
        command.env_remove(name);
    }
    command
}

fn check(arguments: &[&str]) -> Output {
    program().arg("check").args(arguments).output().expect("the program runs")
}

fn code(output: &Output) -> i32 {
    output.status.code().expect("ended by itself")
}

fn text(bytes: &[u8]) -> &str {
    std::str::from_utf8(bytes).expect("UTF-8")
}

fn json(output: &Output) -> Vec<Value> {
    match serde_json::from_slice(&output.stdout).expect("valid JSON") {
        Value::Array(objects) => objects,
        other => panic!("not an array: {other}"),
    }
}

fn sample_path(file: &str) -> String {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("sample-designs").join(file);
    path.to_str().expect("UTF-8").to_owned()
}

fn number(value: &Value) -> f64 {
    value.as_f64().unwrap_or_else(|| panic!("{value} is no number"))
}

/// Exit code expected of each sample: two of them miss something on purpose.
fn expected_code(file: &str) -> i32 {
    i32::from(matches!(file, "trail-radio.ron" | "bench-exercise.ron"))
}

#[test]
fn every_sample_is_reported_as_json_and_as_text() {
    for sample in sample::all() {
        let path = sample_path(sample.file);
        let output = check(&[&path, "--json"]);
        assert_eq!(code(&output), expected_code(sample.file), "{}", sample.file);
        let objects = json(&output);
        assert_eq!(objects.len(), 1);
        let object = &objects[0];
        assert_eq!(object["title"], sample.title);
        assert_eq!(object["conditions"].as_array().map(Vec::len), Some(9));
        assert_eq!(object["loop"]["stable"], sample.file != "bench-exercise.ron", "{}", sample.file);
        assert!(object["operating_point"]["duty"].is_f64() && object["inductors"][0]["peak"].is_f64());
        let last = object["response"].as_array().and_then(|rows| rows.last()).expect("a response");
        assert!(last.as_object().expect("an object").values().all(Value::is_f64), "{last}");

        let output = check(&[&path]);
        let report = text(&output.stdout);
        for heading in [sample.title, "Operating point", "Landmarks", "Loop", "Requirements"] {
            assert!(report.contains(heading), "{heading} is not in\n{report}");
        }
        assert_eq!(text(&output.stderr), "");
    }
}

#[test]
fn the_worst_of_all_files_counts_and_every_file_has_its_object() {
    let files = ["gimbal-rail.ron", "bench-exercise.ron"].map(sample_path);
    let missing = sample_path("none.ron");
    let output = check(&[&files[0], &missing, &files[1], "--json"]);
    assert_eq!(code(&output), 2);
    let objects = json(&output);
    let statuses: Vec<&str> = objects.iter().filter_map(|object| object["status"].as_str()).collect();
    assert_eq!(statuses, ["met", "unusable", "not met"]);
    assert_eq!(objects[1]["title"], Value::Null);
    assert_eq!(objects[1]["findings"][0]["severity"], "problem");
    assert_eq!(code(&check(&[&files[0], &files[1]])), 1);
    assert_eq!(code(&check(&[&files[0]])), 0);
}

#[test]
fn an_unstable_loop_says_so_with_frequency_and_growth_and_has_no_figures() {
    let path = sample_path("bench-exercise.ron");
    let object = json(&check(&[&path, "--json"])).remove(0);
    assert_eq!(object["loop"]["stable"], false);
    assert_eq!(object["loop"]["delay_margin_s"], Value::Null);
    assert_eq!(object["load_step"]["deviation_v"], Value::Null);
    assert_eq!(object["load_step"]["settling_s"], Value::Null);
    assert!(text(&check(&[&path]).stdout).contains("UNSTABLE: oscillation at 8.3"));
    // Without a requirement an oscillator still is not met.
    assert_eq!(code(&check(&[&path, "--set", "requirement.phase-margin.nominal="])), 1);
}

/// The definition put back: at each crossover the loop gain is 0 dB and its phase is the margin less 180°, whole turns apart.
#[test]
fn margins_meet_their_definition_in_the_response() {
    for file in ["gimbal-rail.ron", "camera-core.ron", "negative-rail.ron", "bench-exercise.ron"] {
        let path = sample_path(file);
        let object = json(&check(&[&path, "--json"])).remove(0);
        for crossover in object["loop"]["crossovers"].as_array().expect("crossovers") {
            // Sixteen significant digits, so that the text is the same number again.
            let at = format!("{:e}", number(&crossover["frequency_hz"]));
            let row = json(&check(&[&path, "--json", "--at", &at])).remove(0)["response"][0].take();
            assert_eq!(row["frequency_hz"], crossover["frequency_hz"]);
            assert!(number(&row["loop_db"]).abs() < 1e-6, "{row}");
            let margin = (number(&row["loop_deg"]) + 180.0 - number(&crossover["phase_margin_deg"])) / 360.0;
            assert!((margin - margin.round()).abs() < 1e-8, "{row}");
            let sum = number(&row["plant_db"]) + number(&row["compensator_db"]);
            assert!((sum - number(&row["loop_db"])).abs() < 1e-9, "{row}");
        }
        for crossing in object["loop"]["phase_crossovers"].as_array().expect("phase crossovers") {
            let at = format!("{:e}", number(&crossing["frequency_hz"]));
            let row = json(&check(&[&path, "--json", "--at", &at])).remove(0)["response"][0].take();
            assert!((number(&row["loop_db"]) + number(&crossing["gain_margin_db"])).abs() < 1e-6, "{row}");
            let turns = (number(&row["loop_deg"]) + 180.0) / 360.0;
            assert!((turns - turns.round()).abs() < 1e-8, "{row}");
        }
    }
}

#[test]
fn conditions_and_entries_can_be_set() {
    let path = sample_path("gimbal-rail.ron");
    let asked = json(&check(&[&path, "--json", "--input-voltage", "9V", "--load-current", "1500m"])).remove(0);
    assert_eq!(asked["condition"]["input_voltage"], 9.0);
    assert_eq!(asked["condition"]["load_current"], 1.5);
    // The same condition stands among the nine: least input, greatest load.
    assert_eq!(asked["operating_point"]["duty"], asked["conditions"][2]["duty"]);
    assert_eq!(asked["loop"]["crossovers"][0]["frequency_hz"], asked["conditions"][2]["crossover_hz"]);
    let one = json(&check(&[&path, "--json", "--input-voltage", "10"])).remove(0);
    assert_eq!(one["condition"]["load_current"], 1.0);

    let before = fs::read(&path).expect("there");
    let changed =
        ["--set", "stage.inductor.inductance=22 µH", "--set", "stage.rectifier=diode", "--set", "stage.load.least=1"];
    let object = json(&check(&[&[path.as_str(), "--json"], changed.as_slice()].concat())).remove(0);
    assert_eq!(object["operating_point"]["conduction"], "continuous");
    let ripple = |object: &Value| number(&object["inductors"][0]["ripple"]);
    assert!(ripple(&object) < 0.6 * ripple(&one), "{} {}", ripple(&object), ripple(&one));
    assert_eq!(fs::read(&path).expect("there"), before, "the file is not written");

    let rows = json(&check(&[&path, "--json", "--at", "100,1k,10k"])).remove(0)["response"].take();
    let frequencies: Vec<f64> = rows.as_array().expect("rows").iter().map(|row| number(&row["frequency_hz"])).collect();
    assert_eq!(frequencies, [100.0, 1000.0, 10_000.0]);
}

/// Every entry that cannot be used: exit code 2, and place, reason and hint in both reports.
#[test]
fn wrong_entries_are_told_with_place_reason_and_hint() {
    let path = sample_path("gimbal-rail.ron");
    for (setting, place, reason) in [
        ("stage.inductor.inductance=", "stage.inductor.inductance", "nothing is entered"),
        ("stage.inductor.inductance=ten", "stage.inductor.inductance", "not a number"),
        ("stage.inductor.inductance=-10u", "stage.inductor.inductance", "above 0 H"),
        ("stage.inductor.inductance=0", "stage.inductor.inductance", "above 0 H"),
        ("stage.inductor.inductance=NaN", "stage.inductor.inductance", "not a number"),
        ("stage.inductor.inductance=1e300", "stage.inductor.inductance", "beyond"),
        ("stage.inductor.inductance=4,7u", "stage.inductor.inductance", "comma"),
        ("stage.output.voltage=15", "stage.output.voltage", "above the greatest input"),
        ("control.duty.greatest=1.5", "control.duty.greatest", "from 0 to 1"),
        ("control.duty.greatest=0.3", "control.duty.greatest", "duty ratio"),
        ("compensator.reference=30", "compensator.reference", "only divides"),
        ("stage.input.least=13", "stage.input.least", "must not be above"),
        ("stage.topology=bost", "stage.topology", "not an option"),
        ("stage.inductance=1u", "stage.inductance", "no entry"),
    ] {
        let output = check(&[&path, "--set", setting]);
        assert_eq!(code(&output), 2, "{setting}: {}", text(&output.stdout));
        let told = format!("{}{}", text(&output.stdout), text(&output.stderr));
        assert!(told.contains(place) && told.contains(reason) && told.contains("Hint: "), "{setting}:\n{told}");
        assert!(!told.contains("panicked"), "{told}");

        let object = json(&check(&[&path, "--json", "--set", setting])).remove(0);
        assert_eq!(object["status"], "unusable");
        let findings = object["findings"].as_array().expect("findings");
        let told = findings.iter().any(|finding| {
            finding["severity"] == "problem"
                && finding["where"] == place
                && finding["message"].as_str().is_some_and(|message| message.contains(reason))
                && finding["hint"].is_string()
        });
        assert!(told, "{setting}: {findings:?}");
    }
}

#[test]
fn wrong_arguments_end_with_2_and_help_with_0() {
    let path = sample_path("gimbal-rail.ron");
    for arguments in [
        vec![],
        vec![path.as_str(), "--at", "fast"],
        vec![path.as_str(), "--input-voltage", "-5"],
        vec![path.as_str(), "--load-current", "0"],
        vec![path.as_str(), "--set", "nonsense"],
        vec![path.as_str(), "--unknown"],
    ] {
        let output = check(&arguments);
        assert_eq!(code(&output), 2, "{arguments:?}");
        assert!(output.stdout.is_empty() && !output.stderr.is_empty(), "{arguments:?}");
    }
    let help = program().arg("--help").output().expect("runs");
    assert_eq!(code(&help), 0);
    assert!(text(&help.stdout).contains("check"));
}

/// Name, bytes, and what must be told of a file that is no design.
fn wrong_files() -> Vec<(&'static str, Vec<u8>, &'static str)> {
    let whole = sample::all()[0].ron;
    let changed = |from: &str, to: &str| {
        assert!(whole.contains(from), "{from}");
        whole.replacen(from, to, 1).into_bytes()
    };
    vec![
        ("empty.ron", Vec::new(), "empty"),
        ("truncated.ron", whole.as_bytes()[..whole.len() / 2].to_vec(), "cut off"),
        ("latin1.ron", b"(format: 1, title: \"K\xfcche\")".to_vec(), "UTF-8"),
        ("utf16.ron", whole.encode_utf16().flat_map(u16::to_le_bytes).collect(), "UTF-8"),
        (
            "utf16-bom.ron",
            std::iter::once(0xFEFF).chain(whole.encode_utf16()).flat_map(u16::to_le_bytes).collect(),
            "UTF-16",
        ),
        ("binary.ron", (0..=255).collect(), "NUL"),
        ("unknown-field.ron", changed("    title:", "    colour: \"red\",\n    title:"), "colour"),
        ("unknown-entry.ron", changed("stage.inductor.inductance", "stage.inductor.inductence"), "did you mean"),
        ("wrong-type.ron", changed("title: \"Gimbal rail\"", "title: 5"), "as text"),
        ("bare-number.ron", changed("\"10 µH\"", "1e-5"), "as text"),
        ("newer.ron", changed("format: 1", "format: 9"), "later release"),
        ("not-finite.ron", changed("\"10 µH\"", "\"inf\""), "not a number"),
        ("overflow.ron", changed("\"10 µH\"", "\"1e999 H\""), "too large"),
        ("nested.ron", format!("(format: 1, title: {}", "[".repeat(100_000)).into_bytes(), "nested"),
        ("json.ron", b"{\"format\": 1}".to_vec(), "RON"),
    ]
}

#[test]
fn no_control_character_reaches_the_terminal() {
    let folder = tempfile::tempdir().expect("a folder");
    let path = folder.path().join("steering.ron");
    let design = Design { title: "Rail\u{1b}]0;owned\u{7}\0\u{9b}2J\nline".into(), ..sample::built_in() };
    save(&design, &path).expect("saved");
    let path = path.to_str().expect("UTF-8");
    let controls = |told: &str| told.chars().any(|c| c.is_control() && c != '\n');
    let usable = check(&[path]);
    let unusable = check(&[path, "--set", "stage.topo\u{1b}[31mlogy=buck"]);
    let missing = check(&["none\u{1b}[31m.ron"]);
    for output in [&usable, &unusable, &missing] {
        let told = format!("{}{}", text(&output.stdout), text(&output.stderr));
        assert!(told.contains(char::REPLACEMENT_CHARACTER) && !controls(&told), "{told:?}");
    }
    // JSON escapes them and loses nothing.
    let output = check(&[path, "--json"]);
    assert!(!controls(text(&output.stdout)));
    assert_eq!(json(&output)[0]["title"], design.title);
}

#[cfg(unix)]
#[test]
fn a_pipe_given_as_a_file_is_told_at_once() {
    let folder = tempfile::tempdir().expect("a folder");
    let path = folder.path().join("pipe.ron");
    let made = Command::new("mkfifo").arg(&path).status().expect("mkfifo is there");
    assert!(made.success());
    let output = check(&[path.to_str().expect("UTF-8")]);
    assert_eq!(code(&output), 2);
    let told = text(&output.stderr);
    assert!(told.contains("pipe or a device") && told.contains("Hint: "), "{told}");
}

#[test]
fn the_closing_sentence_counts_conditions() {
    let closing = |arguments: &[&str]| {
        let output = check(arguments);
        let last = text(&output.stdout).trim_end().lines().last().map(str::to_owned);
        (code(&output), last.expect("a last line"))
    };
    let (gimbal, bench) = (sample_path("gimbal-rail.ron"), sample_path("bench-exercise.ron"));
    assert_eq!(closing(&[&gimbal]), (0, "Stable in all nine conditions; all requirements are met.".into()));
    let (ended, said) = closing(&[&bench]);
    let rows = json(&check(&[&bench, "--json"])).remove(0)["conditions"].take();
    let unstable = rows.as_array().expect("nine").iter().filter(|row| row["stable"] == false).count();
    assert_eq!(ended, 1);
    assert_eq!(unstable, 9);
    assert!(said.starts_with("Unstable in all nine conditions; "), "{said}");
    // A load far above the design's makes the boost's right-half-plane zero fall to the crossover.
    let (ended, said) = closing(&[&gimbal, "--input-voltage", "9", "--load-current", "8"]);
    assert_eq!(ended, 1, "{said}");
    assert_eq!(said, "Unstable at the condition asked for; stable in all nine conditions; all requirements are met.");
}

#[test]
fn a_load_step_of_zero_is_no_step() {
    let output = check(&[&sample_path("gimbal-rail.ron"), "--set", "event.load-step.change=0"]);
    let report = text(&output.stdout);
    for name in ["Load step ", "Settles in "] {
        let line = report.lines().find(|line| line.trim_start().starts_with(name)).expect("a row");
        assert!(line.ends_with("no step"), "{line}");
    }
    assert!(!report.contains("unstable") && !report.contains("does not settle"), "{report}");
}

#[test]
fn a_condition_outside_the_range_is_noted_and_one_without_results_goes_to_the_error_output() {
    let path = sample_path("gimbal-rail.ron");
    let output = check(&[&path, "--input-voltage", "18"]);
    assert!(text(&output.stdout).contains("outside the design's range of 9 V to 16 V"), "{}", text(&output.stdout));
    let object = json(&check(&[&path, "--input-voltage", "18", "--load-current", "1", "--json"])).remove(0);
    let of_range = |finding: &&Value| finding["where"].as_str().is_some_and(|place| place.starts_with("--"));
    let found: Vec<&Value> = object["findings"].as_array().expect("findings").iter().filter(of_range).collect();
    assert_eq!(found.len(), 1, "{found:?}");
    assert_eq!((&found[0]["severity"], &found[0]["where"]), (&"note".into(), &"--input-voltage".into()));

    let output = check(&[&path, "--input-voltage", "40"]);
    assert_eq!(code(&output), 2);
    assert_eq!(text(&output.stdout), "");
    assert!(text(&output.stderr).contains("has no results"));
}

fn snapshot(folder: &Path) -> BTreeMap<PathBuf, u64> {
    let entries = fs::read_dir(folder).expect("a folder").map(|entry| entry.expect("an entry"));
    entries.map(|entry| (entry.path(), entry.metadata().expect("there").len())).collect()
}

#[test]
fn wrong_files_are_told_and_nothing_on_disk_changes() {
    let folder = tempfile::tempdir().expect("a folder");
    let mut cases: Vec<(PathBuf, &str)> = Vec::new();
    for (name, bytes, told) in wrong_files() {
        let path = folder.path().join(name);
        fs::write(&path, bytes).expect("written");
        cases.push((path, told));
    }
    let large = folder.path().join("large.ron");
    fs::File::create(&large).and_then(|file| file.set_len(100 << 20)).expect("100 MB");
    cases.push((large, "larger than"));
    cases.push((folder.path().join("missing.ron"), "no such file"));
    cases.push((folder.path().to_owned(), "folder"));
    let before = snapshot(folder.path());
    for (path, told) in &cases {
        let path = path.to_str().expect("UTF-8");
        let output = check(&[path]);
        assert_eq!(code(&output), 2, "{path}");
        let message = text(&output.stderr);
        assert!(message.contains(path) && message.contains(told) && message.contains("Hint: "), "{path}:\n{message}");
        assert!(!message.contains("panicked"), "{message}");
        assert!(output.stdout.is_empty(), "{path}");

        let output = check(&[path, "--json"]);
        assert_eq!(code(&output), 2, "{path}");
        let object = json(&output).remove(0);
        assert_eq!(object["file"], path);
        assert_eq!(object["findings"][0]["severity"], "problem");
        assert_eq!(object["loop"], Value::Null);

        // The window names the same before it opens anything.
        let output = program().arg(path).output().expect("runs");
        assert_eq!(code(&output), 2, "{path}");
        assert!(!text(&output.stderr).contains("panicked"));
    }
    assert_eq!(snapshot(folder.path()), before);
}

#[cfg(unix)]
#[test]
fn a_file_that_may_not_be_read_is_told() {
    use std::os::unix::fs::PermissionsExt;
    let folder = tempfile::tempdir().expect("a folder");
    let path = folder.path().join("locked.ron");
    fs::write(&path, sample::all()[0].ron).expect("written");
    fs::set_permissions(&path, fs::Permissions::from_mode(0o000)).expect("locked");
    // The superuser may read anything, so there is nothing to see then.
    if fs::File::open(&path).is_err() {
        let output = check(&[path.to_str().expect("UTF-8")]);
        assert_eq!(code(&output), 2);
        assert!(text(&output.stderr).contains("may not be read"));
    }
}

#[test]
fn without_a_display_the_program_says_what_is_missing() {
    let output = program().output().expect("runs");
    assert_eq!(code(&output), 2);
    let message = text(&output.stderr);
    assert!(message.contains("cannot be opened") && message.contains("polewright check FILE"), "{message}");
    assert!(!message.contains("panicked"), "{message}");
}

/// Every field the README documents is in the report, by that name.
#[test]
fn the_documented_fields_are_there() {
    let readme = fs::read_to_string(Path::new(env!("CARGO_MANIFEST_DIR")).join("README.md")).expect("the README");
    let (_, section) = readme.split_once("### The JSON").expect("a section on the JSON");
    let (section, _) = section.split_once("\n### ").expect("a next section");
    // Findings and requirements, an inner loop, filters, phases, isolated feedback, a difference equation: together they report every field.
    let samples = [
        "canal-lock.ron",
        "loom-vision.ron",
        "trail-radio.ron",
        "winch-buffer.ron",
        "tram-display.ron",
        "ultrasound-probe.ron",
        "star-tracker.ron",
    ]
    .map(sample_path);
    let samples = samples.iter().map(String::as_str).chain(["--json", "--load-sweep", "--switched"]);
    let report = text(&check(&samples.collect::<Vec<_>>()).stdout).to_owned();
    let rows = section.lines().filter(|line| line.starts_with("| `"));
    let named = rows.flat_map(|line| line.split('`').skip(1).step_by(2));
    let fields: Vec<&str> =
        named.map(|word| word.trim_end_matches("[]")).filter(|word| !word.starts_with('-')).collect();
    assert!(fields.len() > 30, "{fields:?}");
    for field in fields.iter().filter(|field| field.chars().all(|c| c.is_ascii_lowercase() || c == '_')) {
        assert!(report.contains(&format!("\"{field}\":")), "{field} is documented and not reported");
    }
}

/// The definition put back: an output that leaves the band around its value before, to which an integrating loop returns it, settles
/// after the start; one that stays in it has settled from the start.
#[test]
fn settling_meets_its_definition_in_every_condition() {
    let mut outside = 0;
    for sample in sample::all().iter().filter(|sample| sample.file != "bench-exercise.ron") {
        let checked = sample.design().expect("a sample").check().expect("usable");
        let band = checked.events.settling_band * checked.stage.output_voltage;
        let object = json(&check(&[&sample_path(sample.file), "--json"])).remove(0);
        for row in object["conditions"].as_array().expect("nine") {
            let (deviation, settling) = (number(&row["load_step_deviation_v"]).abs(), number(&row["settling_s"]));
            // Finite DC gain leaves the final value a little beside the first: keep away from the edge of the band.
            if deviation > 1.1 * band {
                assert!(settling > 0.0, "{}: {row}", sample.file);
                outside += 1;
            } else if deviation < 0.9 * band {
                assert!(settling == 0.0, "{}: {row}", sample.file);
            }
        }
    }
    assert!(outside >= 9, "{outside}");
}

/// Every key of the report, at any depth.
fn keys(value: &Value, found: &mut BTreeSet<String>) {
    match value {
        Value::Object(fields) => {
            for (key, field) in fields {
                found.insert(key.clone());
                keys(field, found);
            }
        }
        Value::Array(items) => items.iter().for_each(|item| keys(item, found)),
        _ => {}
    }
}

#[test]
fn every_field_of_the_report_is_documented() {
    let docs = fs::read_to_string(Path::new(env!("CARGO_MANIFEST_DIR")).join("src/terminal/mod.rs")).expect("the docs");
    let words: BTreeSet<&str> = docs.split(|c: char| !(c.is_ascii_alphanumeric() || c == '_')).collect();
    let mut reported = BTreeSet::new();
    for sample in sample::all() {
        keys(&json(&check(&[&sample_path(sample.file), "--json", "--load-sweep", "--switched"]))[0], &mut reported);
    }
    let missing: Vec<&String> = reported.iter().filter(|key| !words.contains(key.as_str())).collect();
    assert!(missing.is_empty(), "{missing:?}");
}

/// Numbers between 0 and 1 in a fixed order, by xorshift (Marsaglia 2003, from memory).
struct Random(u64);

impl Random {
    fn next(&mut self) -> f64 {
        self.0 ^= self.0 << 13;
        self.0 ^= self.0 >> 7;
        self.0 ^= self.0 << 17;
        (self.0 >> 11) as f64 / (1_u64 << 53) as f64
    }
}

/// Samples with some of their numbers moved by up to ten times either way, or set to zero.
fn moved_samples(count: usize) -> impl Iterator<Item = Design> {
    let mut random = Random(0x9E37_79B9_7F4A_7C15);
    (0..count).map(move |k| {
        let mut design = sample::all()[k % sample::all().len()].design().expect("a sample");
        let rows = design.entries();
        for row in rows.iter().filter(|_| random.next() < 0.1).collect::<Vec<_>>() {
            let factor = if random.next() < 0.05 { 0.0 } else { 10_f64.powf(2.0 * random.next() - 1.0) };
            if let Some(value) = design.values.get(row.path) {
                design.values.set(row.path, value * factor).expect("finite");
            }
        }
        design
    })
}

#[test]
fn any_design_gives_finite_numbers_or_says_why_not() {
    let mut analysed = 0;
    for design in moved_samples(600) {
        let checked = match design.check() {
            Ok(checked) => checked,
            Err(problems) => {
                assert!(!problems.is_empty() && problems.iter().all(|p| p.is_problem() && !p.place.is_empty()));
                continue;
            }
        };
        let shown = Shown::Levels(Level::Nominal, Level::Nominal);
        let request = Request::spanning(shown, checked.stage.switching_frequency, 30);
        let analysis = analyse(&checked, &request);
        assert_eq!(analysis.conditions.len(), 9);
        for summary in analysis.conditions.iter().filter_map(|condition| condition.outcome.as_ref().ok()) {
            assert!((0.0..=1.0).contains(&summary.operating_point.duty), "{design:?}");
            assert!(summary.loop_gain.margins.modulus_margin.is_finite(), "{design:?}");
            assert!(summary.load_step.is_none_or(|step| step.deviation_v.is_finite()), "{design:?}");
        }
        let Ok(detail) = &analysis.shown else { continue };
        analysed += 1;
        let curves = &detail.curves;
        // A sampled loop's curves end below half the sampling frequency.
        let points = curves.frequencies_hz.len();
        assert!(points == 30 || (checked.compensator.digital().is_some() && points > 20), "{points}: {design:?}");
        for curve in [&curves.loop_db, &curves.loop_deg, &curves.output_impedance_ohm, &curves.line_to_output_db] {
            assert!(curve.len() == points && curve.iter().all(|value| value.is_finite()), "{design:?}");
        }
    }
    assert!(analysed > 150, "{analysed} of 600 could be used: too few to tell anything");
}

/// Names the file to save to in the process that is to be killed.
const SAVE_TO: &str = "POLEWRIGHT_TEST_SAVE_TO";

/// Two designs of very different length, so that a mixture of both could not be read.
fn old_and_new() -> [Design; 2] {
    let old = sample::built_in();
    let new = Design { title: "The new one".into(), notes: "A long note. ".repeat(20_000), ..old.clone() };
    [old, new]
}

/// Not a test of its own: saves in turn for ever when the test below starts it as a process to be killed.
#[test]
fn saving_in_turn_until_killed() {
    let Some(path) = std::env::var_os(SAVE_TO) else { return };
    let designs = old_and_new();
    for design in designs.iter().cycle() {
        save(design, Path::new(&path)).expect("saved");
        println!("saved");
    }
}

#[test]
fn a_process_killed_while_saving_leaves_the_old_file_or_the_new() {
    const KILLS: usize = 200;
    let folder = tempfile::tempdir().expect("a folder");
    let path = folder.path().join("design.ron");
    let designs = old_and_new();
    save(&designs[0], &path).expect("a first file");
    let mut seen = [0; 2];
    for round in 0..KILLS {
        let mut child = Command::new(std::env::current_exe().expect("this test"))
            .args(["--exact", "saving_in_turn_until_killed", "--nocapture"])
            .env(SAVE_TO, &path)
            .stdout(Stdio::piped())
            .stderr(Stdio::null())
            .spawn()
            .expect("a process that saves");
        // It is killed after a first save, some way into a later one; how far differs from round to round.
        let mut lines = BufReader::new(child.stdout.take().expect("its output")).lines();
        let saved =
            (&mut lines).map_while(Result::ok).filter(|line| line.contains("saved")).take(1 + round % 2).count();
        assert!(saved > 0, "it never saved");
        for _ in 0..(round * 37) % 1000 {
            std::hint::spin_loop();
            std::thread::yield_now();
        }
        child.kill().expect("killed");
        child.wait().expect("gone");
        let found = load(&path).unwrap_or_else(|error| panic!("round {round}: {error}"));
        let which = designs.iter().position(|design| *design == found).expect("one of the two, whole");
        seen[which] += 1;
    }
    assert_eq!(seen[0] + seen[1], KILLS);
    assert!(seen[0] > 0 && seen[1] > 0, "both were found at some time: {seen:?}");
    for (left, _) in snapshot(folder.path()) {
        let name = left.file_name().and_then(|name| name.to_str()).expect("UTF-8");
        let temporary = name.strip_prefix(".polewright-").is_some_and(|rest| rest.strip_suffix(".tmp").is_some());
        assert!(name == "design.ron" || temporary, "{name}");
    }
}

/// The load sweep: rising loads from a tenth of the least or lower to 1.2 times the greatest, one change of conduction where the
/// boundary lies, and the same in the text. Without the option there is none.
#[test]
fn a_load_sweep_shows_where_conduction_changes() {
    let path = sample_path("hive-scale.ron");
    assert!(json(&check(&[&path, "--json"]))[0]["load_sweep"].is_null());
    let object = json(&check(&[&path, "--json", "--load-sweep"])).remove(0);
    let lines = object["load_sweep"].as_array().expect("lines");
    assert_eq!(lines.len(), 3);
    let design = load(Path::new(&path)).expect("a sample").check().expect("usable");
    let [least, _, greatest] = design.stage.load_currents;
    for line in lines {
        let points = line["points"].as_array().expect("points");
        let loads: Vec<f64> = points.iter().map(|point| number(&point["load_current"])).collect();
        assert!(loads.len() >= 25 && loads.windows(2).all(|pair| pair[0] < pair[1]), "{loads:?}");
        assert!(loads[0] <= 0.1 * least && (loads[loads.len() - 1] / (1.2 * greatest) - 1.0).abs() < 1e-9);
        let boundary = number(&line["boundary_load"]);
        for (point, load) in points.iter().zip(&loads) {
            let wanted = if *load < boundary { "discontinuous" } else { "continuous" };
            assert!(point["conduction"] == wanted && point["problem"].is_null(), "{point} at a boundary of {boundary}");
        }
        assert!(points.iter().any(|point| point["conduction"] == "discontinuous"));
        // Duty ratio goes over the boundary without a jump, the loop with one.
        let place = loads.iter().position(|load| *load > boundary).expect("loads above");
        let pair = |field: &str| [number(&points[place - 1][field]), number(&points[place][field])];
        let [below, above] = pair("duty");
        assert!((below / above - 1.0).abs() < 1e-5, "{below} and {above}");
        let [below, above] = pair("crossover_hz");
        assert!((below / above - 1.0).abs() > 0.01, "{below} and {above}");
    }
    let report = check(&[&path, "--load-sweep"]);
    let report = text(&report.stdout);
    assert!(report.contains("Load sweep at least input") && report.contains("discontinuous below"), "{report}");
}
