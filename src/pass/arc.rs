//! The spacecraft's Earth-fixed position over a pass, free of site, carrier and direction.
#![allow(
    clippy::arithmetic_side_effects,
    reason = "set-up: counts of at most 64 words, orders up to 15, quanta from 2^-9 to 2^16"
)]
#![allow(
    clippy::cast_possible_truncation,
    reason = "set-up: fields are held below their width before, and words are cut out on purpose"
)]

use super::chebyshev::{self, Cosines};
use super::packing::{BitReader, BitWriter, checksum};
use crate::time::GpsTime;

/// Highest degree an arc may have.
const MAX_DEGREE: usize = 15;
/// Words of the largest arc: degree 15, every field 32 bits wide.
pub const MAX_ARC_WORDS: usize = 58;
/// Points of the interpolant that the fit starts from.
const FIT_POINTS: usize = 28;
/// Places at which the fit looks at what it left over.
const RESIDUAL_POINTS: usize = 64;
const MAGIC: u32 = 0x4B53;
const VERSION: u32 = 1;
const HEADER_WORDS: usize = 6;
/// Quantum of the position, as a power of two in metres, that is tried first: centimetres do for minutes.
const COARSEST_QUANTUM: i32 = -6;
/// A quantum that holds every position below a million kilometres.
const MOST_QUANTUM: i32 = 16;
/// How many finer quanta are tried: in a short span a centimetre is much velocity.
const FINER_QUANTA: i32 = 3;
/// What every stored coefficient stays below.
const LARGEST_FIELD: f64 = 2_147_483_647.0;
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

    /// Fits and writes an arc into `buffer` ([`MAX_ARC_WORDS`] always suffice); `position` gives the
    /// Earth-fixed position in metres at seconds from `settings.start`.
    ///
    /// The lowest degree that meets the tolerance is taken.
    ///
    /// # Errors
    /// See [`ArcError`].
    ///
    /// # Accuracy
    /// Velocity within `velocity_tolerance` on each axis at 65 places of the span, quantisation included;
    /// position is rounded at 2^-6 m (finer for a tolerance below 0.4 mm/s and in spans of a minute or two, coarser
    /// far out). `tests/arc.rs` holds
    /// it to 1 mHz at 437 MHz for a thousand random sites.
    pub fn fit(
        buffer: &'a mut [u32],
        settings: &ArcSettings,
        mut position: impl FnMut(f64) -> [f64; 3],
    ) -> Result<Self, ArcError> {
        let span = settings.end.seconds_since(settings.start);
        let half_units = libm::ceil(span * SPAN_FRACTION / 2.0);
        if !(1.0..4_294_967_296.0).contains(&half_units) {
            return Err(ArcError::SpanNotUsable);
        }
        let half_span = half_units / SPAN_FRACTION;
        let middle = settings.start.plus_seconds(span / 2.0);
        let offset = middle.seconds_since(settings.start);
        let cosines = Cosines::<FIT_POINTS>::new();
        let mut samples = [[0.0; FIT_POINTS]; 3];
        for index in 0..FIT_POINTS {
            let place = position(offset + half_span * chebyshev::point(index, FIT_POINTS));
            for (axis, &coordinate) in samples.iter_mut().zip(&place) {
                if !(0.0..1e9).contains(&coordinate.abs()) {
                    return Err(ArcError::PositionNotUsable);
                }
                if let Some(sample) = axis.get_mut(index) {
                    *sample = coordinate;
                }
            }
        }
        let series = samples.map(|axis| chebyshev::interpolate(&axis, &cosines));
        let first = first_quantum(settings.velocity_tolerance);
        let (quantum, degree) =
            storage(&series, settings.velocity_tolerance * half_span, first).ok_or(ArcError::TooCurved)?;
        let length = write(buffer, settings, middle, half_units as u32, quantum, degree, &series)
            .ok_or(ArcError::BufferTooSmall)?;
        Self::new(buffer.get(..length).ok_or(ArcError::BufferTooSmall)?)
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

/// A coefficient in units of its order's quantum.
fn quantise(value: f64, order: usize, quantum: i32) -> f64 {
    libm::round(value / power_of_two(quantum - finer_bits(order)))
}

/// The quantum that is tried first: without it, asking for less velocity error would leave the phase as it is.
fn first_quantum(velocity_tolerance: f64) -> i32 {
    let mut quantum = COARSEST_QUANTUM;
    while quantum > COARSEST_QUANTUM - FINER_QUANTA && power_of_two(quantum) > velocity_tolerance * 40.0 {
        quantum -= 1;
    }
    quantum
}

/// Coarsest quantum (as a power of two, not above `first` where that holds the positions) and lowest degree with
/// which the velocity is within `tolerance`, in metres per half span.
fn storage(series: &[[f64; FIT_POINTS]; 3], tolerance: f64, first: i32) -> Option<(i32, usize)> {
    // Every order that may be stored must fit its 32 bits: the third is stored finer than the first.
    let held = |&quantum: &i32| {
        series.iter().all(|axis| {
            let mut stored = axis.iter().enumerate().take(MAX_DEGREE + 1);
            stored.all(|(order, &value)| quantise(value, order, quantum).abs() < LARGEST_FIELD)
        })
    };
    let coarsest = (first..MOST_QUANTUM).find(held)?;
    (coarsest - FINER_QUANTA..=coarsest).rev().take_while(held).find_map(|quantum| {
        let error = |degree| {
            series.iter().fold(0.0_f64, |most, axis| most.max(velocity_error(axis, degree, quantum)))
        };
        (2..=MAX_DEGREE).find(|&degree| error(degree) <= tolerance).map(|degree| (quantum, degree))
    })
}

/// Largest velocity error, per half span, that stopping at `degree` and rounding leave on one axis.
fn velocity_error(series: &[f64; FIT_POINTS], degree: usize, quantum: i32) -> f64 {
    let mut left = *series;
    for (order, value) in left.iter_mut().enumerate().take(degree + 1) {
        *value -= quantise(*value, order, quantum) * power_of_two(quantum - finer_bits(order));
    }
    (0..=RESIDUAL_POINTS).fold(0.0, |worst, index| {
        let place = index as f64 * (2.0 / RESIDUAL_POINTS as f64) - 1.0;
        worst.max(chebyshev::evaluate(&left, place).1.abs())
    })
}

fn write(
    buffer: &mut [u32],
    settings: &ArcSettings,
    middle: GpsTime,
    half_units: u32,
    quantum: i32,
    degree: usize,
    series: &[[f64; FIT_POINTS]; 3],
) -> Option<usize> {
    let model = match settings.model {
        ArcModel::Unstated => 0,
        ArcModel::Sgp4 => 1,
        ArcModel::Ephemeris => 2,
    };
    let epoch = middle.to_bits() as u64;
    let header = [
        MAGIC << 16 | VERSION << 12 | (degree as u32) << 8 | model,
        epoch as u32,
        (epoch >> 32) as u32,
        half_units,
        settings.object,
        (settings.element_epoch.to_bits() >> GpsTime::FRACTION_BITS) as u32,
    ];
    buffer.get_mut(..HEADER_WORDS)?.copy_from_slice(&header);
    let mut writer = BitWriter::new(buffer.get_mut(HEADER_WORDS..)?);
    writer.push(quantum as u32, 8)?;
    let field = |axis: &[f64; FIT_POINTS], order: usize| {
        axis.get(order).map_or(0, |&value| quantise(value, order, quantum) as i32)
    };
    let width = |order| {
        let bits = series.iter().map(|axis| {
            let value = field(axis, order);
            33 - (value ^ (value >> 31)).leading_zeros()
        });
        bits.max().unwrap_or(1).min(32)
    };
    for order in 0..=degree {
        writer.push(width(order) - 1, 5)?;
    }
    for order in 0..=degree {
        for axis in series {
            writer.push(field(axis, order) as u32, width(order))?;
        }
    }
    let length = HEADER_WORDS + writer.words_used();
    let sum = checksum(buffer.get(..length)?);
    *buffer.get_mut(length)? = sum;
    Some(length + 1)
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
