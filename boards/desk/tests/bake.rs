//! `bake` as a user runs it: files, source, and what it says to bad input.

use shiftkeel::pass::{Arc, Direction, PassTable, TaggedAt};
use std::path::{Path, PathBuf};
use std::process::{Command, Output};

const SYNTHETIC: &str = concat!(env!("CARGO_MANIFEST_DIR"), "/tests/data/synthetic.txt");

fn text(bytes: &[u8]) -> String {
    String::from_utf8(bytes.to_vec()).expect("text")
}

/// A fresh folder of the test's own, in which the program is run.
fn folder(name: &str) -> PathBuf {
    let path = PathBuf::from(env!("CARGO_TARGET_TMPDIR")).join(name);
    let _ = std::fs::remove_dir_all(&path);
    std::fs::create_dir_all(&path).expect("a folder");
    path
}

/// `bake` of the synthetic pass with some arguments replaced or added.
fn bake(place: &Path, changes: &[&str]) -> Output {
    let mut arguments = vec!["bake", "--elements", SYNTHETIC, "--site", "45.0,7.5,300"];
    if !changes.contains(&"--at") && !changes.contains(&"--after") {
        arguments.extend(["--at", "2026-06-01T12:12:00Z"]);
    }
    for pair in changes.chunks(2) {
        match arguments.iter().position(|argument| *argument == pair[0]) {
            Some(at) => arguments[at + 1] = pair[1],
            None => arguments.extend(pair),
        }
    }
    let program = env!("CARGO_BIN_EXE_shiftkeel");
    Command::new(program).args(arguments).current_dir(place).output().expect("the program starts")
}

fn succeeds(output: &Output) -> String {
    assert!(output.status.success(), "{}", text(&output.stderr));
    text(&output.stdout)
}

fn words(place: &Path, name: &str) -> Vec<u32> {
    let bytes = std::fs::read(place.join(name)).expect("a file");
    assert_eq!(bytes.len() % 4, 0);
    bytes.chunks_exact(4).map(|four| u32::from_le_bytes(four.try_into().expect("four"))).collect()
}

#[test]
fn files_hold_the_pass() {
    let place = folder("bake_files");
    let said = succeeds(&bake(&place, &[]));
    let (arc, table) = (words(&place, "pass.arc"), words(&place, "pass.table"));
    let (arc, table) = (Arc::new(&arc).expect("an arc"), PassTable::new(&table).expect("a table"));
    assert_eq!((arc.object(), table.object(), table.arc_digest()), (90001, 90001, arc.digest()));
    assert_eq!((table.direction(), table.tagged_at()), (Direction::Down, TaggedAt::Ground));
    assert_eq!(table.site(), [450_000_000, 75_000_000, 300_000]);
    assert!(!table.has_lateness());
    // Horizon at 351.3376 and 1076.8659 s after 12:00 (two independent astronomy libraries); GPS is 18 s ahead.
    let noon = shiftkeel::time::GpsTime::from_utc(2026, 6, 1, [12, 0, 0], 0).expect("noon");
    assert!((table.start().seconds_since(noon) - 351.3376).abs() < 2e-3);
    assert!((table.end().seconds_since(noon) - 1076.8659).abs() < 2e-3);
    // A whole pass at 10 mHz and 437 MHz: the project's target is 300 bytes, and an arc of about 90.
    assert!(table.words().len() * 4 <= 300, "{}", table.words().len() * 4);
    assert!(arc.words().len() * 4 <= 110, "{}", arc.words().len() * 4);
    for part in ["276 bytes", "8 segments", "verified", "mHz", "cycles", "71.6 degrees"] {
        assert!(said.contains(part), "no '{part}' in\n{said}");
    }
    let left: Vec<_> = std::fs::read_dir(&place)
        .expect("a folder")
        .map(|entry| entry.expect("a file").file_name())
        .collect();
    assert_eq!(left.len(), 2, "nothing temporary is left: {left:?}");
}

#[test]
fn next_pass_direction_tag_and_partial() {
    let place = folder("bake_options");
    let options = ["--after", "2026-06-01T12:00:00Z", "--direction", "up", "--tagged", "spacecraft"];
    let more = ["--carrier", "145.9e6", "--table", "up.table", "--arc", "up.arc"];
    succeeds(&bake(&place, &[&options[..], &more].concat()));
    let table = words(&place, "up.table");
    let table = PassTable::new(&table).expect("a table");
    assert_eq!((table.direction(), table.tagged_at()), (Direction::Up, TaggedAt::Spacecraft));
    // A flag without a value.
    let program = env!("CARGO_BIN_EXE_shiftkeel");
    let plain = [
        "bake",
        "--elements",
        SYNTHETIC,
        "--site",
        "45.0,7.5,300",
        "--after",
        "2026-06-01",
        "--lateness-partial",
    ];
    let output = Command::new(program).args(plain).current_dir(&place).output().expect("it starts");
    succeeds(&output);
    let table = words(&place, "pass.table");
    assert!(PassTable::new(&table).expect("a table").has_lateness());
}

#[test]
fn rust_and_c_source_hold_the_same_words() {
    let place = folder("bake_source");
    succeeds(&bake(&place, &["--source", "pass.rs", "--name", "LUNCH"]));
    succeeds(&bake(&place, &["--source", "pass.h", "--name", "LUNCH"]));
    for (file, opening) in
        [("pass.rs", "pub static LUNCH_TABLE: [u32; "), ("pass.h", "static const uint32_t LUNCH_TABLE[")]
    {
        let source = std::fs::read_to_string(place.join(file)).expect("source");
        let from = source.find(opening).unwrap_or_else(|| panic!("no {opening} in\n{source}"));
        let inside = &source[from + opening.len()..];
        let numbers: Vec<u32> = inside
            .split(|c: char| !c.is_ascii_alphanumeric())
            .filter_map(|word| u32::from_str_radix(word.strip_prefix("0x")?, 16).ok())
            .collect();
        assert_eq!(numbers, words(&place, "pass.table"), "{file}");
        let count: usize = inside.split(']').next().expect("a count").parse().expect("a number");
        assert_eq!(count, numbers.len());
    }
    // It is what a compiler takes.
    let output = Command::new("rustc")
        .args(["--crate-type", "lib", "--edition", "2024", "--emit", "metadata", "pass.rs"])
        .current_dir(&place)
        .output();
    if let Ok(output) = output {
        assert!(output.status.success(), "{}", text(&output.stderr));
    }
}

#[test]
fn old_elements_are_warned_of() {
    let place = folder("bake_old");
    let output = bake(&place, &["--after", "2026-06-20"]);
    succeeds(&output);
    let warning = text(&output.stderr);
    assert!(warning.contains("days old") && warning.contains("Hz"), "{warning}");
}

#[test]
fn what_makes_no_sense_is_refused_and_leaves_no_file() {
    for (changes, part) in [
        (&["--site", "91,0,0"][..], "latitude"),
        (&["--site", "45,7.5"], "LATITUDE,LONGITUDE,HEIGHT"),
        (&["--at", "2026-06-01T13:00:00Z"], "not in view"),
        (&["--at", "yesterday"], "ISO 8601"),
        (&["--carrier", "-1"], "--carrier"),
        (&["--carrier", "437 MHz"], "--carrier"),
        (&["--millihertz", "NaN"], "--millihertz"),
        (&["--cycles", "0"], "--cycles"),
        (&["--millihertz", "1e-6"], "no table"),
        (&["--arc-millimetres", "1e-6"], "no arc"),
        (&["--dut1", "5"], "--dut1"),
        (&["--least-elevation", "89"], "not in view"),
        (&["--elements", "missing.txt"], "missing.txt"),
        (&["--source", "pass.txt"], ".rs"),
        (&["--source", "pass.rs", "--name", "1bad name"], "--name"),
        (&["--direction", "two-way", "--tagged", "spacecraft"], "two-way"),
        (&["--table", "no/such/folder/t"], "no/such/folder"),
        (&["--at", "1957-10-04"], ""),
    ] {
        let place = folder("bake_refused");
        let output = bake(&place, changes);
        let message = text(&output.stderr);
        assert!(!output.status.success(), "{changes:?} succeeded");
        assert!(
            message.contains(part) && !message.contains("panicked"),
            "{changes:?}: '{message}' does not say '{part}'"
        );
        assert!(!place.join("pass.table").exists(), "{changes:?} left a table");
    }
}
