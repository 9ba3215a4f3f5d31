//! The published SGP4 verification set: 33 element sets, 667 states, and the conditions where it stops.
//!
//! Source: Vallado, Crawford, Hujsak and Kelso, "Revisiting Spacetrack Report #3", AIAA 2006-6753, its files
//! SGP4-VER.TLE and tcppver.out; see the head of the data file for where they were taken from and their licence.

use shiftkeel_desk::elements::ElementFile;
use shiftkeel_desk::orbit::{Orbit, OrbitError, TheoryLimit};
use shiftkeel_desk::vector::Vector;

const SET: &str = include_str!("data/sgp4_verification.txt");

/// Object whose published states are not of the AFSPC compatible mode: its node is turned back by the improved
/// choice below 0.2 rad inclination, and the two modes part by 0.9 km in 12 hours. The published digits
/// are those of the improved mode, so this object is held to them through that mode; the compatible one has a
/// test of its own.
const OTHER_MODE: u32 = 23_599;

/// Object with a published "state" that repeats the last line of the object before it, because its own
/// propagation fails at once (condition 3, which is asserted).
const REPEATED: u32 = 33_334;

enum Row {
    State { minutes: f64, position: Vector, velocity: Vector },
    Stop { minutes: f64, code: u32 },
}

struct Case {
    file: ElementFile,
    rows: Vec<Row>,
}

fn cases() -> Vec<Case> {
    let mut cases: Vec<Case> = Vec::new();
    let mut top = "";
    for line in SET.lines().filter(|line| !line.starts_with('#')) {
        let columns: Vec<&str> = line.split_whitespace().collect();
        if line.len() == 69 && line.starts_with("1 ") {
            top = line;
        } else if line.len() == 69 && line.starts_with("2 ") {
            let file =
                ElementFile::read("verification set", &format!("{top}\n{line}\n")).expect("a valid pair");
            cases.push(Case { file, rows: Vec::new() });
        } else {
            let minutes: f64 = columns[0].parse().expect("minutes");
            let row = if columns.get(1) == Some(&"error") {
                Row::Stop { minutes, code: columns[2].parse().expect("a code") }
            } else {
                let number: Vec<f64> =
                    columns[1..].iter().map(|text| text.parse().expect("a number")).collect();
                Row::State {
                    minutes,
                    position: Vector::new(number[0], number[1], number[2]),
                    velocity: Vector::new(number[3], number[4], number[5]),
                }
            };
            cases.last_mut().expect("rows follow an object").rows.push(row);
        }
    }
    cases
}

fn largest(vector: Vector) -> f64 {
    vector.x.abs().max(vector.y.abs()).max(vector.z.abs())
}

#[test]
fn all_published_states_to_a_millimetre_and_a_micrometre_a_second() {
    let (mut states, mut exceptions, mut worst) = (0, 0, (0.0f64, 0.0f64));
    for case in cases() {
        let set = &case.file.sets()[0];
        let orbit = Orbit::new(set, set.epoch).expect("usable elements");
        let improved = sgp4::Constants::from_elements_afspc_compatibility_mode(&set.mean).expect("usable");
        for row in &case.rows {
            let Row::State { minutes, position, velocity } = row else { continue };
            states += 1;
            if set.number == REPEATED {
                exceptions += 1;
                continue;
            }
            let (found_position, found_velocity) = if set.number == OTHER_MODE {
                exceptions += 1;
                let state = improved.propagate(sgp4::MinutesSinceEpoch(*minutes)).expect("a state");
                let [x, y, z] = state.position;
                let [vx, vy, vz] = state.velocity;
                (Vector::new(x, y, z), Vector::new(vx, vy, vz))
            } else {
                let state = orbit.state(minutes * 60.0).unwrap_or_else(|error| panic!("{error}"));
                (state.position * 1e-3, state.velocity * 1e-3)
            };
            let off = largest(found_position - *position);
            let slip = largest(found_velocity - *velocity);
            worst = (worst.0.max(off), worst.1.max(slip));
            // Published with 1e-8 km and 1e-9 km/s.
            assert!(off < 1e-6, "{} at {minutes} min: {off} km", set.number);
            assert!(slip < 1e-9 + 0.5e-9, "{} at {minutes} min: {slip} km/s", set.number);
        }
    }
    println!("{states} states, worst {:.3e} km and {:.3e} km/s, {exceptions} exceptions", worst.0, worst.1);
    assert_eq!(states, 667);
    assert_eq!(exceptions, 37 + 1);
}

#[test]
fn the_compatible_mode_where_it_differs() {
    // The Python implementation in sgp4 2.27 (MIT), `opsmode='a'`, at 720 min.
    let case = cases().into_iter().find(|case| case.file.sets()[0].number == OTHER_MODE).expect("in the set");
    let set = &case.file.sets()[0];
    let state = Orbit::new(set, set.epoch).expect("usable").state(720.0 * 60.0).expect("a position");
    let expected = Vector::new(7_141.247_425_264_589, 20_538.971_151_583_606, 2_501.180_599_656_912);
    assert!(largest(state.position * 1e-3 - expected) < 1e-6);
    let expected = Vector::new(-2.293_079_623_472_544_3, 2.333_598_992_900_791, 0.282_727_441_280_892_2);
    assert!(largest(state.velocity * 1e-3 - expected) < 1e-9);
}

#[test]
fn propagation_stops_where_the_set_expects_it() {
    let mut stops = 0;
    for case in cases() {
        let set = &case.file.sets()[0];
        let orbit = Orbit::new(set, set.epoch).expect("usable elements");
        for row in &case.rows {
            let Row::Stop { minutes, code } = row else { continue };
            let found = match orbit.state(minutes * 60.0) {
                Err(OrbitError::Decayed { .. }) => 6,
                Err(OrbitError::BeyondTheory { reason: TheoryLimit::MeanEccentricity, .. }) => 1,
                Err(OrbitError::BeyondTheory { reason: TheoryLimit::PerturbedEccentricity, .. }) => 3,
                Err(OrbitError::BeyondTheory { reason: TheoryLimit::SemiLatusRectum, .. }) => 4,
                other => panic!("{} at {minutes} min: {other:?}", set.number),
            };
            assert_eq!(found, *code, "{} at {minutes} min", set.number);
            stops += 1;
        }
    }
    assert_eq!(stops, 7);
}
