//! Keeps a radio's oscillator on a moving carrier.
#![no_std]
#![forbid(unsafe_code)]

pub mod follow;
pub mod frequency;
pub mod nco;
pub mod pass;
pub mod rapidity;
pub mod time;
pub mod tuning;
