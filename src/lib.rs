//! Keeps a radio's oscillator on a moving carrier.
//!
//! A spacecraft overhead slides its carrier by 140 Hz every second at 437 MHz. This crate turns what is known of
//! the motion (an arc of the orbit, a table baked from it, or a stream of velocity estimates) into the word that
//! an oscillator takes, in integer arithmetic with the same bits on every target, and says how far off the
//! oscillator can be. It needs no operating system, no heap, no floating-point unit and no clock of its own.
//!
//! ```text
//!  orbit ─► Arc (site-free, ~90 bytes) ─┐
//!  site, direction, lateness ───────────┼─ bake ─► PassTable ─ at(time) ─┐
//!  logged range rate ───────────────────┘                                ├─► Motion: delay, rapidity, rate
//!  range-rate estimates ─► VelocityFilter ───────────────────────────────┘      │
//!  crystals, conversions, translation ─► Channel ─────────────────────────────► Sweep or Hold
//!                                                                                 │
//!                                           Nco, or a device's word  ◄───────────┘
//! ```
//!
//! | module | what it holds |
//! |---|---|
//! | [`time`] | GPS time in 2^-30 s; the leap table at its edges |
//! | [`frequency`] | hertz, phase steps, ramps, clock ratios |
//! | [`rapidity`] | ln(received / transmitted frequency): shifts that add |
//! | [`pass`] | arc, geometry, bake, table |
//! | [`tuning`] | RF plan to word: channel, sweep, hold, stretch, transponder pair, permission, bounds |
//! | [`nco`] | phase accumulator, cosine and sine, mixer |
//! | [`follow`] | velocity filter |
//!
//! Each stage knows only the ones above it. The caller passes time in.
//!
//! ```
//! use shiftkeel::frequency::Frequency;
//! use shiftkeel::tuning::{Channel, RfPlan};
//! use fixed::types::I16F16;
//!
//! let carrier = Frequency::from_hertz(437_000_000).unwrap();
//! let clock = Frequency::from_hertz(100_000_000).unwrap();
//! let channel = Channel::receive(&RfPlan::direct(carrier, clock), 100_000)?;
//! // 7 km/s away: 436989796.393450985 Hz (relativistic; recomputed with 40 digits).
//! let step = channel.step_for_range_rate(I16F16::from_num(7000))?;
//! let wanted = 36_989_796.393_450_985 / 100e6 * 2f64.powi(64); // the clock's fourth multiple drops out
//! assert!((step.to_bits() as f64 - wanted).abs() / 2f64.powi(64) * 100e6 < 1e-4); // hertz
//! # Ok::<(), shiftkeel::tuning::TuningError>(())
//! ```
#![no_std]
#![forbid(unsafe_code)]
#![deny(missing_docs)]
#![warn(
    clippy::unwrap_used,
    clippy::expect_used,
    clippy::panic,
    clippy::indexing_slicing,
    clippy::arithmetic_side_effects,
    clippy::cast_possible_truncation
)]

pub mod follow;
pub mod frequency;
pub mod nco;
pub mod pass;
pub mod rapidity;
pub mod time;
pub mod tuning;
