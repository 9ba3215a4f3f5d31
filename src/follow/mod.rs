//! Following: what is measured turned into motion.
//!
//! [`velocity`] holds the filter for range-rate estimates that arrive late, unevenly, noisy or not
//! at all. Nothing here reads a clock: the caller passes the time in.

mod error;
pub mod velocity;

pub use error::FollowError;
