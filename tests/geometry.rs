//! The geometry: delay, rapidity and sky position against the independent references and published figures.
#![allow(clippy::excessive_precision, reason = "digits as published")]

mod passes;
mod reference;

use passes::{CARRIER, MILLIHERTZ, epoch, synthetic, worst};
use reference::{EARTH_RATE, Link, SPEED_OF_LIGHT, Tag, late, link, vectors};
use shiftkeel::pass::{Arc, Direction, Geometry, Site, TaggedAt};

/// As far as the vectors of the synthetic pass go.
const WHOLE: [f64; 2] = [340.0, 1090.0];
const TAGS: [(Tag, Direction, TaggedAt); 5] = [
    (Tag::DownlinkReception, Direction::Down, TaggedAt::Ground),
    (Tag::UplinkTransmission, Direction::Up, TaggedAt::Ground),
    (Tag::TwoWayReception, Direction::TwoWay, TaggedAt::Ground),
    (Tag::DownlinkTransmission, Direction::Down, TaggedAt::Spacecraft),
    (Tag::UplinkReception, Direction::Up, TaggedAt::Spacecraft),
];

fn geometry(words: &[u32], direction: Direction, tagged_at: TaggedAt, lateness: f64) -> Geometry {
    let arc = Arc::new(words).unwrap();
    Geometry::new(&arc, &passes::site(&vectors::SYNTHETIC_SITE), direction, tagged_at, lateness).unwrap()
}

/// Largest differences of delay (after its mean, which is the clocks' other epoch, is taken away) and rapidity, and
/// the mean.
fn apart(
    geometry: &Geometry,
    origin: f64,
    times: &[f64],
    delays: &[f64],
    rapidities: &[f64],
) -> (f64, f64, f64) {
    let seen: Vec<_> = times.iter().map(|t| geometry.delay_and_rapidity(t - origin)).collect();
    let mean = seen.iter().zip(delays).map(|((delay, _), expected)| delay - expected).sum::<f64>()
        / times.len() as f64;
    let delay = worst(seen.iter().zip(delays).map(|((delay, _), expected)| delay - expected - mean));
    let rapidity = worst(seen.iter().zip(rapidities).map(|((_, rapidity), expected)| rapidity - expected));
    (delay, rapidity, mean)
}

/// The arc's positions and this crate's model against the Python vectors, for every direction and tagging end, at
/// every sample: 1 mHz at 437 MHz, and a delay within 5 cm.
#[test]
fn every_tagging_agrees_with_the_vectors() {
    let words = synthetic(WHOLE);
    let table = vectors::synthetic_pass();
    let times = table.column("t_s");
    for (tag, direction, tagged_at) in TAGS {
        let geometry = geometry(&words, direction, tagged_at, 0.0);
        let origin = geometry.origin().seconds_since(epoch());
        let column = |name: &str| table.column(&format!("{}_{name}", tag.name()));
        let (delay, rapidity, mean) =
            apart(&geometry, origin, &times, &column("delay_s"), &column("rapidity"));
        println!(
            "{tag:?}: {:.3} mHz, {:.5} cycles, mean {mean:.3e} s",
            rapidity / MILLIHERTZ,
            delay * CARRIER
        );
        assert!(rapidity < MILLIHERTZ, "{tag:?}: {rapidity:e}");
        assert!(delay < 0.05 / SPEED_OF_LIGHT * if direction == Direction::TwoWay { 2.0 } else { 1.0 });
        // The vectors' clocks agree at 0 s, the geometry's in the middle of the arc: 715 s at -2.65e-10 (within 1 %).
        let clocks = match direction {
            Direction::TwoWay => 0.0,
            Direction::Down => -715.0 * 2.65e-10,
            Direction::Up => 715.0 * 2.65e-10,
        };
        assert!((mean - clocks).abs() < 2e-9, "{tag:?}: {mean:e} {clocks:e}");
    }
}

/// The model alone: both models on the very same positions (the arc's own) differ by rounding.
#[test]
fn the_model_alone_agrees_to_rounding() {
    let words = synthetic(WHOLE);
    let trajectory = Arc::new(&words).unwrap().trajectory();
    for (tag, direction, tagged_at) in TAGS {
        let geometry = geometry(&words, direction, tagged_at, 0.0);
        let link = link(|t| trajectory.at(t).0, vectors::SYNTHETIC_SITE);
        let times = (0..=140).map(|k| f64::from(k) * 5.0 - 350.0);
        let (mut delay, mut rapidity, mut rate) = (0.0_f64, 0.0_f64, 0.0_f64);
        for t in times {
            let seen = geometry.delay_and_rapidity(t);
            delay = delay.max(worst([seen.0 - link.delay(tag, t)].into_iter()));
            rapidity = rapidity.max(worst([seen.1 - link.rapidity(tag, t)].into_iter()));
            let passage = geometry.passage(geometry.origin().plus_seconds(t));
            assert_eq!((passage.delay, passage.rapidity), seen);
            rate = rate.max(worst([passage.rate - link.rapidity_rate(tag, t)].into_iter()));
        }
        println!(
            "{tag:?}: delay {delay:.1e} s, rapidity {rapidity:.1e}, rate {:.4} mHz/s",
            rate / MILLIHERTZ
        );
        // 4e-15 s of it is the site's height in another standard gravity, over 350 s.
        assert!(delay < 1e-14, "{tag:?} {delay:e}");
        assert!(rapidity < 2e-15, "{tag:?} {rapidity:e}");
        assert!(rate < 2.0 * MILLIHERTZ, "{tag:?} {rate:e}");
    }
}

/// check-values: what the instantaneous geometric range rate leaves out at 437 MHz, light time and clocks together:
/// +0.0075 Hz at 390 s, +0.1317 at 690 s, +0.1442 at closest approach, +0.0372 at 870 s; and down less up 0.288 Hz
/// at closest approach. (Computed with two libraries; no printed source.)
#[test]
fn light_time_and_clocks_are_as_large_as_published() {
    let words = synthetic(WHOLE);
    let down = geometry(&words, Direction::Down, TaggedAt::Ground, 0.0);
    let up = geometry(&words, Direction::Up, TaggedAt::Ground, 0.0);
    let origin = down.origin().seconds_since(epoch());
    let shift = |geometry: &Geometry, t: f64| CARRIER * geometry.delay_and_rapidity(t - origin).1.exp_m1();
    let range_rate = |t: f64| reference::derivative(|t| down.look(t - origin).range, t, 0.5);
    let geometric = |t: f64| CARRIER * (-(range_rate(t) / SPEED_OF_LIGHT).atanh()).exp_m1();
    let closest = 715.41522;
    assert!(range_rate(closest).abs() < 1e-2);
    for (t, expected) in [(390.0, 0.0075), (690.0, 0.1317), (closest, 0.1442), (870.0, 0.0372)] {
        let seen = shift(&down, t) - geometric(t);
        println!("{t} s: {seen:+.4} Hz, published {expected:+.4}");
        assert!((seen - expected).abs() < 1.5e-3, "{t}: {seen}");
    }
    let seen = shift(&down, closest) - shift(&up, closest);
    println!("down less up {seen:.4} Hz");
    assert!((seen - 0.288).abs() < 1e-3, "{seen}");
}

/// check-values, section 3: the published table of the synthetic pass: elevation, range, and the geometric range
/// rate to what its rounded date leaves (20 mm of Earth rotation) and SGP4's own velocity (8.4 mm/s).
#[test]
fn the_published_table_comes_back() {
    const PUBLISHED: [(f64, f64, f64, f64); 12] = [
        (390.0, 2.5661, 2445.951654, -7.015244527),
        (450.0, 7.2586, 2026.408079, -6.958971970),
        (510.0, 13.3906, 1612.708549, -6.808675544),
        (570.0, 22.3400, 1213.689025, -6.433958534),
        (630.0, 37.4733, 853.322121, -5.391886580),
        (690.0, 64.0465, 608.009576, -2.255271274),
        (750.0, 59.3730, 631.956096, 2.953009842),
        (810.0, 34.3787, 904.037998, 5.637758056),
        (870.0, 20.5416, 1273.475245, 6.522363691),
        (930.0, 12.1644, 1676.102327, 6.849091543),
        (990.0, 6.3101, 2091.625177, 6.981967121),
        (1050.0, 1.7677, 2512.299179, 7.030889800),
    ];
    let words = synthetic(WHOLE);
    let geometry = geometry(&words, Direction::Down, TaggedAt::Ground, 0.0);
    let origin = geometry.origin().seconds_since(epoch());
    for (t, elevation, range, range_rate) in PUBLISHED {
        let look = geometry.look(t - origin);
        assert!(
            (look.elevation.to_degrees() - elevation).abs() < 6e-5,
            "{t}: {}",
            look.elevation.to_degrees()
        );
        assert!((look.range - range * 1e3).abs() < 0.05, "{t}: {}", look.range);
        let seen = reference::derivative(|t| geometry.look(t - origin).range, t, 0.5);
        assert!((seen - range_rate * 1e3).abs() < 9.5e-3, "{t}: {seen}");
    }
}

/// Elevation, azimuth and range against the geometric vectors.
#[test]
fn the_sky_agrees_with_the_vectors() {
    let words = synthetic(WHOLE);
    let geometry = geometry(&words, Direction::Down, TaggedAt::Ground, 0.0);
    let origin = geometry.origin().seconds_since(epoch());
    let table = vectors::synthetic_pass_geometric();
    let (t, elevation) = (table.column("t_s"), table.column("elevation_deg"));
    let (azimuth, range) = (table.column("azimuth_deg"), table.column("range_m"));
    let mut off = [0.0_f64; 3];
    for k in 0..t.len() {
        let look = geometry.look(t[k] - origin);
        off[0] = off[0].max(worst([look.elevation.to_degrees() - elevation[k]].into_iter()));
        let turn = (look.azimuth.to_degrees() - azimuth[k] + 540.0).rem_euclid(360.0) - 180.0;
        off[1] = off[1].max(worst([turn].into_iter()));
        off[2] = off[2].max(worst([look.range - range[k]].into_iter()));
        let passage = geometry.passage(geometry.origin().plus_seconds(t[k] - origin));
        assert!((passage.elevation - look.elevation).abs() < 1e-9);
    }
    println!("elevation {:.1e} deg, azimuth {:.1e} deg, range {:.4} m", off[0], off[1], off[2]);
    assert!(off[0] < 3e-6 && off[1] < 6e-6 && off[2] < 0.02, "{off:?}");
}

/// The other committed orbits, low to medium and eccentric: every sample within 1 mHz, the delay within 10 cm, down
/// and up.
#[test]
fn other_orbits_agree_with_the_vectors() {
    for pass in vectors::orbit_passes() {
        let grid = vectors::positions(pass.object);
        let words =
            passes::fitted(passes::utc(pass.epoch_utc), [pass.first, pass.last], |t| grid.at(t)).unwrap();
        let table = vectors::orbit_vectors(pass.object);
        let (times, elevations) = (table.column("t_s"), table.column("elevation_deg"));
        for (tag, direction, tagged_at) in &TAGS[..2] {
            let geometry = Geometry::new(
                &Arc::new(&words).unwrap(),
                &passes::site(&pass.site),
                *direction,
                *tagged_at,
                0.0,
            )
            .unwrap();
            let origin = geometry.origin().seconds_since(passes::utc(pass.epoch_utc));
            let column = |name: &str| table.column(&format!("{}_{name}", tag.name()));
            let (delay, rapidity, _) =
                apart(&geometry, origin, &times, &column("delay_s"), &column("rapidity"));
            let sky = worst(
                times
                    .iter()
                    .zip(&elevations)
                    .map(|(t, e)| geometry.look(t - origin).elevation.to_degrees() - e),
            );
            println!(
                "{} {tag:?}: {:.3} mHz, {:.4} cycles, elevation {sky:.1e} deg",
                pass.object,
                rapidity / MILLIHERTZ,
                delay * CARRIER
            );
            assert!(rapidity < MILLIHERTZ, "{}: {rapidity:e}", pass.object);
            assert!(delay < 0.1 / SPEED_OF_LIGHT, "{}: {delay:e}", pass.object);
            assert!(sky < 6e-4, "{}: {sky}", pass.object);
        }
    }
}

/// A ship at 15 m/s north-east: against the reference with a ground that moves, 22 Hz (check-values, section 8) from
/// the anchored one.
#[test]
fn a_moving_site_is_followed() {
    let words = synthetic(WHOLE);
    let arc = Arc::new(&words).unwrap();
    let trajectory = arc.trajectory();
    let ground = vectors::SYNTHETIC_SITE;
    let (speed, start) = (15.0 / 2.0_f64.sqrt(), -120.0);
    let (sin_lat, cos_lat) = ground.latitude_deg.to_radians().sin_cos();
    let (sin_lon, cos_lon) = ground.longitude_deg.to_radians().sin_cos();
    let velocity =
        [speed * (-sin_lon - sin_lat * cos_lon), speed * (cos_lon - sin_lat * sin_lon), speed * cos_lat];
    let place = ground.position();
    let moving = |t: f64| [0, 1, 2].map(|axis| place[axis] + velocity[axis] * (t - start));
    let link = Link::new(|t| trajectory.at(t).0, moving, ground.height_m);
    let anchored = passes::site(&ground);
    let ship = anchored.moving([speed, speed, 0.0], trajectory.middle().plus_seconds(start)).unwrap();
    for (tag, direction, tagged_at) in TAGS {
        let geometry = Geometry::new(&arc, &ship, direction, tagged_at, 0.0).unwrap();
        let still = Geometry::new(&arc, &anchored, direction, tagged_at, 0.0).unwrap();
        let (mut rapidity, mut delay, mut difference) = (0.0_f64, 0.0_f64, 0.0_f64);
        for t in (0..=70).map(|k| f64::from(k) * 10.0 - 350.0) {
            let seen = geometry.delay_and_rapidity(t);
            rapidity = rapidity.max(worst([seen.1 - link.rapidity(tag, t)].into_iter()));
            delay = delay.max(worst([seen.0 - link.delay(tag, t)].into_iter()));
            difference = difference.max((seen.1 - still.delay_and_rapidity(t).1).abs());
        }
        println!(
            "{tag:?}: {:.5} mHz, {delay:.1e} s; {:.1} Hz from the anchored site",
            rapidity / MILLIHERTZ,
            difference * CARRIER
        );
        // The ship's own clock (8e-14 at 15 m/s eastwards) is left out.
        assert!(rapidity < 2e-13 && delay < 1e-10, "{tag:?}: {rapidity:e} {delay:e}");
        let one_way = difference * CARRIER / if direction == Direction::TwoWay { 2.0 } else { 1.0 };
        assert!((15.0..40.0).contains(&one_way), "{one_way}");
    }
}

/// A spacecraft late in its orbit is not the curve shifted: against vectors that are truly late by 1, 3 and -2 s.
#[test]
fn lateness_agrees_with_the_vectors() {
    let words = synthetic([335.0 + 5.0, 1090.0]);
    let table = vectors::synthetic_pass_late();
    let all = table.column("t_s");
    for (lateness, name) in [(1.0, "late_1"), (3.0, "late_3"), (-2.0, "early_2")] {
        let geometry = geometry(&words, Direction::Down, TaggedAt::Ground, lateness);
        let origin = geometry.origin().seconds_since(epoch());
        let (delays, rapidities) =
            (table.column(&format!("{name}_delay_s")), table.column(&format!("{name}_rapidity")));
        let inside: Vec<usize> = (0..all.len()).filter(|&k| all[k] >= 345.0 && all[k] <= 1085.0).collect();
        let pick = |column: &[f64]| inside.iter().map(|&k| column[k]).collect::<Vec<_>>();
        let (delay, rapidity, _) = apart(&geometry, origin, &pick(&all), &pick(&delays), &pick(&rapidities));
        println!("{name}: {:.3} mHz, {:.5} cycles", rapidity / MILLIHERTZ, delay * CARRIER);
        assert!(rapidity < MILLIHERTZ && delay < 0.05 / SPEED_OF_LIGHT, "{name}: {rapidity:e} {delay:e}");
        // And the model alone, on the arc's own positions.
        let trajectory = Arc::new(&words).unwrap().trajectory();
        let link = link(late(|t| trajectory.at(t).0, lateness, EARTH_RATE), vectors::SYNTHETIC_SITE);
        let model = worst((-34..=34).map(|k| {
            let t = 10.0 * f64::from(k);
            geometry.delay_and_rapidity(t).1 - link.rapidity(Tag::DownlinkReception, t)
        }));
        println!("    model alone {model:.1e}");
        assert!(model < 1e-13, "{model:e}");
    }
}

/// Rise and set of the synthetic pass: 351.3376 and 1076.8659 s (check-values, section 3).
#[test]
fn rise_and_set_are_where_published() {
    let words = synthetic(WHOLE);
    let geometry = geometry(&words, Direction::Down, TaggedAt::Ground, 0.0);
    let (rise, set) = geometry.above(0.0).unwrap();
    let (rise, set) = (rise.seconds_since(epoch()), set.seconds_since(epoch()));
    println!("rise {rise:.5}, set {set:.5}");
    assert!((rise - 351.3376).abs() < 1e-4 && (set - 1076.8659).abs() < 1e-4, "{rise} {set}");
    // Narrower above ten degrees, and at the edge of that.
    let mask = 10.0_f64.to_radians();
    let (rise, set) = geometry.above(mask).unwrap();
    for time in [rise, set] {
        let seconds = time.seconds_since(geometry.origin());
        assert!((geometry.look(seconds).elevation - mask).abs() < 1e-7);
    }
    // The pass culminates at 71.6404 degrees.
    assert!(geometry.above(71.0_f64.to_radians()).is_some());
    assert_eq!(geometry.above(71.65_f64.to_radians()), None);
    assert_eq!(geometry.above(f64::NAN), None);
    // A mask below everything is met from end to end.
    let (first, last) = geometry.above(-1.0).unwrap();
    assert_eq!(
        (first, last),
        (geometry.origin().plus_seconds(-375.0), geometry.origin().plus_seconds(375.0))
    );
}

/// Geodetic to Earth-fixed: IOGP guidance note 7-2 (53d48'33.820"N 2d07'46.380"E 73.0 m) and ERFA's test of `gd2gc`
/// (WGS-84, lon 3.1 rad, lat -0.5 rad, 2500 m); the synthetic pass's site from check-values, section 3.
#[test]
fn sites_are_where_published() {
    let dms = |d: f64, m: f64, s: f64| d + m / 60.0 + s / 3600.0;
    let rows = [
        (
            [dms(53.0, 48.0, 33.820), dms(2.0, 7.0, 46.380), 73.0],
            [3771793.968, 140253.342, 5124304.349],
            1e-3,
        ),
        (
            [(-0.5_f64).to_degrees(), 3.1_f64.to_degrees(), 2500.0],
            [-5599000.5577049947, 233011.67223479203, -3040909.4706983363],
            1e-7,
        ),
        ([45.0, 7.5, 300.0], [4479152.57984, 589691.62421, 4487560.5409], 1e-3),
        ([90.0, 0.0, 0.0], [0.0, 0.0, 6356752.314245], 1e-5),
    ];
    for ([latitude, longitude, height], expected, tolerance) in rows {
        let site = Site::geodetic(latitude, longitude, height).unwrap();
        let off = worst(reference::minus(site.earth_fixed(), expected).into_iter());
        assert!(off <= tolerance, "{expected:?}: {off:e}");
        assert_eq!(site.geodetic_coordinates(), [latitude, longitude, height]);
    }
}

/// A geostationary spacecraft's clock, seen from the geoid, where nothing else moves: +5.3915e-10 (check-values,
/// section 1; point-mass potential, so within the oblateness's 1e-14 there). Down it raises, up it lowers.
#[test]
fn a_geostationary_clock_runs_fast() {
    let place = [42_164_172.0, 0.0, 0.0];
    let words = passes::fitted(epoch(), [0.0, 3600.0], |_| place).unwrap();
    let site = reference::Site { latitude_deg: 0.0, longitude_deg: 20.0, height_m: 0.0 };
    for (direction, sign) in [(Direction::Down, 1.0), (Direction::Up, -1.0), (Direction::TwoWay, 0.0)] {
        let arc = Arc::new(&words).unwrap();
        let geometry = Geometry::new(&arc, &passes::site(&site), direction, TaggedAt::Ground, 0.0).unwrap();
        for t in [-1700.0, 0.0, 1500.0] {
            let (_, rapidity) = geometry.delay_and_rapidity(t);
            assert!((rapidity - sign * 5.3915e-10).abs() < 2e-14, "{direction:?} {rapidity:e}");
        }
        // The clock's part of the delay grows with it; zero is at the middle of the arc.
        let change = geometry.delay_and_rapidity(1000.0).0 - geometry.delay_and_rapidity(0.0).0;
        assert!((change + sign * 5.3915e-7).abs() < 2e-11, "{direction:?} {change:e}");
    }
}

/// A spacecraft straight overhead: the elevation is 90 degrees, not a number that rounding has spoilt.
#[test]
fn overhead_is_a_number() {
    for latitude in [0.0, 12.3, 45.0, 60.7, 89.9] {
        for longitude in [0.0, 33.3, -120.1] {
            let low = Site::geodetic(latitude, longitude, 0.0).unwrap().earth_fixed();
            let high = Site::geodetic(latitude, longitude, 1e5).unwrap().earth_fixed();
            let above = [0, 1, 2].map(|axis| low[axis] + 5.5 * (high[axis] - low[axis]));
            let words = passes::fitted(epoch(), [0.0, 600.0], |_| above).unwrap();
            let site = Site::geodetic(latitude, longitude, 0.0).unwrap();
            let arc = Arc::new(&words).unwrap();
            let geometry = Geometry::new(&arc, &site, Direction::Down, TaggedAt::Ground, 0.0).unwrap();
            let elevation = geometry.look(0.0).elevation.to_degrees();
            assert!((elevation - 90.0).abs() < 1e-3, "{elevation}");
        }
    }
}
