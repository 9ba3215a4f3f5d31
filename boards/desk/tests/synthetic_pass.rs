//! An invented pass whose numbers were computed elsewhere: by two independent astronomy libraries that agree
//! to 2 mm and 6.1 um/s (skyfield with UT1 = UTC, astropy TEME to ITRS without polar motion).

use shiftkeel_desk::SPEED_OF_LIGHT;
use shiftkeel_desk::elements::ElementFile;
use shiftkeel_desk::frames::Site;
use shiftkeel_desk::geometric::{Direction, GeometricModel};
use shiftkeel_desk::instant;
use shiftkeel_desk::orbit::Orbit;
use shiftkeel_desk::vacuum::VacuumModel;
use shiftkeel_desk::vector::Vector;

const CARRIER: f64 = 437.0e6;
const CLOSEST: f64 = 715.415_22;

fn orbit() -> Orbit {
    let file =
        ElementFile::read("synthetic.txt", include_str!("data/synthetic.txt")).expect("valid elements");
    Orbit::new(&file.sets()[0], instant::read("2026-06-01T12:00:00Z").expect("a time"))
        .expect("usable elements")
}

fn site() -> Site {
    "45.0,7.5,300".parse().expect("a site")
}

fn geometric() -> GeometricModel {
    GeometricModel::new(orbit(), site(), 0.0)
}

fn vacuum(direction: Direction) -> VacuumModel {
    VacuumModel::new(orbit(), site(), 0.0, direction, (300.0, 1100.0)).expect("an orbit")
}

/// Seconds, elevation in degrees, range in km, range rate in km/s, redshift exponent, shift in hertz.
const ROWS: [(f64, f64, f64, f64, f64, f64); 12] = [
    (390.0, 2.5661, 2445.951654, -7.015244527, -2.340033693774e-5, 10226.067),
    (450.0, 7.2586, 2026.408079, -6.958971970, -2.321263189048e-5, 10144.038),
    (510.0, 13.3906, 1612.708549, -6.808675544, -2.271129697851e-5, 9924.949),
    (570.0, 22.3400, 1213.689025, -6.433958534, -2.146137557283e-5, 9378.722),
    (630.0, 37.4733, 853.322121, -5.391886580, -1.798539768689e-5, 7859.689),
    (690.0, 64.0465, 608.009576, -2.255271274, -7.522775219112e-6, 3287.465),
    (750.0, 59.3730, 631.956096, 2.953009842, 9.850180560173e-6, -4304.508),
    (810.0, 34.3787, 904.037998, 5.637758056, 1.880553665266e-5, -8217.942),
    (870.0, 20.5416, 1273.475245, 6.522363691, 2.175626343627e-5, -9507.384),
    (930.0, 12.1644, 1676.102327, 6.849091543, 2.284611023897e-5, -9983.636),
    (990.0, 6.3101, 2091.625177, 6.981967121, 2.328933545883e-5, -10177.321),
    (1050.0, 1.7677, 2512.299179, 7.030889800, 2.345252394942e-5, -10248.633),
];

#[test]
fn geometric_rows() {
    let model = geometric();
    let (mut worst_range, mut worst_rate) = (0.0f64, 0.0f64);
    for (t, elevation, range, rate, exponent, shift) in ROWS {
        let sight = model.sight(t, Direction::Down).expect("a position");
        assert!((sight.look.elevation.to_degrees() - elevation).abs() < 0.001, "elevation at {t}");
        let (off_range, off_rate) =
            ((sight.range * 1e-3 - range).abs(), (sight.range_rate * 1e-3 - rate).abs());
        assert!(off_range < 10e-6, "range at {t}: {off_range} km off");
        assert!(off_rate < 20e-9, "range rate at {t}: {off_rate} km/s off");
        assert!((sight.rapidity + exponent).abs() < 20e-6 / SPEED_OF_LIGHT, "rapidity at {t}");
        assert!((sight.shift(CARRIER) - shift).abs() < 0.0006, "shift at {t}");
        (worst_range, worst_rate) = (worst_range.max(off_range), worst_rate.max(off_rate));
    }
    println!("worst {:.2} mm, {:.2} um/s", worst_range * 1e6, worst_rate * 1e9);
}

#[test]
fn states_at_720_s() {
    let near = |found: Vector, (x, y, z): (f64, f64, f64), bound: f64| {
        let off = (found - Vector::new(x, y, z)).length();
        assert!(off < bound, "{found:?}: {off}");
    };
    let teme = orbit().state(720.0).expect("a position");
    near(teme.position, (650_022.492_1, 4_917_515.793_6, 4_824_497.533_6), 1e-3);
    near(teme.velocity, (2_071.979_50, 4_985.008_42, -5_339.359_31), 1e-4);
    let fixed = geometric().earth_fixed(720.0).expect("a position");
    near(fixed.position, (4_892_615.685_18, 816_579.804_71, 4_824_497.533_6), 3e-3);
}

#[test]
fn horizon_and_closest_approach() {
    let model = geometric();
    let elevation = |t: f64| model.sight(t, Direction::Down).expect("a position").look.elevation.to_degrees();
    // Rises at 0.07 degrees a second: 1e-4 s of the published instants.
    assert!(elevation(351.3376).abs() < 2e-5);
    assert!(elevation(1076.8659).abs() < 2e-5);
    let closest = model.sight(CLOSEST, Direction::Down).expect("a position");
    assert!((closest.look.elevation.to_degrees() - 71.6404).abs() < 1e-4);
    assert!((closest.range - 578_638.18).abs() < 0.01);
    let rate = |t: f64| model.sight(t, Direction::Down).expect("a position").range_rate;
    assert!((rate(CLOSEST + 0.5) - rate(CLOSEST - 0.5) - 93.263).abs() < 3e-3);
    assert!(rate(CLOSEST).abs() < 1e-3);
}

#[test]
fn geometric_directions() {
    let model = geometric();
    let rapidity = |direction| model.sight(570.0, direction).expect("a position").rapidity;
    assert_eq!(rapidity(Direction::Down).to_bits(), rapidity(Direction::Up).to_bits());
    assert_eq!(rapidity(Direction::TwoWay).to_bits(), (2.0 * rapidity(Direction::Down)).to_bits());
    assert!(rapidity(Direction::Down) > 0.0, "approaching is positive");
}

#[test]
fn vacuum_against_geometric() {
    // Light time and clocks together on this pass at 437 MHz, from an independent computation.
    let (model, plain) = (vacuum(Direction::Down), geometric());
    let more = |t: f64| {
        let shift = model.sight(t).expect("a position").shift(CARRIER);
        shift - plain.sight(t, Direction::Down).expect("a position").shift(CARRIER)
    };
    // SGP4's own velocity is not the derivative of its position: up to 12 mHz in the difference.
    for (t, expected) in [(390.0, 0.0075), (690.0, 0.1317), (CLOSEST, 0.1442), (870.0, 0.0372)] {
        let found = more(t);
        assert!((found - expected).abs() < 0.012, "at {t} s: {found} Hz, expected {expected}");
    }
    // The same without that difference: plain geometry with the derivative of the range.
    let derived = |t: f64| {
        let range = |t: f64| plain.sight(t, Direction::Down).expect("a position").range;
        let h = 0.5;
        let rate = (45.0 * (range(t + h) - range(t - h)) - 9.0 * (range(t + 2.0 * h) - range(t - 2.0 * h))
            + range(t + 3.0 * h)
            - range(t - 3.0 * h))
            / (60.0 * h);
        CARRIER * (-(rate / SPEED_OF_LIGHT).atanh()).exp_m1()
    };
    for (t, expected) in [(390.0, 0.0075), (690.0, 0.1317), (CLOSEST, 0.1442), (870.0, 0.0372)] {
        let found = model.sight(t).expect("a position").shift(CARRIER) - derived(t);
        println!("{t} s: {found:.5} Hz, with SGP4's own velocity {:.5} Hz, expected {expected}", more(t));
        assert!((found - expected).abs() < 1.5e-4, "at {t} s: {found} Hz, expected {expected}");
    }
}

#[test]
fn down_and_up_differ() {
    // 0.288 Hz at closest approach at 437 MHz, 5.5 Hz at 8.4 GHz.
    let down = vacuum(Direction::Down).rapidity(CLOSEST).expect("a position");
    let up = vacuum(Direction::Up).rapidity(CLOSEST).expect("a position");
    assert!(((down - up) * CARRIER - 0.288).abs() < 0.0006, "{}", (down - up) * CARRIER);
    assert!(((down - up) * 8.4e9 - 5.5).abs() < 0.06, "{}", (down - up) * 8.4e9);
}
