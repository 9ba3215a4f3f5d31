//! The f64 reference in Rust against the Python vectors, against closed forms and against itself.
mod reference;

use reference::orbits::Passes;
use reference::{
    EARTH_GM, EARTH_RATE, EQUATOR_RADIUS, SPEED_OF_LIGHT, Site, Tag, Vector, derivative, late, length, link,
    minus, vector_derivative, vectors,
};

fn worst(pairs: impl Iterator<Item = f64>) -> f64 {
    pairs.fold(0.0, |worst, x| if x.is_nan() { f64::INFINITY } else { worst.max(x.abs()) })
}

#[test]
fn synthetic_pass_agrees_with_vectors_for_every_tagging() {
    let grid = vectors::positions(vectors::SYNTHETIC);
    let start = grid.start;
    let mut link = link(|t| grid.at(t), vectors::SYNTHETIC_SITE);
    // The grid starts at 340 s, the vectors' clocks agree at 0 s: the clocks' offset at 350 s is checked apart.
    link.clock_epoch = 350.0;
    let table = vectors::synthetic_pass();
    let t = table.column("t_s");
    let inside: Vec<usize> =
        (0..t.len()).filter(|&k| t[k] >= start + 10.0 && t[k] <= grid.end() - 10.0).collect();
    assert!(inside.len() > 250);
    for tag in Tag::ALL {
        let (delay, rapidity) = (
            table.column(&format!("{}_delay_s", tag.name())),
            table.column(&format!("{}_rapidity", tag.name())),
        );
        let apart = |k: usize| link.delay(tag, t[k]) - delay[k];
        let offset = apart(inside[0]);
        // From 0 to 350 s at a rate of -2.65e-10 within 0.02e-10.
        let sign = match tag {
            Tag::TwoWayReception => 0.0,
            Tag::DownlinkReception | Tag::DownlinkTransmission => -1.0,
            _ => 1.0,
        };
        assert!((offset - sign * 350.0 * 2.65e-10).abs() < 350.0 * 0.02e-10, "{tag:?} {offset:e}");
        let delay = worst(inside.iter().map(|&k| apart(k) - offset));
        let rapidity = worst(inside.iter().map(|&k| link.rapidity(tag, t[k]) - rapidity[k]));
        println!("{tag:?}: delay {delay:.1e} s, rapidity {rapidity:.1e}");
        assert!(delay < 2e-14, "{tag:?} {delay:e}");
        assert!(rapidity < 2e-14, "{tag:?} {rapidity:e}");
    }
}

#[test]
fn every_orbit_agrees_with_vectors() {
    let passes = vectors::orbit_passes();
    assert_eq!(passes.len(), 13);
    for pass in passes {
        let grid = vectors::positions(pass.object);
        let mut link = link(|t| grid.at(t), pass.site);
        link.clock_epoch = pass.first;
        let table = vectors::orbit_vectors(pass.object);
        let t = table.column("t_s");
        for tag in [Tag::DownlinkReception, Tag::UplinkTransmission] {
            let (delay, rapidity) = (
                table.column(&format!("{}_delay_s", tag.name())),
                table.column(&format!("{}_rapidity", tag.name())),
            );
            let offset = link.delay(tag, t[0]) - delay[0];
            let delay = worst((0..t.len()).map(|k| link.delay(tag, t[k]) - delay[k] - offset));
            let rapidity = worst((0..t.len()).map(|k| link.rapidity(tag, t[k]) - rapidity[k]));
            println!("{} {tag:?}: delay {delay:.1e} s, rapidity {rapidity:.1e}", pass.object);
            assert!(offset.abs() < 60.0 * 6e-10, "{} {offset:e}", pass.object);
            assert!(delay < 1e-13, "{} {tag:?} {delay:e}", pass.object);
            assert!(rapidity < 5e-14, "{} {tag:?} {rapidity:e}", pass.object);
        }
        let elevation = table.column("elevation_deg");
        let apart = worst((0..t.len()).map(|k| pass.site.elevation_deg(grid.at(t[k])) - elevation[k]));
        assert!(apart < 5.1e-4, "{} {apart}", pass.object);
    }
}

#[test]
fn late_spacecraft_agrees_with_vectors() {
    let grid = vectors::positions(vectors::SYNTHETIC);
    let table = vectors::synthetic_pass_late();
    let t = table.column("t_s");
    for (lateness, name) in [(1.0, "late_1"), (3.0, "late_3"), (-2.0, "early_2")] {
        let mut link = link(late(|t| grid.at(t), lateness, EARTH_RATE), vectors::SYNTHETIC_SITE);
        link.clock_epoch = 350.0;
        let (delay, rapidity) =
            (table.column(&format!("{name}_delay_s")), table.column(&format!("{name}_rapidity")));
        let inside: Vec<usize> = (0..t.len()).filter(|&k| t[k] >= 350.0 && t[k] <= 1080.0).collect();
        assert!(inside.len() > 140);
        let apart = |k: usize| link.delay(Tag::DownlinkReception, t[k]) - delay[k];
        let offset = apart(inside[0]);
        let delay = worst(inside.iter().map(|&k| apart(k) - offset));
        let rapidity =
            worst(inside.iter().map(|&k| link.rapidity(Tag::DownlinkReception, t[k]) - rapidity[k]));
        println!("{name}: delay {delay:.1e} s, rapidity {rapidity:.1e}");
        assert!(delay < 2e-14 && rapidity < 2e-14, "{name} {delay:e} {rapidity:e}");
    }
}

/// Light from a source that recedes along a line: c tau = x + v (t - tau), so tau = (x + v t)/(c + v).
#[test]
fn light_time_of_a_straight_line_is_the_closed_form() {
    let speed = 7500.0;
    let mut link = link(move |t| [EQUATOR_RADIUS + 1e6 + speed * t, 0.0, 0.0], SITE_ON_AXIS);
    link.earth_rate = 0.0;
    for t in [0.0, 100.0, 700.0] {
        let expected = (1e6 + speed * t) / (SPEED_OF_LIGHT + speed);
        assert!((link.light_time(Tag::DownlinkReception, t) - expected).abs() < 1e-17);
        let expected = (1e6 + speed * t) / (SPEED_OF_LIGHT - speed);
        assert!((link.light_time(Tag::UplinkTransmission, t) - expected).abs() < 1e-17);
        // 1 - tau' = c/(c + v); the spacecraft's clock, at the time of transmission, is taken away.
        let clock = link.clock_rate(link.spacecraft_time(Tag::DownlinkReception, t)).ln_1p();
        let moving = link.rapidity(Tag::DownlinkReception, t) - clock;
        assert!((moving + (speed / SPEED_OF_LIGHT).ln_1p()).abs() < 1e-15, "{moving:e}");
    }
}

const SITE_ON_AXIS: Site = Site { latitude_deg: 0.0, longitude_deg: 0.0, height_m: 0.0 };

/// A geostationary spacecraft stands still over the Earth: only the clock is left. +5.3915e-10 for the point-mass
/// potential (check value computed from L_G - 3GM/(2ac^2); the constants' sources are in the reference).
#[test]
fn geostationary_shift_is_the_clock_alone() {
    let radius = (EARTH_GM / (EARTH_RATE * EARTH_RATE)).cbrt();
    let mut link =
        link(move |_| [radius, 0.0, 0.0], Site { latitude_deg: 30.0, longitude_deg: 20.0, height_m: 0.0 });
    link.j2 = 0.0;
    for t in [0.0, 5000.0] {
        assert!((link.rapidity(Tag::DownlinkReception, t) - 5.3915e-10).abs() < 1e-14);
        assert!((link.rapidity(Tag::UplinkTransmission, t) + 5.3915e-10).abs() < 1e-14);
        assert!(link.rapidity(Tag::TwoWayReception, t).abs() < 1e-15);
    }
}

/// Net clock rates of circular orbits over the geoid, from L_G - 3GM/(2ac^2) with a = 6378.137 km + h.
#[test]
fn clock_rates_of_circular_orbits() {
    for (height, expected) in
        [(400e3, -2.8454e-10), (550e3, -2.6329e-10), (800e3, -2.2985e-10), (1200e3, -1.8093e-10)]
    {
        let radius: f64 = EQUATOR_RADIUS + height;
        let rate = (EARTH_GM / radius.powi(3)).sqrt();
        let mut link =
            link(move |t: f64| [radius * (rate * t).cos(), radius * (rate * t).sin(), 0.0], SITE_ON_AXIS);
        link.earth_rate = 0.0;
        link.j2 = 0.0;
        let seen = link.clock_rate(300.0);
        assert!((seen - expected).abs() < 0.6e-14, "{height} {seen:e}");
    }
}

fn check_pass(pass: &reference::orbits::Pass) {
    let middle = (pass.rise + pass.set) / 2.0;
    assert!((0.0..1.0).contains(&pass.rise) && pass.set > pass.rise + 60.0, "{pass:?}");
    for edge in [pass.rise, pass.set] {
        assert!(pass.elevation_deg(edge).abs() < 1e-6, "{pass:?}");
    }
    for k in 1..20 {
        assert!(pass.elevation_deg(pass.rise + (pass.set - pass.rise) * k as f64 / 20.0) > 0.0, "{pass:?}");
    }
    let position = |t: f64| pass.orbit.position(t);
    let apart = length(minus(vector_derivative(position, middle, 0.5), pass.orbit.velocity(middle)));
    assert!(apart < 1e-4, "{apart:e} {pass:?}");
}

#[test]
fn random_passes_are_what_they_say() {
    let low: Vec<_> = Passes::low(1).take(100).collect();
    let any: Vec<_> = Passes::any(2).take(100).collect();
    assert!(low.iter().chain(&any).map(check_pass).count() == 200);
    assert!(low.iter().all(|p| p.set < 3600.0 && p.orbit.semi_major_m < EQUATOR_RADIUS + 1500e3));
    assert!(any.iter().any(|p| p.orbit.eccentricity > 0.3) && any.iter().any(|p| p.orbit.semi_major_m > 2e7));
    assert!(low.iter().any(|p| p.orbit.inclination > 1.8) && low.iter().any(|p| p.site.latitude_deg < -30.0));
    assert!(Passes::low(1).take(100).eq(low.iter().copied()), "the same seed gives the same passes");
    assert!(Passes::low(3).next() != low.first().copied(), "another seed gives others");
}

/// The slope of the apparent delay against the rapidity, which is formed in another way; y * tau' (below 2e-14)
/// separates them where the time is the spacecraft's.
#[test]
fn rapidity_is_the_slope_of_the_delay_on_random_passes() {
    for pass in Passes::any(7).take(60) {
        let orbit = pass.orbit;
        let mut link = link(move |t| -> Vector { orbit.position(t) }, pass.site);
        for tag in Tag::ALL {
            for k in 0..3 {
                let t = pass.rise + (pass.set - pass.rise) * (0.1 + 0.4 * k as f64);
                link.clock_epoch = t - 20.0;
                let slope = derivative(|x| link.delay(tag, x), t, 0.5);
                let earlier = matches!(tag, Tag::UplinkTransmission | Tag::DownlinkTransmission);
                let expected = if earlier { -slope.ln_1p() } else { (-slope).ln_1p() };
                let apart = (link.rapidity(tag, t) - expected).abs();
                assert!(apart < 4e-14, "{tag:?} {apart:e} {pass:?}");
            }
        }
    }
}
