//! The program as a user runs it: formats, and what it says to bad input.

use std::path::PathBuf;
use std::process::{Command, Output};
use std::time::Instant;

const TOP: &str = "1 90001U 26001A   26152.50000000  .00000000  00000-0  10000-4 0  9995";
const LOW: &str = "2 90001  97.6000 255.0000 0010000  90.0000   0.0000 15.05491974    12";

fn run(arguments: &[&str]) -> Output {
    Command::new(env!("CARGO_BIN_EXE_shiftkeel")).args(arguments).output().expect("the program starts")
}

fn text(bytes: &[u8]) -> String {
    String::from_utf8(bytes.to_vec()).expect("text")
}

/// A file in the test's own directory; `name` must differ from test to test.
fn file(name: &str, content: &str) -> String {
    let path = PathBuf::from(env!("CARGO_TARGET_TMPDIR")).join(name);
    std::fs::write(&path, content).expect("a file");
    path.display().to_string()
}

fn synthetic() -> String {
    concat!(env!("CARGO_MANIFEST_DIR"), "/tests/data/synthetic.txt").to_string()
}

/// `trace` of the synthetic pass with some arguments replaced or added.
fn trace(changes: &[(&str, &str)]) -> Output {
    let elements = synthetic();
    let mut arguments = vec![
        ("--elements", elements.as_str()),
        ("--site", "45.0,7.5,300"),
        ("--from", "2026-06-01T12:06:30Z"),
        ("--to", "2026-06-01T12:07:30Z"),
        ("--step", "60"),
    ];
    for change in changes {
        match arguments.iter_mut().find(|argument| argument.0 == change.0) {
            Some(argument) => argument.1 = change.1,
            None => arguments.push(*change),
        }
    }
    let flat: Vec<&str> =
        std::iter::once("trace").chain(arguments.iter().flat_map(|(name, value)| [*name, *value])).collect();
    run(&flat)
}

fn contacts(elements: &str, from: &str, to: &str, more: &[&str]) -> Output {
    let plain = ["contacts", "--elements", elements, "--site", "45.0,7.5,300", "--from", from, "--to", to];
    run(&[&plain, more].concat())
}

fn succeeds(output: &Output) -> String {
    assert!(output.status.success(), "{}", text(&output.stderr));
    text(&output.stdout)
}

/// Fails with a message on standard error that has all of the parts, and nothing on standard output.
fn fails(output: &Output, parts: &[&str]) {
    let message = text(&output.stderr);
    assert!(!output.status.success(), "it succeeded:\n{}", text(&output.stdout));
    assert!(output.stdout.is_empty(), "{}", text(&output.stdout));
    for part in parts {
        assert!(message.contains(part), "'{message}' does not say '{part}'");
    }
}

#[test]
fn trace_as_csv() {
    let found = succeeds(&trace(&[("--format", "csv"), ("--carrier", "437e6")]));
    let lines: Vec<&str> = found.lines().collect();
    assert_eq!(lines[0], "time_utc,elevation_deg,azimuth_deg,range_km,range_rate_km_s,rapidity,shift_hz");
    assert_eq!(lines.len(), 3);
    let row: Vec<&str> = lines[1].split(',').collect();
    assert_eq!(row[0], "2026-06-01T12:06:30.000Z");
    // Synthetic pass, two independent astronomy libraries: range 10 mm, range rate 20 um/s, elevation 0.001 deg.
    for (column, expected, bound) in [
        (1, 2.5661, 0.001),
        (3, 2_445.951_654, 10e-6),
        (4, -7.015_244_527, 20e-9),
        (5, 2.340_033_693_774e-5, 7e-14),
        (6, 10_226.067, 6e-4),
    ] {
        let value: f64 = row[column].parse().expect("a number");
        assert!((value - expected).abs() < bound, "{}: {value}", lines[0]);
    }
}

#[test]
fn trace_as_json_and_table() {
    let found = succeeds(&trace(&[("--format", "json"), ("--carrier", "437e6"), ("--model", "vacuum")]));
    let rows: Vec<serde_json::Value> = serde_json::from_str(&found).expect("JSON");
    assert_eq!(rows.len(), 2);
    let shift = rows[0]["shift_hz"].as_f64().expect("a number");
    // 10226.067 plus 0.0126 Hz of light time, clocks and the derivative (independent model in data/).
    assert!((shift - 10_226.079_5).abs() < 2e-3, "{shift}");
    let found = succeeds(&trace(&[("--format", "json")]));
    let rows: Vec<serde_json::Value> = serde_json::from_str(&found).expect("JSON");
    assert!(rows[0]["shift_hz"].is_null(), "no carrier, no shift");
    let table = succeeds(&trace(&[]));
    let widths: Vec<usize> = table.lines().map(str::len).collect();
    assert!(widths.len() == 3 && widths.iter().all(|width| *width == widths[0]), "{table}");
    assert!(table.starts_with("                time_utc  elevation_deg"), "{table}");
}

#[test]
fn trace_directions() {
    let shift = |direction: &str| {
        let csv = trace(&[
            ("--carrier", "437e6"),
            ("--model", "vacuum"),
            ("--direction", direction),
            ("--format", "csv"),
            ("--from", "2026-06-01T12:11:55.41522Z"),
            ("--to", "2026-06-01T12:12:00Z"),
        ]);
        let row = succeeds(&csv).lines().nth(1).expect("a row").to_string();
        row.rsplit(',').next().expect("a column").parse::<f64>().expect("a number")
    };
    // 0.288 Hz between down and up at closest approach at 437 MHz (independent model).
    assert!((shift("down") - shift("up") - 0.2884).abs() < 5e-4, "{} {}", shift("down"), shift("up"));
    // Without clocks: twice the light time's part, 0.260 Hz each way.
    assert!((shift("two-way") - 0.5222).abs() < 5e-4, "{}", shift("two-way"));
}

#[test]
fn trace_takes_dut1_and_hours_of_other_zones() {
    let rate = |changes: &[(&str, &str)]| {
        let found = succeeds(&trace(&[changes, &[("--format", "csv")]].concat()));
        found
            .lines()
            .nth(1)
            .expect("a row")
            .split(',')
            .nth(4)
            .expect("a column")
            .parse::<f64>()
            .expect("a number")
    };
    let plain = rate(&[]);
    assert_eq!(plain, rate(&[("--from", "2026-06-01T14:06:30+02:00")]));
    let moved = (rate(&[("--dut1", "0.1")]) - plain).abs() / 299_792.458 * 437e6;
    // Up to 0.17 Hz for 0.1 s at 437 MHz (project's check values); some of it everywhere.
    assert!(moved > 1e-3 && moved < 0.18, "{moved}");
}

#[test]
fn bad_elements_are_refused() {
    let bad = |name: &str, top: &str, low: &str| {
        let path = file(name, &format!("{top}\n{low}\n"));
        trace(&[("--elements", path.as_str())])
    };
    fails(
        &bad("checksum.txt", &TOP.replace("9995", "9996"), LOW),
        &["checksum.txt, line 1", "checksum", "fetch"],
    );
    fails(&bad("length.txt", TOP, &LOW[..55]), &["length.txt, line 2", "55 columns", "69", "copy it again"]);
    fails(
        &bad("letters.txt", TOP, &LOW.replace("97.6000", "97.6OO0")),
        &["letters.txt, line 2", "97.6OO0", "inclination"],
    );
    fails(&trace(&[("--elements", "absent.txt")]), &["absent.txt", "check the path"]);
    fails(&trace(&[("--object", "OTHER")]), &["no object 'OTHER'", "SYNTHETIC 1 (90001)"]);
    let two = file(
        "two.txt",
        &format!(
            "ONE\r\n{TOP}\r\n{LOW}\r\nTWO\r\n{}\r\n{}\r\n",
            TOP.replace("90001", "90010"),
            LOW.replace("90001", "90010")
        ),
    );
    fails(&trace(&[("--elements", &two)]), &["2 objects", "--object"]);
    for wanted in ["ONE", "two", "90001", "90010"] {
        succeeds(&trace(&[("--elements", &two), ("--object", wanted)]));
    }
}

#[test]
fn old_elements_are_warned_of_with_their_cost() {
    let output = trace(&[
        ("--from", "2026-06-08T12:00:00Z"),
        ("--to", "2026-06-08T12:01:00Z"),
        ("--carrier", "437e6"),
    ]);
    let (found, warning) = (succeeds(&output), text(&output.stderr));
    assert_eq!(found.lines().count(), 3, "the rows are still there");
    for part in ["warning:", "7.0 days old", "3.1 days", "Hz at 437 MHz", "fetch newer elements"] {
        assert!(warning.contains(part), "'{warning}' does not say '{part}'");
    }
    let output = trace(&[("--from", "2026-06-03T12:00:00Z"), ("--to", "2026-06-03T12:01:00Z")]);
    assert!(!text(&output.stderr).contains("days old"), "{}", text(&output.stderr));
}

#[test]
fn decayed_objects_are_refused() {
    // From the SGP4 verification set: sub-orbital, below the surface 55 minutes after its epoch.
    let top = "1 28872U 05037B   05333.02012661  .25992681  00000-0  24476-3 0  1534";
    let low = "2 28872  96.4736 157.9986 0303955 244.0492 110.6523 16.46015938 10708";
    let path = file("decayed.txt", &format!("{top}\n{low}\n"));
    let window =
        [("--elements", path.as_str()), ("--from", "2005-11-29T01:00:00Z"), ("--to", "2005-11-29T02:00:00Z")];
    fails(&trace(&window), &["28872 has decayed", "below the Earth's surface", "use newer elements"]);
    fails(&contacts(&path, "2005-11-30", "2005-12-01", &[]), &["28872", "decayed", "use newer elements"]);
    // Half a year on, the theory itself gives up.
    fails(&contacts(&path, "2006-05-30", "2006-06-01", &[]), &["28872", "decayed", "use newer elements"]);
}

#[test]
fn bad_arguments_are_refused() {
    fails(&trace(&[("--site", "91,7.5,300")]), &["latitude 91 is off the Earth", "-90"]);
    fails(&trace(&[("--site", "45,7.5,500000")]), &["height 500000 m is off the Earth"]);
    fails(&trace(&[("--site", "45,-200,0")]), &["longitude -200 is off the Earth"]);
    fails(&trace(&[("--site", "45;7.5;0")]), &["is not a site", "45.0,7.5,300"]);
    fails(&trace(&[("--from", "1 June")]), &["'1 June' is not an ISO 8601 time", "2026-06-01T12:00:00Z"]);
    fails(&trace(&[("--to", "2026-06-01T12:00:00Z")]), &["--from is 390 s after --to"]);
    for step in ["0", "-1", "nan", "inf"] {
        fails(&trace(&[("--step", step)]), &["--step", "seconds above 0"]);
    }
    fails(&trace(&[("--step", "1e-6")]), &["rows", "longer --step"]);
    for carrier in ["0", "-437e6", "1e13", "nan"] {
        fails(&trace(&[("--carrier", carrier)]), &["is not a carrier", "437e6"]);
    }
    fails(&trace(&[("--dut1", "37")]), &["--dut1 37 is beyond 1 s"]);
    succeeds(&trace(&[("--site", "-33.9,-70.4,-20")]));
}

#[test]
fn contacts_in_every_format() {
    let (from, to) = ("2026-06-01T12:00:00Z", "2026-06-02T12:00:00Z");
    let csv = succeeds(&contacts(&synthetic(), from, to, &["--format", "csv", "--carrier", "437e6,8.4e9"]));
    let lines: Vec<&str> = csv.lines().collect();
    assert!(lines[0].starts_with("object,number,rise_utc,"), "{}", lines[0]);
    assert!(
        lines[1].contains("2026-06-01T12:05:51.338Z") && lines[1].contains("2026-06-01T12:17:56.866Z"),
        "{}",
        lines[1]
    );
    assert_eq!(lines.len() % 2, 1, "two carriers make two rows a pass");
    let json = succeeds(&contacts(&synthetic(), from, to, &["--format", "json"]));
    let rows: Vec<serde_json::Value> = serde_json::from_str(&json).expect("JSON");
    assert_eq!(rows.len(), (lines.len() - 1) / 2);
    assert!((rows[0]["highest_deg"].as_f64().expect("a number") - 71.6404).abs() < 2e-4);
    assert!(rows[0]["largest_shift_hz"].is_null());
    let table = succeeds(&contacts(&synthetic(), from, to, &[]));
    assert_eq!(table.lines().count(), rows.len() + 1);
    let high = succeeds(&contacts(&synthetic(), from, to, &["--least-elevation", "45", "--format", "csv"]));
    assert_eq!(high.lines().count(), 3, "two of the passes are higher than 45 degrees");
    let hill = file("hill.txt", "# a wall all round\n0,60\n180,60\n");
    let above = succeeds(&contacts(&synthetic(), from, to, &["--mask", &hill, "--format", "csv"]));
    assert_eq!(above.lines().count(), 2, "one of them is higher than 60");
}

#[test]
fn a_window_without_a_pass_is_an_error() {
    let output = contacts(&synthetic(), "2026-06-01T12:20:00Z", "2026-06-01T13:20:00Z", &[]);
    fails(&output, &["no pass between 2026-06-01T12:20:00.000Z", "SYNTHETIC 1", "choose a longer window"]);
    let output = contacts(&synthetic(), "2026-06-01T12:20:00Z", "2026-06-01T12:20:00Z", &[]);
    fails(&output, &["0 s long", "--to must be later"]);
    // trace still answers, with a warning.
    let output = trace(&[("--from", "2026-06-01T12:20:00Z"), ("--to", "2026-06-01T12:21:00Z")]);
    assert_eq!(succeeds(&output).lines().count(), 3);
    assert!(text(&output.stderr).contains("stays below the horizon"), "{}", text(&output.stderr));
}

#[test]
fn a_day_of_a_hundred_objects_within_ten_seconds() {
    let checked = |line: String| {
        let sum: u32 = line.chars().map(|c| if c == '-' { 1 } else { c.to_digit(10).unwrap_or(0) }).sum();
        format!("{line}{}\n", sum % 10)
    };
    let mut elements = String::new();
    for object in 0..100u32 {
        let part = |factor: u32, whole: f64| f64::from(object * factor % 101) / 101.0 * whole;
        // Mostly low orbits; every tenth high or stationary.
        let motion = if object % 10 == 9 { 1.0 + part(7, 1.1) } else { 12.0 + part(31, 3.8) };
        let top =
            format!("1 {:05}U 26001A   26152.50000000  .00000000  00000-0  10000-4 0  999", 90_100 + object);
        let low = format!(
            "2 {:05} {:8.4} {:8.4} {:07} {:8.4} {:8.4} {motion:11.8}    1",
            90_100 + object,
            part(13, 110.0),
            part(57, 360.0),
            object * 100,
            part(23, 360.0),
            part(41, 360.0)
        );
        elements += &checked(top);
        elements += &checked(low);
    }
    let path = file("hundred.txt", &elements);
    let begun = Instant::now();
    let output = contacts(&path, "2026-06-01T12:00:00Z", "2026-06-02T12:00:00Z", &["--format", "csv"]);
    let took = begun.elapsed().as_secs_f64();
    let passes = succeeds(&output).lines().count() - 1;
    println!("{passes} passes of 100 objects in {took:.2} s");
    assert!(passes > 200, "{passes}");
    assert!(took < 10.0, "{took} s");
}

#[test]
fn examples_of_the_readme() {
    let readme = include_str!("../README.md");
    let mut examples = 0;
    for block in readme.split("```console\n").skip(1) {
        let block = block.split("```").next().expect("an end");
        let (command, expected) = block.split_once('\n').expect("a command and its output");
        let arguments: Vec<&str> =
            command.strip_prefix("$ shiftkeel ").expect("a command").split_whitespace().collect();
        let output = Command::new(env!("CARGO_BIN_EXE_shiftkeel"))
            .args(arguments)
            .current_dir(concat!(env!("CARGO_MANIFEST_DIR"), "/../.."))
            .output()
            .expect("the program starts");
        assert_eq!(succeeds(&output), expected, "{command}");
        examples += 1;
    }
    assert_eq!(examples, 2);
}
