//! Sidereal time, TEME to the pseudo-Earth-fixed frame, geodetic sites.

use shiftkeel_desk::frames::{EarthRotation, Site, sidereal_angle};
use shiftkeel_desk::instant;
use shiftkeel_desk::vector::{State, Vector};

/// UT1 seconds from 2000-01-01T12:00 to an ISO time that is given in UT1.
fn ut1(text: &str) -> f64 {
    let noon = instant::read("2000-01-01T12:00:00Z").expect("a time");
    instant::seconds_between(noon, instant::read(text).expect("a time"))
}

fn assert_near(found: Vector, x: f64, y: f64, z: f64, bound: f64) {
    let off = found - Vector::new(x, y, z);
    let worst = off.x.abs().max(off.y.abs()).max(off.z.abs());
    assert!(worst <= bound, "{found:?} is {worst} from ({x}, {y}, {z}), allowed {bound}");
}

#[test]
fn sidereal_time_of_published_examples() {
    // Vallado, Fundamentals of Astrodynamics, example 3-5 (from memory); with a two-part date.
    assert!((sidereal_angle(ut1("1992-08-20T12:14:00")).to_degrees() - 152.578_787_852).abs() < 1e-9);
    // Meeus, Astronomical Algorithms, examples 12.a and 12.b (from memory); four digits of a second of time.
    let hours = 13.0 + 10.0 / 60.0 + 46.3668 / 3600.0;
    assert!((sidereal_angle(ut1("1987-04-10T00:00:00")).to_degrees() - hours * 15.0).abs() < 0.5e-4 / 240.0);
    assert!((sidereal_angle(ut1("1987-04-10T19:21:00")).to_degrees() - 128.737_873_3).abs() < 1e-7);
    // ERFA, test of gmst82 at 2400000.5 + 53736.0, which is 2006-01-01T00:00 (from memory).
    assert!((sidereal_angle(ut1("2006-01-01T00:00:00")) - 1.754_174_981_860_675).abs() < 1e-12);
    // The same polynomial in 40-digit arithmetic.
    assert!((sidereal_angle(ut1("2026-06-01T12:12:00")) - 1.273_996_963_147_960_2).abs() < 1e-13);
}

#[test]
fn rotation_is_linear_to_a_picoradian_over_ten_days() {
    let reference = instant::read("2026-06-01T00:00:00").expect("a time");
    let rotation = EarthRotation::new(reference, 0.25);
    let days = 864_000.0;
    let later = sidereal_angle(ut1("2026-06-11T00:00:00.25"));
    let difference = (rotation.angle(days) - later).rem_euclid(std::f64::consts::TAU);
    let difference = difference.min(std::f64::consts::TAU - difference);
    assert!(difference < 2e-12, "{difference}");
}

#[test]
fn published_teme_state_in_the_pseudo_earth_fixed_frame() {
    // Vallado, example 3-15, and AIAA 2006-6753, appendix C.
    let reference = instant::read("2004-04-06T07:51:28.386009Z").expect("a time");
    let teme = State {
        position: Vector::new(5_094_180.162_10, 6_127_644.659_50, 6_380_344.532_70),
        velocity: Vector::new(-4_746.131_487, 785.818_041, 5_531.931_288),
    };
    let fixed = EarthRotation::new(reference, -0.439_961).to_earth_fixed(teme, 0.0);
    assert_near(fixed.position, -1_033_475.03, 7_901_305.59, 6_380_344.53, 0.02);
    // The published velocity also takes the excess length of that day (1.6 ms), which is 1e-5 m/s here.
    assert_near(fixed.velocity, -3_225.632_75, -2_872.442_51, 5_531.931_29, 3e-5);
}

#[test]
fn geodetic_sites_of_published_examples() {
    // IOGP guidance note 7-2, geographic/geocentric conversion (from memory); millimetres.
    let degrees = |whole: f64, minutes: f64, seconds: f64| whole + minutes / 60.0 + seconds / 3600.0;
    let site =
        Site::from_degrees(degrees(53.0, 48.0, 33.820), degrees(2.0, 7.0, 46.380), 73.0).expect("a site");
    assert_near(site.earth_fixed(), 3_771_793.968, 140_253.342, 5_124_304.349, 0.6e-3);
    // ERFA, test of gd2gc for WGS-84 (from memory).
    let site = Site::from_degrees((-0.5f64).to_degrees(), 3.1f64.to_degrees(), 2500.0).expect("a site");
    let (x, y, z) = (-5_599_000.557_704_994, 233_011.672_234_792_03, -3_040_909.470_698_336);
    assert_near(site.earth_fixed(), x, y, z, 1e-8);
    // Site of the synthetic pass, computed elsewhere with two astronomy libraries.
    let site: Site = "45.0,7.5,300".parse().expect("a site");
    assert_near(site.earth_fixed(), 4_479_152.579_84, 589_691.624_21, 4_487_560.540_9, 1e-4);
}

#[test]
fn directions_from_a_site() {
    // By definition: up is 90 degrees, and the four winds stand at 0, 90, 180 and 270.
    for text in ["45.0,7.5,300", "-33.9,-70.4,2400", "0,0,0", "89.9,-180,0"] {
        let site: Site = text.parse().expect("a site");
        assert!((site.look(site.up()).elevation.to_degrees() - 90.0).abs() < 1e-6);
        let east = Vector::new(-site.longitude().sin(), site.longitude().cos(), 0.0);
        let up = site.up();
        let north = Vector::new(
            up.y * east.z - up.z * east.y,
            up.z * east.x - up.x * east.z,
            up.x * east.y - up.y * east.x,
        );
        for (direction, azimuth) in [(north, 0.0), (east, 90.0), (-north, 180.0), (-east, 270.0)] {
            let look = site.look(direction + up);
            assert!((look.elevation.to_degrees() - 45.0).abs() < 1e-9);
            let off = (look.azimuth.to_degrees() - azimuth + 180.0).rem_euclid(360.0) - 180.0;
            assert!(off.abs() < 1e-9, "{text}: {off}");
        }
    }
}

#[test]
fn sites_off_the_earth_are_refused() {
    for text in
        ["90.1,0,0", "-91,0,0", "0,361,0", "0,-180.5,0", "0,0,-1001", "0,0,400000", "nan,0,0", "0,0,inf"]
    {
        let error = text.parse::<Site>().expect_err(text).to_string();
        assert!(error.contains("off the Earth"), "{error}");
    }
    for text in ["", "45,7", "45,7,300,1", "45;7;300", "north,7,300", "45,,300"] {
        let error = text.parse::<Site>().expect_err(text).to_string();
        assert!(error.contains("LATITUDE,LONGITUDE,HEIGHT"), "{error}");
    }
    for text in ["90,0,0", "-90,360,-430", "45.0, 7.5, 300"] {
        assert!(text.parse::<Site>().is_ok(), "{text}");
    }
}
