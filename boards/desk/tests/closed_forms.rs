//! How large and how fast: exact circular motion round a sphere that stands still, and published envelopes.
//!
//! Closed forms, two lines each: with the centre, the site (radius R) and the spacecraft (radius r, speed v) as
//! a triangle, the law of sines gives |range rate| = v (R/r) cos(elevation); differentiated at the zenith the
//! range acceleration is v^2 R / (r h).

use shiftkeel_desk::SPEED_OF_LIGHT;
use shiftkeel_desk::frames::{EARTH_ROTATION, Site};
use shiftkeel_desk::geometric::{Direction, Sight, sight_of};
use shiftkeel_desk::orbit::GRAVITATIONAL_PARAMETER;
use shiftkeel_desk::vector::{State, Vector};

const SPHERE: f64 = 6_371_000.0;

/// A site at the pole, raised until it is 6371 km from the centre: its vertical points away from the centre.
fn site() -> Site {
    let site = Site::from_degrees(90.0, 0.0, SPHERE - 6_356_752.314_245_18).expect("a site");
    assert!((site.earth_fixed().z - SPHERE).abs() < 1e-6);
    site
}

struct Overhead {
    radius: f64,
    speed: f64,
}

impl Overhead {
    fn new(height: f64) -> Self {
        let radius = SPHERE + height;
        Self { radius, speed: (GRAVITATIONAL_PARAMETER / radius).sqrt() }
    }

    /// Over an equator that turns towards it.
    fn against_rotation(self) -> Self {
        Self { speed: self.speed + EARTH_ROTATION * self.radius, ..self }
    }

    /// What the site sees `t` seconds after the zenith.
    fn sight(&self, t: f64) -> Sight {
        let (sine, cosine) = (self.speed / self.radius * t).sin_cos();
        let position = Vector::new(self.radius * sine, 0.0, self.radius * cosine);
        let velocity = Vector::new(self.speed * cosine, 0.0, -self.speed * sine);
        sight_of(&site(), State { position, velocity }, Direction::Down)
    }

    /// The shift at an elevation in degrees while approaching, parts per million.
    fn ppm_at(&self, degrees: f64) -> f64 {
        self.at(degrees).rapidity * 1e6
    }

    fn at(&self, degrees: f64) -> Sight {
        let (mut low, mut high) = (-std::f64::consts::PI * self.radius / self.speed / 2.0, 0.0);
        for _ in 0..80 {
            let middle = (low + high) / 2.0;
            let above = self.sight(middle).look.elevation.to_degrees() > degrees;
            if above { high = middle } else { low = middle }
        }
        self.sight(high)
    }

    /// Range acceleration at the zenith, m/s^2.
    fn zenith(&self) -> f64 {
        (self.sight(0.05).range_rate - self.sight(-0.05).range_rate) / 0.1
    }
}

#[test]
fn table_of_circular_orbits() {
    // Height, speed, ppm at the horizon and at 10 degrees, ppm/s at the zenith.
    let table = [
        (400e3, 7672.599, 24.0811, 23.7153, 0.46191),
        (550e3, 7588.998, 23.3025, 22.9485, 0.32153),
        (600e3, 7561.733, 23.0522, 22.7020, 0.29052),
        (800e3, 7455.539, 22.0946, 21.7589, 0.20591),
        (1200e3, 7255.916, 20.3669, 20.0575, 0.12315),
        (10_000e3, 4934.365, 6.4054, 6.3080, 0.00316),
    ];
    for (height, speed, horizon, ten, zenith) in table {
        let orbit = Overhead::new(height);
        assert!((orbit.speed - speed).abs() < 0.6e-3, "{height}");
        // The table has v/c; ln of the factor differs from it by its third power only.
        assert!((orbit.ppm_at(0.0) - horizon).abs() < 0.6e-4, "{height}: {}", orbit.ppm_at(0.0));
        assert!((orbit.ppm_at(10.0) - ten).abs() < 0.6e-4, "{height}: {}", orbit.ppm_at(10.0));
        let rate = orbit.zenith() / SPEED_OF_LIGHT * 1e6;
        assert!((rate - zenith).abs() < 0.6e-5, "{height}: {rate}");
        for t in [-300.0, -100.0, 17.0, 250.0] {
            let sight = orbit.sight(t);
            let closed = orbit.speed * SPHERE / orbit.radius * sight.look.elevation.cos();
            assert!((sight.range_rate.abs() - closed).abs() < 1e-6, "{height} at {t}");
        }
    }
}

#[test]
fn hertz_at_550_km() {
    let orbit = Overhead::new(550e3);
    let rate = orbit.zenith() / SPEED_OF_LIGHT;
    for (carrier, shift, steepest, digits) in [
        (145e6, 3378.9, 46.62, 0.1),
        (437e6, 10_183.2, 140.51, 0.2),
        (2.2e9, 51_270.0, 707.4, 5.0),
        (8.4e9, 195_700.0, 2701.0, 50.0),
    ] {
        let sight = orbit.at(0.0);
        // The table is first order; half the square of 23 ppm on top.
        let first_order = -sight.range_rate / SPEED_OF_LIGHT * carrier;
        assert!((first_order - shift).abs() < digits, "{carrier}: {first_order}");
        assert!((sight.shift(carrier) - first_order).abs() < carrier * 2.8e-10, "{carrier}");
        assert!((rate * carrier / steepest - 1.0).abs() < 2e-4, "{carrier}: {}", rate * carrier);
    }
}

#[test]
fn envelopes_of_3gpp() {
    let near = |found: f64, published: f64| {
        assert!((found / published - 1.0).abs() < 0.10, "{found} against {published}");
    };
    // TR 36.763, table 6.1-1 (draft): ppm and ppm/s; slant range at 10 degrees, km.
    for (height, ppm, rate, slant) in [(600e3, 24.0, 0.27, 1932.0), (1200e3, 21.0, 0.13, 3131.0)] {
        let orbit = Overhead::new(height);
        near(orbit.ppm_at(0.0), ppm);
        near(orbit.zenith() / SPEED_OF_LIGHT * 1e6, rate);
        near(orbit.at(10.0).range * 1e-3, slant);
    }
    near(Overhead::new(35_786e3).at(10.0).range * 1e-3, 40_581.0);
    // TR 38.811, tables 5.3.4.3.2-7 and 5.3.5-1 (as quoted elsewhere): largest shift and its rate, Hz.
    for (height, carrier, shift, rate) in [(600e3, 2e9, 48e3, 544.0), (600e3, 20e9, 480e3, 5440.0)] {
        let orbit = Overhead::new(height);
        near(orbit.at(0.0).shift(carrier), shift);
        near(orbit.zenith() / SPEED_OF_LIGHT * carrier, rate);
    }
    // At 10,000 km, +-15 kHz and -6 Hz/s at 2 GHz, the turning Earth is worth a quarter of the speed: the published
    // shift must lie between that over a standing Earth and that of a spacecraft against the rotation.
    let (standing, turning) = (Overhead::new(10_000e3), Overhead::new(10_000e3).against_rotation());
    assert!(standing.at(0.0).shift(2e9) < 15e3 && 15e3 < turning.at(0.0).shift(2e9));
    near(standing.zenith() / SPEED_OF_LIGHT * 2e9, 6.0);
}
