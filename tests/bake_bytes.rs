//! Host and board bake the same bytes, whatever features of `libm` other crates switch on.
//!
//! This test is built with the feature `arch` of `libm`, which may use a processor's own instructions; the emulated
//! boards and their host run are built without. Both must come to the digests that `boards/emulated` commits.

use shiftkeel::pass::bake::{Request, bake_arc};
use shiftkeel::pass::{Arc, Direction, Geometry, Site, TaggedAt};

const ARC: &[u8] = include_bytes!("../boards/emulated/pass.arc");
const WALK: &str = include_str!("../boards/emulated/walk.txt");

/// The last word of the line of `WALK` that starts with `start`.
fn committed(start: &str) -> u32 {
    let line = WALK.lines().find(|line| line.starts_with(start)).unwrap();
    u32::from_str_radix(line.rsplit(' ').next().unwrap(), 16).unwrap()
}

#[test]
fn a_feature_of_libm_changes_no_byte() {
    let words: Vec<u32> =
        ARC.chunks_exact(4).map(|bytes| u32::from_le_bytes(bytes.try_into().unwrap())).collect();
    let arc = Arc::new(&words).unwrap();
    assert_eq!(arc.digest(), committed("arc "));
    let site = Site::geodetic(45.0, 7.5, 300.0).unwrap();
    for (direction, line) in [(Direction::Down, "down table"), (Direction::Up, "up table")] {
        let geometry = Geometry::new(&arc, &site, direction, TaggedAt::Ground, 0.0).unwrap();
        let (start, end) = geometry.above(0.0).unwrap();
        let request = Request {
            start,
            end,
            slope_tolerance: 1e-3 / 437e6,
            delay_tolerance: 0.015 / 437e6,
            lateness_partial: direction == Direction::Down,
        };
        let mut buffer = [0; 512];
        let table = bake_arc(&mut buffer, &arc, &geometry, &request).unwrap();
        assert_eq!(table.digest(), committed(line), "{line}");
    }
}
