//! The vacuum model: against an independently written one, against itself, and its clocks.

use shiftkeel_desk::SPEED_OF_LIGHT;
use shiftkeel_desk::elements::ElementFile;
use shiftkeel_desk::frames::EARTH_RADIUS_WGS84;
use shiftkeel_desk::geometric::Direction;
use shiftkeel_desk::instant;
use shiftkeel_desk::orbit::{GRAVITATIONAL_PARAMETER, Orbit};
use shiftkeel_desk::vacuum::{GEOID_RATE, VacuumModel, clock_rate};
use shiftkeel_desk::vector::{State, Vector};

/// Name, last line, site, hours from the element epoch to the reference epoch; as in data/vacuum_reference.py.
const CASES: [(&str, &str, &str, &str, f64); 3] = [
    (
        "synthetic",
        "1 90001U 26001A   26152.50000000  .00000000  00000-0  10000-4 0  9995",
        "2 90001  97.6000 255.0000 0010000  90.0000   0.0000 15.05491974    12",
        "45,7.5,300",
        0.0,
    ),
    (
        "eccentric",
        "1 90002U 26001A   26152.50000000  .00000000  00000-0  10000-4 0  9996",
        "2 90002  63.4000 300.0000 7000000 270.0000  10.0000  2.00600000    15",
        "-33.9,-70.4,2400",
        36.0,
    ),
    (
        "retrograde",
        "1 90003U 26001A   26152.50000000  .00000000  00000-0  10000-4 0  9997",
        "2 90003 120.0000  10.0000 0200000 270.0000   0.0000 15.50000000    11",
        "0,-78,0",
        100.0,
    ),
];

fn orbit(case: usize, more_hours: f64) -> Orbit {
    let (name, top, low, _, hours) = CASES[case];
    let file = ElementFile::read(name, &format!("{top}\n{low}\n")).expect("valid elements");
    let epoch = instant::read("2026-06-01T12:00:00Z").expect("a time");
    let reference = instant::after(epoch, (hours + more_hours) * 3600.0).expect("a time");
    Orbit::new(&file.sets()[0], reference).expect("usable elements")
}

fn vacuum(case: usize, direction: Direction) -> VacuumModel {
    let site = CASES[case].3.parse().expect("a site");
    VacuumModel::new(orbit(case, 0.0), site, 0.0, direction, (-600.0, 4_500.0)).expect("an orbit")
}

#[test]
fn an_independent_model() {
    // data/vacuum_reference.py: another propagator, 40 digits, numerical phase; every direction.
    let mut reader = csv::Reader::from_reader(include_str!("data/vacuum_reference.csv").as_bytes());
    let mut worst = [(0.0f64, 0.0f64); 3];
    let mut rows = 0;
    for row in reader.records() {
        let row = row.expect("a row");
        let number = |column: usize| row[column].parse::<f64>().expect("a number");
        let case = CASES.iter().position(|case| case.0 == &row[0]).expect("a known case");
        let direction = match &row[1] {
            "down" => Direction::Down,
            "up" => Direction::Up,
            _ => Direction::TwoWay,
        };
        let (model, t) = (vacuum(case, direction), number(2));
        let delay = (model.delay(t).expect("a position") - number(3)).abs();
        let rapidity = (model.rapidity(t).expect("a position") - number(4)).abs();
        worst[case] = (worst[case].0.max(delay), worst[case].1.max(rapidity));
        rows += 1;
    }
    println!("{rows} rows, worst delay (s) and rapidity {worst:?}");
    assert_eq!(rows, 3 * (76 + 12 + 12));
    // 1 mHz at 437 MHz is 2.3e-12; what is left is the position's noise, under 2 um.
    assert!(worst.iter().all(|worst| worst.0 < 1e-14 && worst.1 < 1e-14), "{worst:?}");
}

#[test]
fn rapidity_is_the_slope_of_the_delay() {
    for (case, direction) in [Direction::Down, Direction::Up, Direction::TwoWay]
        .into_iter()
        .cycle()
        .zip([0, 0, 0, 1, 1, 1, 2, 2, 2])
        .map(|(direction, case)| (case, direction))
    {
        let model = vacuum(case, direction);
        let delay = |t: f64| model.delay(t).expect("a position");
        let mut worst = 0.0f64;
        for step in 0..140 {
            let (t, h) = (350.0 + 5.2 * f64::from(step), 0.4);
            let slope = (45.0 * (delay(t + h) - delay(t - h))
                - 9.0 * (delay(t + 2.0 * h) - delay(t - 2.0 * h))
                + delay(t + 3.0 * h)
                - delay(t - 3.0 * h))
                / (60.0 * h);
            let expected = match direction {
                Direction::Up => -slope.ln_1p(),
                _ => (-slope).ln_1p(),
            };
            worst = worst.max((model.rapidity(t).expect("a position") - expected).abs());
        }
        println!("{} {direction:?}: {worst:.2e}", CASES[case].0);
        assert!(worst < 1e-14, "{direction:?}: {worst}");
    }
}

#[test]
fn noise_of_the_derivative() {
    // Third differences over 10 ms leave nothing of the motion (5e-9 m/s) and 4.5 times the noise.
    for (days, bound) in [(0.01, 1e-8), (1.0, 2e-7), (10.0, 1e-6), (30.0, 6e-6)] {
        let orbit = orbit(0, days * 24.0);
        let velocity = |step: i32| orbit.derivative(f64::from(step) * 0.01).expect("a position").velocity;
        let mut sum = 0.0;
        for step in 0..400 {
            let third =
                velocity(step + 3) - velocity(step + 2) * 3.0 + velocity(step + 1) * 3.0 - velocity(step);
            sum += third.dot(third) / (3.0 * 20.0);
        }
        let noise = (sum / 400.0).sqrt();
        println!("{days} days from the epoch: {noise:.1e} m/s, {:.1e} of c", noise / SPEED_OF_LIGHT);
        assert!(noise < bound, "{days}: {noise}");
    }
}

#[test]
fn a_late_spacecraft_is_where_it_was() {
    let late = orbit(0, 0.0).late_by(3.0);
    for t in [0.0, 400.0, 1000.0] {
        let off = late.state(t + 3.0).expect("a position").position
            - orbit(0, 0.0).state(t).expect("a position").position;
        assert!(off.length() < 1e-5, "{}", off.length());
    }
}

#[test]
fn clocks_of_circular_orbits() {
    // L_G - 3GM/(2 a c^2) without the flattening, by substitution of v^2 = GM/a: 40-digit arithmetic.
    let clock = |radius: f64| {
        let speed = (GRAVITATIONAL_PARAMETER / radius).sqrt();
        // At sin^2(latitude) = 1/3 the flattening drops out.
        let (across, along) = (radius * (2.0f64 / 3.0).sqrt(), radius / 3.0f64.sqrt());
        let velocity = Vector::new(0.0, speed, 0.0);
        clock_rate(State { position: Vector::new(across, 0.0, along), velocity })
    };
    // IS-GPS-200E: -4.4647e-10 is the offset that the satellite's clock is given, the negative of its rate.
    assert!((clock(26_561_750.0) - 4.464_732_995e-10).abs() < 1e-18);
    for (height, expected) in
        [(400e3, -2.8454e-10), (550e3, -2.6329e-10), (800e3, -2.2985e-10), (1200e3, -1.8093e-10)]
    {
        let found = clock(EARTH_RADIUS_WGS84 + height);
        assert!((found - expected).abs() < 0.6e-14, "{height}: {found}");
    }
    assert!((clock(42_164_170.0) - 5.3915e-10).abs() < 0.1e-13);
    assert!(clock(9_545_510.0).abs() < 1e-15);
    assert!(
        (1.5 * GRAVITATIONAL_PARAMETER / (9_545_510.0 * SPEED_OF_LIGHT.powi(2)) - GEOID_RATE).abs() < 1e-15
    );
}
