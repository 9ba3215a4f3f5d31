//! Host side of Shiftkeel: element sets, orbits, frames and the f64 models of a pass.
//!
//! Read the modules in this order; each knows only the ones before it.
//!
//! | module | holds |
//! |---|---|
//! | [`vector`] | three-component vectors |
//! | [`instant`] | UTC text and times |
//! | [`elements`] | two-line element files, one or many objects |
//! | [`orbit`] | SGP4 (WGS-72, AFSPC compatible) from a reference epoch |
//! | [`age`] | what the age of an element set may cost |
//! | [`frames`] | sidereal rotation, geodetic sites, elevation and azimuth |
//! | [`geometric`] | instantaneous geometry: range, range rate, rapidity |
//! | [`vacuum`] | light time, time dilation and potential added |
//! | [`horizon`] | least elevation and horizon mask |
//! | [`contacts`] | passes in a window |
//! | [`baking`] | arc and table of a pass, and what the arc is off |
//! | [`rehearsal`] | a pass steered by the crate, beside the reference |
//! | [`commands`] | what the program offers on its command line |
//!
//! Times are seconds (`f64`) from a reference epoch in UTC, lengths metres, angles radians, unless a name
//! says otherwise. A day has 86,400 s here: a window must not straddle a leap second.
#![forbid(unsafe_code)]

pub mod age;
pub mod baking;
pub mod commands;
pub mod contacts;
pub mod elements;
pub mod frames;
pub mod geometric;
pub mod horizon;
pub mod instant;
pub mod orbit;
pub mod rehearsal;
pub mod vacuum;
pub mod vector;

/// Speed of light in vacuum, m/s (exact; SI brochure).
pub const SPEED_OF_LIGHT: f64 = 299_792_458.0;
