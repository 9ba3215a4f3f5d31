//! Fitting and writing an arc: the coarsest quantum and the lowest degree that meet the tolerance.

use super::super::chebyshev::{self, Cosines};
use super::super::packing::{BitWriter, checksum};
use super::{
    Arc, ArcError, ArcModel, ArcSettings, HEADER_WORDS, MAGIC, MAX_DEGREE, SPAN_FRACTION, VERSION,
    finer_bits, power_of_two,
};
use crate::time::GpsTime;

/// Points of the interpolant that the fit starts from.
const FIT_POINTS: usize = 28;
/// Places at which the fit looks at what it left over.
const RESIDUAL_POINTS: usize = 64;
/// Quantum of the position, as a power of two in metres, that is tried first: centimetres do for minutes.
const COARSEST_QUANTUM: i32 = -6;
/// A quantum that holds every position below a million kilometres.
const MOST_QUANTUM: i32 = 16;
/// How many finer quanta are tried: in a short span a centimetre is much velocity.
const FINER_QUANTA: i32 = 3;
/// What every stored coefficient stays below.
const LARGEST_FIELD: f64 = 2_147_483_647.0;

impl<'a> Arc<'a> {
    /// Fits and writes an arc into `buffer` ([`super::MAX_ARC_WORDS`] always suffice); `position` gives the
    /// Earth-fixed position in metres at seconds from `settings.start`.
    ///
    /// The lowest degree that meets the tolerance is taken.
    ///
    /// # Accuracy
    /// Velocity within `velocity_tolerance` on each axis at 65 places of the span, quantisation included;
    /// position is rounded at 2^-6 m (finer for a tolerance below 0.4 mm/s and in spans of a minute or two, coarser
    /// far out). `tests/arc.rs` holds
    /// it to 1 mHz at 437 MHz for a thousand random sites.
    ///
    /// # Errors
    /// See [`ArcError`].
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
