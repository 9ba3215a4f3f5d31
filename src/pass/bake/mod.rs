//! Baking: from a delay that can be asked at any instant to a [`PassTable`].
//!
//! Segments are taken from the left, each as long as the asked-for error allows. A segment is fitted from its
//! Chebyshev series: the derivative's series is cut (so the slope, which is the frequency, is what comes out
//! near its best), the coefficients are rounded from the highest order down, each rounding handed on to the
//! lower orders, and what is left is bounded, not sampled:
//!
//! * (a) the fixed-point evaluation's rounding by analysis (`table/evaluate.rs`);
//! * (b) the residual, a polynomial of degree N, from M Chebyshev points with the factor 1/cos(pi N / 2M)
//!   (H. Ehlich and K. Zeller, Mathematische Zeitschrift 86, 1964, from memory);
//! * (c) the tail beyond degree N as a geometric series with the ratio that the header states; a segment whose
//!   coefficients visibly decay more slowly is refused;
//! * (d) for a delay that is smooth only to a stated roughness of its slope (a log), what interpolation makes of
//!   the rough part.
#![allow(clippy::arithmetic_side_effects, reason = "set-up: a span has at most 1025 cells, a segment 4096")]
#![allow(
    clippy::cast_possible_truncation,
    reason = "set-up: the range is tested before, and a cast from a float saturates"
)]

mod audit;
mod fit;
mod write;

use super::arc::Arc;
use super::geometry::{Direction, Geometry, TaggedAt};
use super::table::{BASE_FRACTION, LEAST_FRACTION, LONGEST, MOST_FRACTION, PassTable, SPAN_FRACTION};
use crate::time::GpsTime;
use fit::{Fit, ROUGH_SLOPE, STEEPEST, fit};
use write::write;

pub use audit::{Audit, audit};

/// Largest error that the header can state, for slope and for delay: 3.7e-9.
const LARGEST_ERROR: f64 = u32::MAX as f64 / (1u64 << 60) as f64;
/// Most segments a table gets.
const MOST_SEGMENTS: usize = 256;
/// Nodes stay below this.
const LARGEST_NODE: f64 = (1u64 << 31) as f64;
/// Values of Q that are tried, from the finest that holds the nodes.
const FRACTION_TRIES: i32 = 3;

/// Why a table could not be baked.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
#[non_exhaustive]
pub enum BakeError {
    /// The end is not after the start, or the span is above 48 days.
    SpanNotUsable,
    /// A tolerance is not above 1e-13 (slope) or 1e-13 s (delay), or the roughness is negative or above 1e-10.
    ToleranceNotUsable,
    /// A delay was not a number, or 64 s or more in magnitude.
    DelayNotUsable,
    /// The delay changes by 2^-13 a second or more: 36.6 km/s one way, half of that two ways.
    TooFast,
    /// The delay is not smooth enough, or the tolerance too fine, for 256 segments.
    TooManySegments,
    /// The buffer given to write into is too small.
    BufferTooSmall,
    /// The span reaches outside the arc.
    OutsideArc,
}

impl core::fmt::Display for BakeError {
    fn fmt(&self, formatter: &mut core::fmt::Formatter<'_>) -> core::fmt::Result {
        formatter.write_str(match self {
            Self::SpanNotUsable => "table span must be positive and below 48 days",
            Self::ToleranceNotUsable => {
                "tolerance finer than 1e-13 (slope) or 1e-13 s (delay), roughness above 1e-10, or not a number"
            }
            Self::DelayNotUsable => "a delay was not a number or beyond 64 s",
            Self::TooFast => "the delay changes faster than 2^-13 (36.6 km/s): beyond the format; check its unit",
            Self::TooManySegments => {
                "256 segments do not meet the tolerance: allow more error, shorten the span or smooth the input"
            }
            Self::BufferTooSmall => "buffer too small for the table",
            Self::OutsideArc => "the span reaches outside the arc: bake a span inside it, or get the next arc",
        })
    }
}

impl core::error::Error for BakeError {}

/// What a table says about itself.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct BakeSettings {
    /// First instant.
    pub start: GpsTime,
    /// Last instant.
    pub end: GpsTime,
    /// Largest allowed error of the delay's slope: hertz over carrier.
    pub slope_tolerance: f64,
    /// Largest allowed error of the delay in seconds: cycles over carrier.
    pub delay_tolerance: f64,
    /// How far the slope of the delay that is baked may be from a smooth curve's: 0 for a geometry or a formula,
    /// [`RangeRateLog::roughness`](super::RangeRateLog::roughness) for a log. It counts 36 times in the proven slope.
    pub roughness: f64,
    /// Direction of the signal.
    pub direction: Direction,
    /// End at which time is read.
    pub tagged_at: TaggedAt,
    /// Object number.
    pub object: u32,
    /// Epoch of the elements.
    pub element_epoch: GpsTime,
    /// Latitude and longitude in 1e-7 degree, height in millimetres.
    pub site: [i32; 3],
    /// CRC-32 of the arc, or 0.
    pub arc_digest: u32,
}

/// Units of one attempt.
#[derive(Clone, Copy)]
struct Units {
    fraction: i32,
    base: f64,
    /// log2 of a cell in 2^-30 s.
    cell: u32,
}

impl Units {
    fn cell_seconds(&self) -> f64 {
        libm::ldexp(1.0, self.cell as i32 - GpsTime::FRACTION_BITS as i32)
    }

    /// A node in 2^-(Q-1) s from the base; `None` when it does not fit.
    fn node(&self, delay: f64) -> Option<i32> {
        let scaled = libm::round(libm::ldexp(delay - self.base, self.fraction - 1));
        (scaled.abs() < LARGEST_NODE).then_some(scaled as i32)
    }
}

/// Bakes a table into `buffer` from `delay`, which gives the apparent delay in seconds at seconds from
/// `settings.start`, read at the tagged end. It is asked up to one segment past the end and must go on smoothly
/// there. `late` gives, where the table shall answer for lateness, the same for a spacecraft late by its second
/// argument in seconds.
///
/// # Accuracy
/// The slope within `slope_tolerance` and the delay within `delay_tolerance`, as proven bounds (see the module).
///
/// # Errors
/// See [`BakeError`].
pub fn bake<'a>(
    buffer: &'a mut [u32],
    settings: &BakeSettings,
    mut delay: impl FnMut(f64) -> f64,
    late: Option<&mut dyn FnMut(f64, f64) -> f64>,
) -> Result<PassTable<'a>, BakeError> {
    let span = settings.end.seconds_since(settings.start);
    let span_units = libm::ceil(libm::ldexp(span, SPAN_FRACTION as i32));
    if !(span > 0.0 && span_units < 4_294_967_296.0) {
        return Err(BakeError::SpanNotUsable);
    }
    let span = libm::ldexp(span_units, -(SPAN_FRACTION as i32));
    let roughness_usable = settings.roughness >= 0.0 && ROUGH_SLOPE * settings.roughness < LARGEST_ERROR;
    if !(settings.slope_tolerance > 1e-13 && settings.delay_tolerance > 1e-13 && roughness_usable) {
        return Err(BakeError::ToleranceNotUsable);
    }
    let mut usable = true;
    let mut checked = |seconds: f64| {
        let value = delay(seconds);
        usable &= seconds > span || value.abs() < 64.0;
        value
    };
    let cheapest = cheapest(settings, span, &mut checked);
    if !usable {
        return Err(BakeError::DelayNotUsable);
    }
    let (units, count) = cheapest?;
    let length = write(buffer, settings, &units, count, span, &mut delay, late)?;
    buffer
        .get(..length)
        .ok_or(BakeError::BufferTooSmall)
        .and_then(|words| PassTable::new(words).map_err(|_| BakeError::BufferTooSmall))
}

/// The units that need the fewest segments, and how many.
fn cheapest(
    settings: &BakeSettings,
    span: f64,
    delay: &mut impl FnMut(f64) -> f64,
) -> Result<(Units, usize), BakeError> {
    let finest = units_for(span, cell_for(span), delay)?;
    let mut best: Option<(Units, usize)> = None;
    let mut refusal = BakeError::TooManySegments;
    let coarsest = (finest.fraction + 1 - FRACTION_TRIES).max(LEAST_FRACTION as i32);
    for fraction in (coarsest..=finest.fraction).rev() {
        let units = Units { fraction, ..finest };
        match plan(&units, settings, span, delay, |_, _, _| Some(())) {
            Ok((count, _)) if best.is_none_or(|(_, least)| count < least) => best = Some((units, count)),
            Ok(_) => {}
            Err(error) => refusal = error,
        }
    }
    best.ok_or(refusal)
}

/// log2, in 2^-30 s, of the smallest cell of which 1024 cover the span.
fn cell_for(span: f64) -> u32 {
    let mut cell = 21;
    while cell < 48 && libm::ldexp(1.0, cell as i32 - 30) * 1024.0 < span {
        cell += 1;
    }
    cell
}

/// Base and the finest Q whose nodes hold the delay's range with room for what lies past the end.
fn units_for(span: f64, cell: u32, delay: &mut impl FnMut(f64) -> f64) -> Result<Units, BakeError> {
    const LOOKS: i32 = 40;
    let (mut least, mut most) = (f64::INFINITY, f64::NEG_INFINITY);
    for look in 0..=LOOKS {
        let value = delay(span * 1.05 * f64::from(look) / f64::from(LOOKS));
        if !(0.0..64.0).contains(&value.abs()) {
            return Err(BakeError::DelayNotUsable);
        }
        least = least.min(value);
        most = most.max(value);
    }
    let middle = libm::ldexp((least + most) / 2.0, BASE_FRACTION as i32);
    let base = libm::ldexp(libm::floor(middle), -(BASE_FRACTION as i32));
    let reach = (most - least) * 0.52 + 1e-7;
    let mut fraction = MOST_FRACTION as i32;
    while fraction > LEAST_FRACTION as i32 && libm::ldexp(reach, fraction - 1) >= LARGEST_NODE {
        fraction -= 1;
    }
    Ok(Units { fraction, base, cell })
}

/// Lays segments from the left and hands each (first cell, log2 length, fit and its two nodes) to `keep`;
/// returns how many there are and the largest slope and delay errors.
fn plan(
    units: &Units,
    settings: &BakeSettings,
    span: f64,
    delay: &mut impl FnMut(f64) -> f64,
    mut keep: impl FnMut(u32, u32, &(Fit, [i32; 2])) -> Option<()>,
) -> Result<(usize, Fit), BakeError> {
    // The last instant itself must lie inside a segment, not at its end.
    let cells = libm::floor(span / units.cell_seconds()) as u32 + 1;
    let mut first = 0;
    let mut length = LONGEST;
    let mut worst = Fit::default();
    for count in 1..=MOST_SEGMENTS {
        let left = cells - first;
        let covering = 32 - (left - 1).leading_zeros();
        // The last one reaches past the end rather than be tiny: the rounding of its slope would be what bounds
        // the whole table's.
        let least = if count == 1 { 0 } else { length.saturating_sub(2) };
        length = (length + 1).min(covering.max(least)).min(LONGEST);
        let fitted = loop {
            if let Some(fitted) = fit(units, settings, first, length, delay) {
                break fitted;
            }
            length = length.checked_sub(1).ok_or_else(|| {
                let start = units.cell_seconds() * f64::from(first);
                let change = delay(start + units.cell_seconds()) - delay(start);
                let too_fast = change.abs() >= 0.99 * STEEPEST * units.cell_seconds();
                if too_fast { BakeError::TooFast } else { BakeError::TooManySegments }
            })?;
        };
        worst.slope_error = worst.slope_error.max(fitted.0.slope_error);
        worst.delay_error = worst.delay_error.max(fitted.0.delay_error);
        keep(first, length, &fitted).ok_or(BakeError::BufferTooSmall)?;
        first += 1 << length;
        if first >= cells {
            return Ok((count, worst));
        }
    }
    Err(BakeError::TooManySegments)
}

/// Bakes an arc seen by a geometry, with the lateness partial when asked for.
///
/// # Errors
/// [`BakeError::OutsideArc`] when the span reaches past the arc; else as [`bake`]. Light time, the partial's 2 s of
/// lateness and the last segment may reach a little further: keep some seconds of arc at both ends.
pub fn bake_arc<'a>(
    buffer: &'a mut [u32],
    arc: &Arc<'_>,
    geometry: &Geometry,
    request: &Request,
) -> Result<PassTable<'a>, BakeError> {
    let origin = request.start.seconds_since(geometry.origin());
    let end = request.end.seconds_since(geometry.origin());
    if !(origin >= -geometry.half_span() && end <= geometry.half_span()) {
        return Err(BakeError::OutsideArc);
    }
    let [latitude, longitude, height] = geometry.site().geodetic_coordinates();
    let settings = BakeSettings {
        start: request.start,
        end: request.end,
        slope_tolerance: request.slope_tolerance,
        delay_tolerance: request.delay_tolerance,
        roughness: 0.0,
        direction: geometry.direction(),
        tagged_at: geometry.tagged_at(),
        object: arc.object(),
        element_epoch: arc.element_epoch(),
        site: [latitude * 1e7, longitude * 1e7, height * 1e3].map(|value| libm::round(value) as i32),
        arc_digest: arc.digest(),
    };
    let delay = |seconds: f64| geometry.delay_and_rapidity(origin + seconds).0;
    let mut late = |seconds: f64, lateness: f64| {
        geometry.with_lateness(geometry.lateness() + lateness).delay_and_rapidity(origin + seconds).0
    };
    bake(buffer, &settings, delay, if request.lateness_partial { Some(&mut late) } else { None })
}

/// What [`bake_arc`] is asked for.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Request {
    /// First instant.
    pub start: GpsTime,
    /// Last instant.
    pub end: GpsTime,
    /// Largest allowed error of the delay's slope: hertz over carrier.
    pub slope_tolerance: f64,
    /// Largest allowed error of the delay in seconds: cycles over carrier.
    pub delay_tolerance: f64,
    /// Whether the table shall answer for lateness.
    pub lateness_partial: bool,
}
