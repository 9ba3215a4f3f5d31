//! What firmware reads at every tick: the delay as piecewise polynomials.
//!
//! # Format
//! Little-endian 32-bit words, read in place:
//!
//! | word | content |
//! |---|---|
//! | 0 | magic 0x4B54, version (4 bits), degree (4), zero (4), lateness partial present (1), tagged at spacecraft (1), direction (2: down, up, two-way) |
//! | 1, 2 | epoch: start of the first segment, GPS time in 2^-30 s |
//! | 3 | span from the epoch in 2^-10 s |
//! | 4, 5 | object number; element epoch in GPS seconds |
//! | 6, 7, 8 | site: latitude, longitude in 1e-7 degree, height in mm |
//! | 9 | digest (CRC-32) of the arc, 0 when there was none |
//! | 10, 11 | proven error of the slope in 2^-60, of the delay in 2^-60 s |
//! | 12 | base delay in 2^-24 s |
//! | 13 | fraction bits Q (8 bits), log2 of a cell in 2^-30 s (8), segments (16) |
//! | 14 | smoothness: assumed ratio of Chebyshev coefficients beyond the fit, in 2^-16 |
//! | directory | 2^depth half-words: first cell of a segment (12 bits), log2 of its length in cells (4); the rest 0xFFFF |
//! | records | six words a segment, then one word: the last node |
//! | partial | optional, see `lateness` |
//! | last | CRC-32 of all before |
//!
//! A segment's record is a node (delay at its start from the base, signed, in 2^-(Q-1) s) and the coefficients 2 to 9
//! of the polynomial in v from -1 to 1; the coefficients 0 and 1 follow from the two nodes, so neighbours meet
//! exactly. Coefficient k is stored in 2^(s-Q) s with s and the field's width from [`FIELDS`].

mod evaluate;
mod extremes;
mod lateness;

use super::geometry::{Direction, TaggedAt};
use super::packing::checksum;
use crate::rapidity::Motion;
use crate::time::GpsTime;

pub use extremes::MotionExtremes;

pub(super) use evaluate::{LEAST_FRACTION, LONGEST, MOST_FRACTION, NOISE, entry as directory_entry};
pub(super) use lateness::{PARTIAL_RECORD_WORDS, PartialRecord};

pub(super) const MAGIC: u32 = 0x4B54;
pub(super) const VERSION: u32 = 1;
pub(super) const DEGREE: usize = 9;
pub(super) const HEADER_WORDS: usize = 15;
pub(super) const RECORD_WORDS: usize = 6;
/// Log2 of the most cells a table may have.
pub(super) const CELL_BITS: u32 = 12;
/// Fraction bits of the base delay.
pub(super) const BASE_FRACTION: u32 = 24;
/// Fraction bits of the span in seconds.
pub(super) const SPAN_FRACTION: u32 = 10;

/// For each coefficient: power of two by which its unit is coarser than 2^-Q s, and the field's width in bits.
pub(super) const FIELDS: [(i32, u32); DEGREE + 1] =
    [(0, 32), (0, 32), (0, 31), (0, 31), (2, 22), (2, 20), (4, 17), (5, 15), (5, 12), (6, 10)];

/// Why a table was refused, or could not answer.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
#[non_exhaustive]
pub enum TableError {
    /// Fewer words than its header asks for, or none at all.
    Short,
    /// The first word is not a table's.
    NotATable,
    /// Written by a newer version of the format.
    NewerVersion {
        /// The version found.
        found: u8,
    },
    /// The CRC-32 does not match, or a header field is impossible: at least one bit differs from what was written.
    Damaged,
    /// Asked for a time before the table's first instant.
    Before,
    /// Asked for a time after the table's last instant.
    After,
    /// A lateness was given, but the table carries no partial for it, or it is above 8 s.
    NoLateness,
}

impl core::fmt::Display for TableError {
    fn fmt(&self, formatter: &mut core::fmt::Formatter<'_>) -> core::fmt::Result {
        formatter.write_str(match self {
            Self::Short => "table cut short: fewer words than its header asks for; send or bake it again",
            Self::NotATable => "not a pass table: the first word is not a table's; check what was sent",
            Self::NewerVersion { .. } => {
                "table of a newer format version; update the firmware or bake it again"
            }
            Self::Damaged => "table damaged: its CRC-32 does not match; send or bake it again",
            Self::Before => "time before the table's first instant; wait, or bake a table for this time",
            Self::After => "time after the table's last instant; the pass is over, or the clock is wrong",
            Self::NoLateness => "lateness above 8 s, or the table has no lateness partial; bake it with one",
        })
    }
}

impl core::error::Error for TableError {}

/// A pass table, checked once, read in place from flash or a buffer.
#[derive(Clone, Copy, Debug)]
pub struct PassTable<'a> {
    directory: &'a [u32],
    records: &'a [u32],
    words: &'a [u32],
    epoch: i64,
    span: i64,
    base: i64,
    layout: evaluate::Layout,
}

impl<'a> PassTable<'a> {
    /// Checks a table once: length, magic, version, header, CRC-32.
    ///
    /// # Errors
    /// [`TableError::Short`], [`TableError::NotATable`], [`TableError::NewerVersion`], [`TableError::Damaged`].
    #[allow(clippy::arithmetic_side_effects, reason = "set-up: at most 65535 segments, so below 2^20 words")]
    pub fn new(words: &'a [u32]) -> Result<Self, TableError> {
        let header: &[u32; HEADER_WORDS] = match (words.first(), words.first_chunk()) {
            (Some(first), _) if first >> 16 != MAGIC => return Err(TableError::NotATable),
            (_, None) => return Err(TableError::Short),
            (_, Some(header)) => header,
        };
        let version = header[0] >> 12 & 0xF;
        if version > VERSION {
            return Err(TableError::NewerVersion { found: version as u8 });
        }
        let segments = (header[13] >> 16) as usize;
        let layout = evaluate::Layout::new(header).ok_or(TableError::Damaged)?;
        let directory_words = layout.directory_words();
        let record_words = segments * RECORD_WORDS + 1;
        let has_partial = header[0] & 8 != 0;
        let partial_words = if has_partial { (segments + 1) * PARTIAL_RECORD_WORDS + 1 } else { 0 };
        let length = HEADER_WORDS + directory_words + record_words + partial_words + 1;
        let words = words.get(..length).ok_or(TableError::Short)?;
        let (sum, body) = words.split_last().ok_or(TableError::Short)?;
        if checksum(body) != *sum || (header[0] >> 8 & 0xF) as usize != DEGREE {
            return Err(TableError::Damaged);
        }
        let after_header = words.get(HEADER_WORDS..).ok_or(TableError::Short)?;
        let (directory, records) = after_header.split_at_checked(directory_words).ok_or(TableError::Short)?;
        Ok(Self {
            directory,
            records: records.get(..record_words + partial_words).ok_or(TableError::Short)?,
            words,
            epoch: (u64::from(header[1]) | u64::from(header[2]) << 32) as i64,
            span: i64::from(header[3]) << (GpsTime::FRACTION_BITS - SPAN_FRACTION),
            base: i64::from(header[12] as i32) << (crate::rapidity::Delay::FRACTION_BITS - BASE_FRACTION),
            layout,
        })
    }

    /// Delay, rapidity and rate at an instant.
    ///
    /// # Accuracy
    /// Delay within [`Self::proven_delay`] and its slope within [`Self::proven_slope`] of what was baked;
    /// between two instants the delay's evaluation adds at most [`Self::evaluation_noise`]. The rapidity is
    /// within [`Self::proven_slope`] and [`Self::rapidity_noise`]. The rate is the stored curve's and carries no
    /// proven error: some mHz/s at 437 MHz for a low orbit (all in `tests/pass_table.rs`).
    ///
    /// # Errors
    /// [`TableError::Before`], [`TableError::After`]: a table never extrapolates.
    ///
    /// # Cost
    /// The same number of instructions at every instant of a table; see the cost table in README.md.
    #[inline]
    pub fn at(&self, time: GpsTime) -> Result<Motion, TableError> {
        self.at_fine(time, 0)
    }

    /// The same at an instant finer than the grid of [`GpsTime`]: `fraction` is the rest in 2^-62 s.
    ///
    /// A tick of a timer rarely falls on the grid. Rounding it moves the delay by up to 1.1e-14 s, harmless as
    /// a phase, but 10 mHz at 437 MHz when the frequency is taken from delays a millisecond apart.
    ///
    /// # Errors
    /// As [`Self::at`].
    #[inline]
    pub fn at_fine(&self, time: GpsTime, fraction: u32) -> Result<Motion, TableError> {
        let elapsed = time.to_bits().wrapping_sub(self.epoch);
        if elapsed < 0 {
            return Err(TableError::Before);
        }
        if elapsed > self.span {
            return Err(TableError::After);
        }
        let place = self.layout.locate(self.directory, elapsed, fraction);
        let record = self.record(place.segment);
        Ok(self.layout.motion(&record, &place, self.base))
    }

    /// Six words of a segment and the node that follows it.
    #[inline]
    fn record(&self, segment: usize) -> [u32; RECORD_WORDS + 1] {
        let start = segment.wrapping_mul(RECORD_WORDS);
        self.records.get(start..).and_then(|words| words.first_chunk()).copied().unwrap_or_default()
    }

    fn word(&self, index: usize) -> u32 {
        self.words.get(index).copied().unwrap_or(0)
    }

    fn segments(&self) -> usize {
        (self.word(13) >> 16) as usize
    }

    /// The words as stored, CRC last.
    pub fn words(&self) -> &'a [u32] {
        self.words
    }

    /// First instant.
    pub fn start(&self) -> GpsTime {
        GpsTime::from_bits(self.epoch)
    }

    /// Last instant.
    pub fn end(&self) -> GpsTime {
        GpsTime::from_bits(self.epoch.saturating_add(self.span))
    }

    /// Number of polynomial pieces.
    pub fn segment_count(&self) -> usize {
        self.segments()
    }

    /// Direction of the signal.
    pub fn direction(&self) -> Direction {
        match self.word(0) & 3 {
            0 => Direction::Down,
            1 => Direction::Up,
            _ => Direction::TwoWay,
        }
    }

    /// End at which the time given to [`Self::at`] is read.
    pub fn tagged_at(&self) -> TaggedAt {
        if self.word(0) & 4 == 0 { TaggedAt::Ground } else { TaggedAt::Spacecraft }
    }

    /// Whether [`Self::at_late`] can answer for a lateness other than zero.
    pub fn has_lateness(&self) -> bool {
        self.word(0) & 8 != 0
    }

    /// Object number.
    pub fn object(&self) -> u32 {
        self.word(4)
    }

    /// Epoch of the elements, to the second.
    pub fn element_epoch(&self) -> GpsTime {
        GpsTime::from_bits(i64::from(self.word(5)) << GpsTime::FRACTION_BITS)
    }

    /// Site: latitude and longitude in 1e-7 degree, height in millimetres.
    pub fn site(&self) -> [i32; 3] {
        [self.word(6) as i32, self.word(7) as i32, self.word(8) as i32]
    }

    /// CRC-32 of the arc that it was baked from, 0 for none.
    pub fn arc_digest(&self) -> u32 {
        self.word(9)
    }

    /// CRC-32 of the table itself.
    pub fn digest(&self) -> u32 {
        self.words.last().copied().unwrap_or(0)
    }

    /// Proven error of the delay's slope (a pure number, in 2^-60): times the carrier it is hertz.
    pub fn proven_slope(&self) -> u32 {
        self.word(10)
    }

    /// Proven error of the delay in 2^-60 s, evaluation included: times the carrier it is cycles.
    pub fn proven_delay(&self) -> u32 {
        self.word(11)
    }

    /// Largest change, in 2^-60 s, that fixed-point evaluation can add to the difference of two delays.
    pub fn evaluation_noise(&self) -> u32 {
        self.layout.difference_noise()
    }

    /// Largest error, in 2^-60, that fixed-point evaluation adds to a rapidity beside [`Self::proven_slope`].
    ///
    /// # Cost
    /// A loop over the segments: for set-up.
    pub fn rapidity_noise(&self) -> u32 {
        let lengths =
            (0..self.word(13) >> 16).map(|segment| evaluate::entry(self.directory, segment) >> 16 & 0xF);
        let shortest = lengths.min();
        self.layout.rapidity_noise(shortest.unwrap_or(0))
    }

    /// Assumed ratio of successive Chebyshev coefficients beyond those that the fit saw, in 2^-16.
    pub fn smoothness(&self) -> u32 {
        self.word(14)
    }
}
