//! A pass: the spacecraft's arc, the geometry that turns it into delay, and the table that firmware reads.
//!
//! [`Arc`] is what is uploaded or broadcast: the Earth-fixed position as polynomials, free of site, carrier
//! and direction, some 90 bytes. [`Geometry`] joins an arc with a [`Site`] and gives the apparent delay.
//! [`bake`](mod@bake) turns that (or any closure from time to delay) into a [`PassTable`], which costs a few
//! hundred instructions to read and carries its own proven error. Where there is no orbit, [`RangeRateLog`] is such
//! a closure.

mod arc;
pub mod bake;
mod chebyshev;
mod geometry;
mod log;
mod packing;
mod site;
mod table;

pub use arc::{Arc, ArcError, ArcModel, ArcSettings, MAX_ARC_WORDS, Trajectory};
pub use geometry::{Direction, Geometry, GeometryError, Look, Passage, TaggedAt};
pub use log::{LogError, RangeRateLog, RangeRateSample};
pub use site::Site;
pub use table::{MotionExtremes, PassTable, TableError};
