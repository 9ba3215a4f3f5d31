//! Arc and table of whole passes, held against the independent reference.

mod reference;

use reference::vectors;
use shiftkeel::pass::bake::{Request, audit, bake_arc};
use shiftkeel::pass::{Arc, ArcModel, ArcSettings, Direction, Geometry, MAX_ARC_WORDS, Site, TaggedAt};
use shiftkeel::time::GpsTime;

#[test]
fn sizes() {
    let grid = vectors::positions(vectors::SYNTHETIC);
    let epoch = GpsTime::from_utc(2026, 6, 1, [12, 0, 0], 0).unwrap();
    let mut words = [0; MAX_ARC_WORDS];
    let settings = ArcSettings {
        start: epoch.plus_seconds(346.0),
        end: epoch.plus_seconds(1082.0),
        object: 90001,
        element_epoch: epoch,
        model: ArcModel::Sgp4,
        velocity_tolerance: 0.4e-3,
    };
    let arc = Arc::fit(&mut words, &settings, |t| grid.at(t + 346.0)).unwrap();
    println!("arc {} bytes", arc.words().len() * 4);
    let ground = vectors::SYNTHETIC_SITE;
    let site = Site::geodetic(ground.latitude_deg, ground.longitude_deg, ground.height_m).unwrap();
    let geometry = Geometry::new(&arc, &site, Direction::Down, TaggedAt::Ground, 0.0).unwrap();
    let (rise, set) = geometry.above(0.0).unwrap();
    println!("rise {} set {}", rise.seconds_since(epoch), set.seconds_since(epoch));
    for millihertz in [10.0, 1.0] {
        for lateness_partial in [false, true] {
            let mut words = [0; 512];
            let request = Request {
                start: rise,
                end: set,
                slope_tolerance: millihertz * 1e-3 / 437e6,
                delay_tolerance: 0.015 / 437e6,
                lateness_partial,
            };
            let table = bake_arc(&mut words, &arc, &geometry, &request).unwrap();
            let origin = table.start().seconds_since(geometry.origin());
            let seen = audit(&table, 1e-2, |t| geometry.delay_and_rapidity(origin + t).0).unwrap();
            let hertz = 437e6 / (1u64 << 60) as f64;
            println!(
                "{millihertz} mHz: {} bytes {} segments, slope seen {:.3} mHz proven {:.3} mHz, delay seen {:.5} cyc proven {:.5} noise {:.2e} s",
                table.words().len() * 4,
                table.segment_count(),
                seen.worst_slope * 437e9,
                f64::from(table.proven_slope()) * hertz * 1e3,
                seen.worst_delay * 437e6,
                f64::from(table.proven_delay()) * hertz,
                f64::from(table.evaluation_noise()) / (1u64 << 60) as f64,
            );
        }
    }
}
