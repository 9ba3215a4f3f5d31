//! The spacecraft's Earth-fixed position over a pass, free of site, carrier and direction.
#![allow(
    clippy::arithmetic_side_effects,
    reason = "set-up: counts of at most 64 words, orders up to 15, quanta from 2^-9 to 2^16"
)]
#![allow(
    clippy::cast_possible_truncation,
    reason = "set-up: fields are held below their width before, and words are cut out on purpose"
)]

mod fit;

use super::chebyshev;
use super::packing::{BitReader, checksum};
use crate::time::GpsTime;

/// Highest degree an arc may have.
const MAX_DEGREE: usize = 15;
/// Words of the largest arc: degree 15, every field 32 bits wide.
pub const MAX_ARC_WORDS: usize = 58;
const MAGIC: u32 = 0x4B53;
const VERSION: u32 = 1;
const HEADER_WORDS: usize = 6;
/// Fraction bits of the half span in seconds.
const SPAN_FRACTION: f64 = 1024.0;

/// What moved the spacecraft along the arc: a note for whoever audits a table later.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
#[non_exhaustive]
pub enum ArcModel {
    /// Not stated.
    Unstated,
    /// SGP4 from a general-perturbations element set.
    Sgp4,
    /// Interpolated ephemeris or a state vector.
    Ephemeris,
}

/// Why an arc was refused.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
#[non_exhaustive]
pub enum ArcError {
    /// Fewer words than its header asks for, or none at all.
    Short,
    /// The first word is not an arc's.
    NotAnArc,
    /// Written by a newer version of the format.
    NewerVersion {
        /// The version found.
        found: u8,
    },
    /// The CRC-32 does not match: at least one bit differs from what was written.
    Damaged,
    /// The buffer given to write into is too small.
    BufferTooSmall,
    /// The span is not positive, or above 97 days.
    SpanNotUsable,
    /// A position was not a number or too large for the format.
    PositionNotUsable,
    /// No degree up to 15 reaches the asked-for accuracy: shorten the span.
    TooCurved,
}

impl core::fmt::Display for ArcError {
    fn fmt(&self, formatter: &mut core::fmt::Formatter<'_>) -> core::fmt::Result {
        formatter.write_str(match self {
            Self::Short => "arc cut short: fewer words than its header asks for; send it again",
            Self::NotAnArc => "not an arc: the first word is not an arc's; check what was sent",
            Self::NewerVersion { .. } => "arc of a newer format version; update the firmware or bake again",
            Self::Damaged => "arc damaged: its CRC-32 does not match; send it again",
            Self::BufferTooSmall => "buffer too small for the arc; give it MAX_ARC_WORDS words",
            Self::SpanNotUsable => "arc span must be positive and below 97 days",
            Self::PositionNotUsable => {
                "a position of the arc is not a number or over a million kilometres away"
            }
            Self::TooCurved => {
                "no polynomial up to degree 15 follows this arc closely enough; shorten its span"
            }
        })
    }
}

impl core::error::Error for ArcError {}

/// What [`Arc::fit`] is asked for.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct ArcSettings {
    /// First instant.
    pub start: GpsTime,
    /// Last instant.
    pub end: GpsTime,
    /// Catalogue or user number of the object.
    pub object: u32,
    /// Epoch of the elements (to the second, 1980 to 2116).
    pub element_epoch: GpsTime,
    /// What moved the spacecraft.
    pub model: ArcModel,
    /// Largest allowed velocity error in m/s, each axis (0.4 mm/s is 0.6 mHz at 437 MHz). Below 0.4 mm/s the
    /// position is stored finer too, as 40 s of that velocity.
    pub velocity_tolerance: f64,
}

/// An arc, checked, read in place.
///
/// Format, little-endian 32-bit words: magic 0x4B53, version (4 bits), degree (4), model (8) | middle of the
/// span, GPS time in 2^-30 s (2 words) | half span in 2^-10 s | object | element epoch in GPS seconds |
/// bit stream: quantum as a power of two in metres (8 bits), width less one of each order (5 bits each),
/// then order by order the Chebyshev coefficients of x, y, z | CRC-32 of all before.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Arc<'a> {
    words: &'a [u32],
}

/// An arc unpacked for evaluation: Earth-fixed position in metres and velocity in m/s.
#[derive(Clone, Copy, Debug)]
pub struct Trajectory {
    series: [[f64; MAX_DEGREE + 1]; 3],
    degree: usize,
    middle: GpsTime,
    half_span: f64,
}

/// How many bits finer than the arc's quantum an order is stored: a rounded T_k moves the velocity by k^2.
fn finer_bits(order: usize) -> i32 {
    (order as i32 + 1) / 2
}

fn power_of_two(exponent: i32) -> f64 {
    libm::ldexp(1.0, exponent)
}

impl<'a> Arc<'a> {
    /// Checks an arc once: length, magic, version, CRC-32.
    ///
    /// # Errors
    /// [`ArcError::Short`], [`ArcError::NotAnArc`], [`ArcError::NewerVersion`], [`ArcError::Damaged`].
    pub fn new(words: &'a [u32]) -> Result<Self, ArcError> {
        let &first = words.first().ok_or(ArcError::Short)?;
        if first >> 16 != MAGIC {
            return Err(ArcError::NotAnArc);
        }
        let version = first >> 12 & 0xF;
        if version > VERSION {
            return Err(ArcError::NewerVersion { found: version as u8 });
        }
        let arc = Self { words };
        let length = arc.unpack().ok_or(ArcError::Short)?.1 + 1;
        let words = words.get(..length).ok_or(ArcError::Short)?;
        let (sum, body) = words.split_last().ok_or(ArcError::Short)?;
        if checksum(body) != *sum || arc.word(3) == 0 {
            return Err(ArcError::Damaged);
        }
        Ok(Self { words })
    }

    fn word(&self, index: usize) -> u32 {
        self.words.get(index).copied().unwrap_or(0)
    }

    /// The words as stored, CRC last.
    pub fn words(&self) -> &'a [u32] {
        self.words
    }

    /// First instant of the arc.
    pub fn start(&self) -> GpsTime {
        self.middle().plus_seconds(-self.half_span())
    }

    /// Last instant of the arc.
    pub fn end(&self) -> GpsTime {
        self.middle().plus_seconds(self.half_span())
    }

    fn middle(&self) -> GpsTime {
        GpsTime::from_bits((u64::from(self.word(1)) | u64::from(self.word(2)) << 32) as i64)
    }

    fn half_span(&self) -> f64 {
        f64::from(self.word(3)) / SPAN_FRACTION
    }

    /// Number of the object.
    pub fn object(&self) -> u32 {
        self.word(4)
    }

    /// Epoch of the elements, to the second.
    pub fn element_epoch(&self) -> GpsTime {
        GpsTime::from_bits(i64::from(self.word(5)) << GpsTime::FRACTION_BITS)
    }

    /// What moved the spacecraft.
    pub fn model(&self) -> ArcModel {
        match self.word(0) & 0xFF {
            1 => ArcModel::Sgp4,
            2 => ArcModel::Ephemeris,
            _ => ArcModel::Unstated,
        }
    }

    /// CRC-32 of the arc: what a table baked from it carries as its digest.
    pub fn digest(&self) -> u32 {
        self.words.last().copied().unwrap_or(0)
    }

    /// Unpacked for evaluation.
    pub fn trajectory(&self) -> Trajectory {
        // `new` has unpacked it once; an arc exists only when that worked.
        self.unpack().map_or(
            Trajectory {
                series: [[0.0; MAX_DEGREE + 1]; 3],
                degree: 0,
                middle: self.middle(),
                half_span: 1.0,
            },
            |(trajectory, _)| trajectory,
        )
    }

    /// The trajectory, and how many words it took without the CRC.
    fn unpack(&self) -> Option<(Trajectory, usize)> {
        let degree = (self.word(0) >> 8 & 0xF) as usize;
        let mut reader = BitReader::new(self.words.get(HEADER_WORDS..)?);
        let quantum = reader.pull_signed(8)?;
        let mut widths = [0; MAX_DEGREE + 1];
        for width in widths.iter_mut().take(degree + 1) {
            *width = reader.pull(5)? + 1;
        }
        let mut series = [[0.0; MAX_DEGREE + 1]; 3];
        for (order, &width) in widths.iter().enumerate().take(degree + 1) {
            let unit = power_of_two(quantum - finer_bits(order));
            for axis in &mut series {
                *axis.get_mut(order)? = f64::from(reader.pull_signed(width)?) * unit;
            }
        }
        let trajectory = Trajectory { series, degree, middle: self.middle(), half_span: self.half_span() };
        Some((trajectory, HEADER_WORDS + reader.words_used()))
    }
}

impl Trajectory {
    /// Middle of the span: the origin of the seconds that [`Self::at`] takes.
    pub fn middle(&self) -> GpsTime {
        self.middle
    }

    /// Half of the span in seconds.
    pub fn half_span(&self) -> f64 {
        self.half_span
    }

    /// Earth-fixed position in metres and velocity in m/s at `seconds` from the middle.
    pub fn at(&self, seconds: f64) -> ([f64; 3], [f64; 3]) {
        let place = seconds / self.half_span;
        let mut position = [0.0; 3];
        let mut velocity = [0.0; 3];
        for ((axis, position), velocity) in self.series.iter().zip(&mut position).zip(&mut velocity) {
            let (value, slope) = chebyshev::evaluate(axis.get(..=self.degree).unwrap_or(&[]), place);
            *position = value;
            *velocity = slope / self.half_span;
        }
        (position, velocity)
    }
}
