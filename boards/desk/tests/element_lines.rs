//! Two-line element files: what must be read, and what must be refused with a message that helps.
//!
//! Format: 69 columns; checksum = (digits + one for each '-') mod 10 over the first 68; years 57 to 99 are
//! 19xx, 00 to 56 are 20xx (Vallado et al., AIAA 2006-6753); Alpha-5 catalogue numbers leave out I and O (common
//! practice of the catalogue's publishers).

use shiftkeel_desk::elements::ElementFile;
use shiftkeel_desk::instant::{read, write};
use shiftkeel_desk::orbit::Orbit;

const TOP: &str = "1 90001U 26001A   26152.50000000  .00000000  00000-0  10000-4 0  9995";
const LOW: &str = "2 90001  97.6000 255.0000 0010000  90.0000   0.0000 15.05491974    12";

/// The line with other characters from a column on (counted from 1), its checksum made right again.
fn changed(line: &str, column: usize, text: &str) -> String {
    let mut columns: Vec<char> = line.chars().collect();
    for (index, character) in text.chars().enumerate() {
        columns[column - 1 + index] = character;
    }
    let sum: u32 =
        columns[..68].iter().map(|c| if *c == '-' { 1 } else { c.to_digit(10).unwrap_or(0) }).sum();
    columns[68] = char::from_digit(sum % 10, 10).expect("a digit");
    columns.into_iter().collect()
}

fn pair(top: &str, low: &str) -> Result<ElementFile, String> {
    ElementFile::read("elements.txt", &format!("{top}\n{low}\n")).map_err(|error| error.to_string())
}

fn refused(top: &str, low: &str) -> String {
    pair(top, low).err().unwrap_or_else(|| panic!("accepted:\n{top}\n{low}"))
}

#[test]
fn fields_of_a_pair() {
    let file = pair(TOP, LOW).expect("valid");
    let set = &file.sets()[0];
    assert_eq!((set.number, set.line, set.name.as_deref()), (90_001, 1, None));
    assert_eq!(write(set.epoch), "2026-06-01T12:00:00.000Z");
    let mean = &set.mean;
    assert_eq!((mean.inclination, mean.right_ascension, mean.eccentricity), (97.6, 255.0, 0.001));
    assert_eq!((mean.argument_of_perigee, mean.mean_anomaly, mean.mean_motion), (90.0, 0.0, 15.054_919_74));
    assert!((mean.drag_term - 1e-5).abs() < 1e-20);
    assert_eq!((mean.mean_motion_dot, mean.mean_motion_ddot, mean.revolution_number), (0.0, 0.0, 1));
}

#[test]
fn signs_and_powers() {
    let top = changed(&changed(&changed(TOP, 34, "-.00002182"), 45, " 12345-3"), 54, "-11606-4");
    let file = pair(&top, LOW).expect("valid");
    let mean = &file.sets()[0].mean;
    assert_eq!(mean.mean_motion_dot, -2.182e-5);
    assert!((mean.mean_motion_ddot - 0.12345e-3).abs() < 1e-18);
    assert!((mean.drag_term + 0.11606e-4).abs() < 1e-19);
    for blank in [" 00000+0", "+00000-0", "        "] {
        let file = pair(&changed(TOP, 45, blank), LOW);
        assert_eq!(file.is_ok(), !blank.trim().is_empty(), "'{blank}'");
    }
}

#[test]
fn agrees_with_the_propagators_own_reader() {
    // The crate sgp4 2.4.0 reads the same pair; all that reaches the propagator must be equal.
    let reference = sgp4::Elements::from_tle(None, TOP.as_bytes(), LOW.as_bytes()).expect("valid");
    let file = pair(TOP, LOW).expect("valid");
    let mean = &file.sets()[0].mean;
    assert_eq!(mean.datetime, reference.datetime);
    for (ours, theirs) in [
        (mean.mean_motion, reference.mean_motion),
        (mean.mean_motion_dot, reference.mean_motion_dot),
        (mean.inclination, reference.inclination),
        (mean.eccentricity, reference.eccentricity),
        (mean.argument_of_perigee, reference.argument_of_perigee),
        (mean.right_ascension, reference.right_ascension),
    ] {
        assert_eq!(ours.to_bits(), theirs.to_bits());
    }
    assert!((mean.drag_term - reference.drag_term).abs() < 1e-20);
}

#[test]
fn published_checksum_examples() {
    // The verification set's lines of object 5 as published (AIAA 2006-6753): checksums 3 and 7.
    let top = "1 00005U 58002B   00179.78495062  .00000023  00000-0  28098-4 0  4753";
    let low = "2 00005  34.2682 348.7242 1859667 331.7664  19.3264 10.82419157413667";
    let file = pair(top, low).expect("valid");
    assert_eq!(write(file.sets()[0].epoch), "2000-06-27T18:50:19.733568000Z");
    // Lines of the same set whose checksum is wrong as published.
    let wrong = "1 33334U 78066F   06174.85818871  .00000620  00000-0  10000-3 0  6809";
    let low = "2 33334  68.4714 236.1303 5602877 123.7484 302.5767  0.00001000 67521";
    let message = refused(wrong, low);
    assert!(message.contains("elements.txt, line 1"), "{message}");
    assert!(message.contains("checksum in column 69 is 9, the other 68 columns give 6"), "{message}");
}

#[test]
fn years() {
    // Day 152 is the 1st of June, in a leap year the 31st of May.
    for (year, date) in
        [("57", "1957-06-01"), ("99", "1999-06-01"), ("00", "2000-05-31"), ("56", "2056-05-31")]
    {
        let file = pair(&changed(TOP, 19, year), LOW).expect("valid");
        assert_eq!(write(file.sets()[0].epoch), format!("{date}T12:00:00.000Z"));
    }
    assert!(pair(&changed(TOP, 19, "24366"), LOW).is_ok());
    let message = refused(&changed(TOP, 19, "26366"), LOW);
    assert!(message.contains("epoch day"), "{message}");
    assert!(refused(&changed(TOP, 19, "26000"), LOW).contains("epoch day"));
}

#[test]
fn alpha_5_numbers() {
    // Letters A to Z without I and O stand for 10 to 33.
    let cases =
        [("A0001", 100_001), ("E8493", 148_493), ("H9999", 179_999), ("J0000", 180_000), ("N1234", 221_234)];
    for (text, number) in
        cases.into_iter().chain([("P0000", 230_000), ("Z9999", 339_999), ("00005", 5), ("    5", 5)])
    {
        let file = pair(&changed(TOP, 3, text), &changed(LOW, 3, text)).expect(text);
        assert_eq!(file.sets()[0].number, number, "{text}");
        let time = read("2026-06-01").expect("a time");
        assert!(file.choose(Some(text.trim()), time).is_ok(), "{text}");
        assert!(file.choose(Some(&number.to_string()), time).is_ok(), "{number}");
    }
    for text in ["I0001", "O0001", "1A345", "AB345", "-0001", "é0001"] {
        let message = refused(&changed(TOP, 3, text), &changed(LOW, 3, text));
        assert!(message.contains("catalogue number"), "{message}");
    }
}

#[test]
fn many_objects_names_and_line_ends() {
    let other = changed(TOP, 3, "A0002");
    let other_low = changed(LOW, 3, "A0002");
    let text = format!(
        "\u{feff}# a comment\r\nFIRST LIGHT\r\n{TOP}\r\n{LOW}\r\n\r\n0 Second Light  \r\n{other}\r\n{other_low}   \r\n"
    );
    let file = ElementFile::read("many.txt", &text).expect("valid");
    let time = read("2026-06-01").expect("a time");
    assert_eq!(file.objects(time).len(), 2);
    assert_eq!(file.sets()[1].line, 7);
    for (wanted, number) in [
        ("FIRST LIGHT", 90_001),
        ("second light", 100_002),
        ("90001", 90_001),
        ("a0002", 100_002),
        ("SECOND", 100_002),
    ] {
        assert_eq!(file.choose(Some(wanted), time).expect(wanted).number, number);
    }
    let message = |wanted| file.choose(wanted, time).expect_err("undecided").to_string();
    assert!(message(None).contains("--object"), "{}", message(None));
    assert!(message(Some("light")).contains("fits 2 objects"), "{}", message(Some("light")));
    assert!(message(Some("12345")).contains("no object '12345'"), "{}", message(Some("12345")));
    assert!(message(Some("")).contains("no object"), "{}", message(Some("")));
}

#[test]
fn the_set_nearest_in_time_is_taken() {
    let later = changed(TOP, 21, "155");
    let file = ElementFile::read("history.txt", &format!("{TOP}\n{LOW}\n{later}\n{LOW}\n")).expect("valid");
    let chosen = |time: &str| file.choose(None, read(time).expect("a time")).expect("one object").line;
    assert_eq!((chosen("2026-06-02"), chosen("2026-06-03T12:00:01"), chosen("2027-01-01")), (1, 3, 3));
}

#[test]
fn bad_lines_are_refused_with_file_line_reason_and_remedy() {
    let cut = &TOP[..60];
    let long = format!("{LOW}0");
    let slipped = TOP.replacen("  .00000000", ".00000000  ", 1);
    let cases: [(&str, &str, usize, &str); 18] = [
        (cut, LOW, 1, "has 60 columns, an element line has 69; copy it again"),
        (TOP, &long, 2, "has 70 columns"),
        (&TOP.replace("9995", "9994"), LOW, 1, "checksum in column 69 is 4, the other 68 columns give 5"),
        (TOP, &LOW.replace("15.05", "15.06"), 2, "checksum"),
        (&TOP.replace("9995", "999X"), LOW, 1, "'X' stands in columns 69 to 69 where the checksum belongs"),
        (&changed(TOP, 19, "2O"), LOW, 1, "'2O' stands in columns 19 to 20 where the epoch year belongs"),
        (&changed(TOP, 24, ".5000O000"), LOW, 1, "fraction of the epoch day"),
        (
            &changed(TOP, 34, " .0000l000"),
            LOW,
            1,
            "rate of the mean motion belongs: expected a decimal number",
        ),
        (&changed(TOP, 54, " 1OOOO-4"), LOW, 1, "drag term"),
        (&changed(TOP, 54, " 10000-x"), LOW, 1, "drag term"),
        (
            TOP,
            &changed(LOW, 9, " 97.6O00"),
            2,
            "'97.6O00' stands in columns 9 to 16 where the inclination belongs",
        ),
        (TOP, &changed(LOW, 9, "180.6000"), 2, "degrees from 0 to 180"),
        (TOP, &changed(LOW, 27, "00l0000"), 2, "eccentricity belongs: expected digits"),
        (TOP, &changed(LOW, 53, " inf       "), 2, "mean motion"),
        (TOP, &changed(LOW, 53, " 0.00000000"), 2, "above 0 and below 18"),
        (TOP, &changed(LOW, 3, "90002"), 2, "this line is of object 90002, the line before it of 90001"),
        (&slipped, LOW, 1, "columns have slipped"),
        (&changed(TOP, 65, " 9é9"), LOW, 1, "element set number"),
    ];
    for (top, low, line, part) in cases {
        let message = refused(top, low);
        assert!(message.starts_with(&format!("elements.txt, line {line}: ")), "{message}");
        assert!(message.contains(part), "'{message}' does not say '{part}'");
    }
    let message = |text: &str| ElementFile::read("elements.txt", text).expect_err(text).to_string();
    assert!(message(&format!("NAME\n{TOP}\n")).contains("line 2: a line 1 without its line 2"));
    assert!(message(&format!("NAME\n{LOW}\n")).contains("line 2: a line 2 without its line 1"));
    assert!(message(&format!("{TOP}\nNAME\n{LOW}\n")).contains("line 1: a line 1 without its line 2"));
    assert!(message(&format!("{TOP}\n{TOP}\n{LOW}\n")).contains("without its line 2"));
    assert!(message("").contains("holds no element sets"));
    assert!(message("just words\n").contains("holds no element sets"));
}

/// A generator of the usual kind (Knuth's constants), so that a failure can be repeated.
fn random(state: &mut u64) -> usize {
    *state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
    (*state >> 33) as usize
}

#[test]
fn damaged_files_neither_panic_nor_give_positions_that_are_no_numbers() {
    let characters: Vec<char> = "0123456789 -+.eENaIiOé\u{0}\t\n\r".chars().collect();
    let (mut state, mut accepted, mut placed) = (1u64, 0, 0);
    for round in 0..20_000 {
        let mut lines = [TOP.chars().collect::<Vec<_>>(), LOW.chars().collect()];
        for _ in 0..=random(&mut state) % 4 {
            let line = &mut lines[random(&mut state) % 2];
            let at = random(&mut state) % line.len();
            let character = characters[random(&mut state) % characters.len()];
            match random(&mut state) % 8 {
                0 => line.insert(at, character),
                1 => drop(line.remove(at)),
                // Mostly digits, so that many of them pass for elements.
                2..6 => line[at] = characters[random(&mut state) % 10],
                _ => line[at] = character,
            }
        }
        let text = |line: &Vec<char>| line.iter().collect::<String>();
        let [top, low] = lines.each_ref().map(|line| match line.len() {
            69 if round % 2 == 0 => changed(&text(line), 1, ""),
            _ => text(line),
        });
        let Ok(file) = pair(&top, &low) else { continue };
        accepted += 1;
        let set = &file.sets()[0];
        let Ok(orbit) = Orbit::new(set, set.epoch) else { continue };
        for days in [0.0, -30.0, 1.0, 400.0] {
            if let Ok(found) = orbit.state(days * 86_400.0) {
                assert!(
                    found.position.length().is_finite() && found.velocity.length().is_finite(),
                    "{top}\n{low}"
                );
                placed += 1;
            }
        }
    }
    println!("{accepted} of 20000 damaged files read as elements, {placed} positions");
    assert!(accepted > 1000 && placed > 1000, "{accepted} {placed}");
}
