//! The reference's passes as the crate's arcs and sites, for the tests of `pass`.
#![allow(dead_code)] // each test uses a part of it

pub mod stored;

use crate::reference::orbits::Pass;
use crate::reference::{self, vectors};
use shiftkeel::pass::{Arc, ArcError, ArcModel, ArcSettings, MAX_ARC_WORDS, Site};
use shiftkeel::time::GpsTime;

/// Hz. All figures of these tests are at this carrier.
pub const CARRIER: f64 = 437e6;
/// A shift of one millihertz at the carrier, as a rapidity or a slope.
pub const MILLIHERTZ: f64 = 1e-3 / CARRIER;
/// The velocity tolerance that arcs are normally fitted with, m/s: 0.6 mHz at the carrier.
pub const VELOCITY_TOLERANCE: f64 = 0.4e-3;

/// "2026-06-01T12:00:00Z".
pub fn utc(text: &str) -> GpsTime {
    let part = |from: usize, to: usize| -> u16 { text[from..to].parse().expect("digits") };
    let small = |from: usize| part(from, from + 2) as u8;
    GpsTime::from_utc(part(0, 4), small(5), small(8), [small(11), small(14), small(17)], 0).expect("a date")
}

/// Epoch of the synthetic pass.
pub fn epoch() -> GpsTime {
    utc(vectors::SYNTHETIC_EPOCH_UTC)
}

pub fn site(site: &reference::Site) -> Site {
    Site::geodetic(site.latitude_deg, site.longitude_deg, site.height_m).expect("a place on Earth")
}

/// What every arc of these tests says about itself.
pub fn settings(epoch: GpsTime, from: f64, to: f64) -> ArcSettings {
    ArcSettings {
        start: epoch.plus_seconds(from),
        end: epoch.plus_seconds(to),
        object: 90001,
        element_epoch: epoch,
        model: ArcModel::Sgp4,
        velocity_tolerance: VELOCITY_TOLERANCE,
    }
}

/// An arc of `position` (Earth-fixed, by seconds after `epoch`) from `from` to `to`.
pub fn fitted(
    epoch: GpsTime,
    [from, to]: [f64; 2],
    position: impl Fn(f64) -> [f64; 3],
) -> Result<Vec<u32>, ArcError> {
    let mut words = [0; MAX_ARC_WORDS];
    let arc = Arc::fit(&mut words, &settings(epoch, from, to), |t| position(from + t))?;
    Ok(arc.words().to_vec())
}

/// The synthetic pass, by seconds after its epoch.
pub fn synthetic([from, to]: [f64; 2]) -> Vec<u32> {
    let grid = vectors::positions(vectors::SYNTHETIC);
    fitted(epoch(), [from, to], |t| grid.at(t)).expect("an arc")
}

/// A random pass, 10 s longer than it is in view at both ends.
pub fn random(pass: &Pass) -> Result<Vec<u32>, ArcError> {
    fitted(epoch(), [pass.rise - 10.0, pass.set + 10.0], |t| pass.orbit.position(t))
}

/// Largest magnitude; a NaN counts as infinite.
pub fn worst(values: impl Iterator<Item = f64>) -> f64 {
    values.fold(0.0, |worst, x| if x.is_nan() { f64::INFINITY } else { worst.max(x.abs()) })
}

/// CRC-32 as in ISO 3309: reflected polynomial 0xEDB88320, all ones before, inverted after.
pub fn crc_32(words: &[u32]) -> u32 {
    !words.iter().flat_map(|word| word.to_le_bytes()).fold(u32::MAX, |sum, byte| {
        (0..8).fold(sum ^ u32::from(byte), |sum, _| sum >> 1 ^ if sum & 1 == 1 { 0xEDB8_8320 } else { 0 })
    })
}
