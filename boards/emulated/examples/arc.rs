//! Fits `pass.arc` from the references' positions of the synthetic pass: on the host, once.

#[path = "../../../tests/reference/mod.rs"]
mod reference;

use reference::vectors;
use shiftkeel::pass::{Arc, ArcModel, ArcSettings, MAX_ARC_WORDS};
use shiftkeel::time::GpsTime;
use shiftkeel_emulated::console::{must, write};

/// Seconds from the references' epoch: all of the pass, and light time besides.
const START: f64 = 346.0;
const END: f64 = 1082.0;

fn main() {
    let positions = vectors::positions(vectors::SYNTHETIC);
    let epoch = must(GpsTime::from_utc(2026, 6, 1, [12, 0, 0], 0), "the epoch");
    let settings = ArcSettings {
        start: epoch.plus_seconds(START),
        end: epoch.plus_seconds(END),
        object: vectors::SYNTHETIC,
        element_epoch: epoch,
        model: ArcModel::Sgp4,
        velocity_tolerance: 0.4e-3,
    };
    let mut words = [0; MAX_ARC_WORDS];
    let arc = must(Arc::fit(&mut words, &settings, |seconds| positions.at(START + seconds)), "the arc");
    let bytes: Vec<u8> = arc.words().iter().flat_map(|word| word.to_le_bytes()).collect();
    write(c"pass.arc", &bytes);
}
