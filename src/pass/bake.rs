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

use super::arc::Arc;
use super::chebyshev::{self, Cosines};
use super::geometry::{Direction, Geometry, TaggedAt};
use super::packing::checksum;
use super::table::{
    BASE_FRACTION, CELL_BITS, DEGREE, FIELDS, HEADER_WORDS, LEAST_FRACTION, LONGEST, MAGIC, MOST_FRACTION,
    NOISE, PARTIAL_RECORD_WORDS, PartialRecord, PassTable, RECORD_WORDS, SPAN_FRACTION, TableError, VERSION,
};
use crate::time::GpsTime;

/// Chebyshev points of a segment.
const POINTS: usize = 24;
/// Chebyshev points at which the residual is looked at: 1/cos(pi 23 / 128) = 1.183.
const RESIDUAL_POINTS: usize = 64;
/// Assumed ratio of successive coefficients beyond the fit, in 2^-16: one half.
const SMOOTHNESS: u32 = 1 << 15;
/// Rounding noise of a Chebyshev coefficient in f64, relative to the delay.
const COEFFICIENT_NOISE: f64 = 1e-15;
/// The same in seconds, from places of some 1e7 m that a geometry computes with in f64 (5 nm).
const GEOMETRY_NOISE: f64 = 2e-17;
/// What interpolation at 24 Chebyshev points makes of a rough part whose slope is at most one (per half segment): of
/// the slope 34.7 (at the ends; the largest integral of the magnitude of the kernel that takes the part's slope to
/// the interpolant's, computed) and the part's own one; of the value 1 + 2.99 (Lebesgue's constant) times the
/// part's distance from polynomials, pi / 48 (Jackson); of a coefficient of order 20 on, 0.81 / 20.
const ROUGH_SLOPE: f64 = 36.0;
const ROUGH_DELAY: f64 = 0.27;
const ROUGH_COEFFICIENT: f64 = 0.05;
/// Slope that the narrow kernel of the rapidity ends at.
const STEEPEST: f64 = 1.0 / 8192.0;
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

/// One fitted segment.
#[derive(Clone, Copy, Debug, Default)]
struct Fit {
    coefficients: [i32; DEGREE + 1],
    slope_error: f64,
    delay_error: f64,
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

    fn round(&self, series: &[f64; POINTS], nodes: [i32; 2]) -> Option<([i32; DEGREE + 1], [f64; POINTS])> {
        let orders = FIELDS.map(|(coarser, width)| {
            (libm::ldexp(1.0, coarser - self.fraction), libm::ldexp(1.0, width as i32 - 1))
        });
        let storage = Storage { node_unit: libm::ldexp(1.0, 1 - self.fraction), orders: &orders };
        round(series, &storage, nodes.map(f64::from))
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
        match Layout::plan(&units, settings, span, delay, |_, _, _| Some(())) {
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

/// Walks over the segments of a table.
struct Layout;

impl Layout {
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
            length = (length + 1).min(covering).min(LONGEST);
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
}

/// Fits one segment; `None` when it is too long.
fn fit(
    units: &Units,
    settings: &BakeSettings,
    first: u32,
    length: u32,
    delay: &mut impl FnMut(f64) -> f64,
) -> Option<(Fit, [i32; 2])> {
    let half = units.cell_seconds() * libm::ldexp(1.0, length as i32) / 2.0;
    let start = units.cell_seconds() * f64::from(first);
    let mut values = [0.0; POINTS];
    for (index, value) in values.iter_mut().enumerate() {
        *value = delay(start + half * (1.0 + chebyshev::point(index, POINTS))) - units.base;
    }
    let series = chebyshev::interpolate(&values, &Cosines::<POINTS>::new());
    let rough = settings.roughness * half;
    let tail = tail(&series, units.base, rough)?;
    let nodes = [units.node(delay(start))?, units.node(delay(start + 2.0 * half))?];
    let (coefficients, left) = units.round(&series, nodes)?;
    if !fits(&series, units, half) {
        return None;
    }
    let factor = 1.0 / libm::cos(core::f64::consts::PI * (POINTS - 1) as f64 / (2 * RESIDUAL_POINTS) as f64);
    let (mut slope_error, mut delay_error) = (0.0_f64, 0.0_f64);
    for index in 0..RESIDUAL_POINTS {
        let (value, slope) = chebyshev::evaluate(&left, chebyshev::point(index, RESIDUAL_POINTS));
        delay_error = delay_error.max(value.abs());
        slope_error = slope_error.max(slope.abs());
    }
    let noise = libm::ldexp(f64::from(NOISE), -16 - units.fraction);
    let slope_error = (slope_error * factor + tail.1 + ROUGH_SLOPE * rough) / half;
    let delay_error = delay_error * factor + tail.0 + ROUGH_DELAY * rough + noise;
    let met = slope_error <= settings.slope_tolerance.min(LARGEST_ERROR)
        && delay_error <= settings.delay_tolerance.min(LARGEST_ERROR);
    met.then_some((Fit { coefficients, slope_error, delay_error }, nodes))
}

/// Bound on what lies beyond the interpolant: value and slope (per half segment); `None` when the
/// coefficients do not decay as the header states.
fn tail(series: &[f64; POINTS], base: f64, rough: f64) -> Option<(f64, f64)> {
    let most = |from: usize, to: usize| {
        series.get(from..to).unwrap_or(&[]).iter().fold(0.0_f64, |most, value| most.max(value.abs()))
    };
    let last = most(POINTS - 4, POINTS);
    let noise =
        (base.abs() + most(0, POINTS)) * COEFFICIENT_NOISE + GEOMETRY_NOISE + ROUGH_COEFFICIENT * rough;
    // Ten orders earlier the same ratio must have held: (1/2)^10, with a factor two for the phase.
    if last > noise && last * 512.0 > most(POINTS - 14, POINTS - 10) {
        return None;
    }
    let (mut value, mut slope, mut term) = (0.0, 0.0, 2.0 * last);
    for order in POINTS..POINTS + 64 {
        // Twice: the term itself, and the lower order that it looks like at the interpolant's points.
        term *= f64::from(SMOOTHNESS) / 65536.0;
        value += term;
        slope += term * (order * order) as f64;
    }
    Some((value, slope))
}

/// How coefficients and nodes are stored.
struct Storage<'a> {
    /// Unit of a node.
    node_unit: f64,
    /// Unit and largest magnitude of each coefficient from order 0 on; 0 and 1 are not used.
    orders: &'a [(f64, f64)],
}

/// Rounds the coefficients from the top; returns them and the series of what is left.
fn round(
    series: &[f64; POINTS],
    storage: &Storage<'_>,
    nodes: [f64; 2],
) -> Option<([i32; DEGREE + 1], [f64; POINTS])> {
    let mut left = *series;
    let mut target = cut_for_slope(series, storage.orders.len() - 1);
    let mut coefficients = [0; DEGREE + 1];
    let mut sums = [0.0; 2];
    let take = |left: &mut [f64; POINTS], target: &mut [f64; POINTS], power: usize, size: f64| {
        for (order, (left, target)) in left.iter_mut().zip(target).enumerate().take(power + 1) {
            let part = size * chebyshev::of_monomial(power, order);
            *left -= part;
            *target -= part;
        }
    };
    for (power, &(unit, limit)) in storage.orders.iter().enumerate().skip(2).rev() {
        let leading = *target.get(power)? / chebyshev::of_monomial(power, power);
        let rounded = libm::round(leading / unit);
        if !(0.0..limit).contains(&rounded.abs()) {
            return None;
        }
        *coefficients.get_mut(power)? = rounded as i32;
        *sums.get_mut(power % 2)? += rounded * unit;
        take(&mut left, &mut target, power, rounded * unit);
    }
    // Orders 0 and 1 as the evaluation derives them from the nodes.
    let [start, end] = nodes;
    let [even, odd] = sums;
    take(&mut left, &mut target, 1, (end - start) / 2.0 * storage.node_unit - odd);
    take(&mut left, &mut target, 0, (end + start) / 2.0 * storage.node_unit - even);
    Some((coefficients, left))
}

/// The series of a degree whose derivative is the derivative's series cut one order lower.
fn cut_for_slope(series: &[f64; POINTS], degree: usize) -> [f64; POINTS] {
    let mut slopes = [0.0; POINTS + 1];
    for order in (1..POINTS).rev() {
        let above = slopes.get(order + 1).copied().unwrap_or(0.0);
        let own = series.get(order).copied().unwrap_or(0.0);
        if let Some(slope) = slopes.get_mut(order - 1) {
            *slope = above + 2.0 * order as f64 * own;
        }
    }
    let mut cut = [0.0; POINTS];
    for (order, term) in cut.iter_mut().enumerate().take(degree + 1).skip(1) {
        let kept =
            |index: usize| if index < degree { slopes.get(index).copied().unwrap_or(0.0) } else { 0.0 };
        *term = (kept(order - 1) - kept(order + 1)) / (2 * order) as f64;
    }
    cut
}

/// Whether slope and curvature stay inside the evaluation's 32 bits, and the slope inside the narrow kernel's
/// range, anywhere on the segment.
fn fits(series: &[f64; POINTS], units: &Units, half: f64) -> bool {
    let bounds = series.iter().enumerate().fold((0.0, 0.0), |(slope, bend), (order, value)| {
        let square = (order * order) as f64;
        (slope + value.abs() * square, bend + value.abs() * square * (square - 1.0).max(0.0) / 3.0)
    });
    // In the evaluation's argument, half as long: slope doubles, half the curvature doubles. Orders 1 and 0
    // are held at twice and four times the resolution.
    let scale = libm::ldexp(1.0, units.fraction - 2);
    bounds.0 < STEEPEST * half && bounds.0 * 2.0 * scale < 1.0e9 && bounds.1 * 2.0 * scale < 8.0e8
}

/// Writes a whole table; returns its length in words.
fn write(
    buffer: &mut [u32],
    settings: &BakeSettings,
    units: &Units,
    count: usize,
    span: f64,
    delay: &mut impl FnMut(f64) -> f64,
    late: Option<&mut dyn FnMut(f64, f64) -> f64>,
) -> Result<usize, BakeError> {
    let directory_words = count.next_power_of_two().max(2) / 2;
    let records = HEADER_WORDS + directory_words;
    let mut end = records + count * RECORD_WORDS + 1;
    let (directory, rest) = buffer
        .get_mut(HEADER_WORDS..)
        .and_then(|words| words.split_at_mut_checked(directory_words))
        .ok_or(BakeError::BufferTooSmall)?;
    directory.fill(u32::MAX);
    let mut segment = 0;
    let (_, worst) = Layout::plan(units, settings, span, delay, |first, length, (fit, nodes)| {
        let shift = 16 * (segment % 2);
        let word = directory.get_mut(segment / 2)?;
        *word = *word & !(0xFFFF << shift) | (first << (16 - CELL_BITS) | length) << shift;
        let record = rest.get_mut(segment * RECORD_WORDS..)?.first_chunk_mut::<{ RECORD_WORDS + 1 }>()?;
        let [start, end] = *nodes;
        let [_, _, c2, c3, c4, c5, c6, c7, c8, c9] = fit.coefficients;
        let joined = |high: i32, low: i32, bits: u32| (high as u32) << bits | low as u32 & ((1 << bits) - 1);
        *record = [
            start as u32,
            c2 as u32,
            c3 as u32,
            joined(c4, c9, 10),
            joined(c5, c8, 12),
            joined(c6, c7, 15),
            end as u32,
        ];
        segment += 1;
        Some(())
    })?;
    if let Some(late) = late {
        let (before, partial) = buffer.split_at_mut_checked(end).ok_or(BakeError::BufferTooSmall)?;
        let directory = before.get(HEADER_WORDS..records).unwrap_or(&[]);
        end += write_partial(partial, directory, count, units, late)?;
    }
    let header = header(settings, units, count, span, &worst, end > records + count * RECORD_WORDS + 1);
    buffer.get_mut(..HEADER_WORDS).ok_or(BakeError::BufferTooSmall)?.copy_from_slice(&header);
    let sum = checksum(buffer.get(..end).ok_or(BakeError::BufferTooSmall)?);
    *buffer.get_mut(end).ok_or(BakeError::BufferTooSmall)? = sum;
    Ok(end + 1)
}

fn header(
    settings: &BakeSettings,
    units: &Units,
    count: usize,
    span: f64,
    worst: &Fit,
    has_partial: bool,
) -> [u32; HEADER_WORDS] {
    let direction = match settings.direction {
        Direction::Down => 0,
        Direction::Up => 1,
        Direction::TwoWay => 2,
    };
    let flags =
        direction | u32::from(settings.tagged_at == TaggedAt::Spacecraft) << 2 | u32::from(has_partial) << 3;
    let epoch = settings.start.to_bits() as u64;
    let [latitude, longitude, height] = settings.site;
    [
        MAGIC << 16 | VERSION << 12 | (DEGREE as u32) << 8 | flags,
        epoch as u32,
        (epoch >> 32) as u32,
        libm::ceil(libm::ldexp(span, SPAN_FRACTION as i32)) as u32,
        settings.object,
        (settings.element_epoch.to_bits() >> GpsTime::FRACTION_BITS) as u32,
        latitude as u32,
        longitude as u32,
        height as u32,
        settings.arc_digest,
        libm::ceil(libm::ldexp(worst.slope_error, 60)) as u32,
        libm::ceil(libm::ldexp(worst.delay_error, 60)) as u32,
        libm::floor(libm::ldexp(units.base, BASE_FRACTION as i32)) as i32 as u32,
        units.fraction as u32 | units.cell << 8 | (count as u32) << 16,
        SMOOTHNESS,
    ]
}

/// Degree of the lateness partial.
const PARTIAL_DEGREE: usize = 5;
/// Lateness in seconds at which the partial is taken, both ways.
const PARTIAL_LATENESS: f64 = 2.0;

/// Writes the lateness partial; returns its length in words.
fn write_partial(
    partial: &mut [u32],
    directory: &[u32],
    count: usize,
    units: &Units,
    late: &mut dyn FnMut(f64, f64) -> f64,
) -> Result<usize, BakeError> {
    // What a second of lateness changes after the curve has been slid by it.
    let mut change = |seconds: f64| {
        let later = late(seconds + PARTIAL_LATENESS, PARTIAL_LATENESS);
        let earlier = late(seconds - PARTIAL_LATENESS, -PARTIAL_LATENESS);
        (later - earlier) / (2.0 * PARTIAL_LATENESS)
    };
    let place = |segment: usize| {
        let entry = directory.get(segment / 2).map_or(0, |word| word >> (16 * (segment % 2)) & 0xFFFF);
        let half = units.cell_seconds() * libm::ldexp(1.0, (entry & 0xF) as i32) / 2.0;
        (units.cell_seconds() * f64::from(entry >> (16 - CELL_BITS)), half)
    };
    let mut sampled = |segment: usize| {
        let (start, half) = place(segment);
        let values =
            core::array::from_fn(|index| change(start + half * (1.0 + chebyshev::point(index, POINTS))));
        (
            chebyshev::interpolate(&values, &Cosines::<POINTS>::new()),
            [change(start), change(start + 2.0 * half)],
        )
    };
    let (mut largest_node, mut largest_term) = (1e-12_f64, 1e-12_f64);
    for segment in 0..count {
        let (series, nodes) = sampled(segment);
        largest_node = nodes.iter().fold(largest_node, |most, node| most.max(node.abs()));
        // A coefficient of order 2 to 5 is at most this multiple of what the series holds there.
        let terms = series.iter().skip(2).fold(0.0, |sum, term| sum + term.abs());
        largest_term = largest_term.max(terms * 20.0);
    }
    let exponent = |size: f64| libm::ilogb(size) + 1;
    let fraction = (30 - exponent(largest_node)).min(59);
    let coarser = (fraction + exponent(largest_term) - 15).max(0);
    let unit = libm::ldexp(1.0, coarser - fraction);
    let orders = [(unit, 32_767.0); PARTIAL_DEGREE + 1];
    let storage = Storage { node_unit: libm::ldexp(1.0, -fraction), orders: &orders };
    let (head, records) = partial.split_first_mut().ok_or(BakeError::BufferTooSmall)?;
    *head = fraction as u32 | (coarser as u32) << 8;
    for segment in 0..count {
        let (series, nodes) = sampled(segment);
        let nodes = nodes.map(|node| libm::round(node / storage.node_unit));
        let (coefficients, _) = round(&series, &storage, nodes).ok_or(BakeError::DelayNotUsable)?;
        let [_, _, c2, c3, c4, c5, ..] = coefficients;
        let [start, end] = nodes;
        let record =
            PartialRecord { node: start as i32, coefficients: [c2, c3, c4, c5].map(|value| value as i16) };
        let words = records.get_mut(segment * PARTIAL_RECORD_WORDS..).ok_or(BakeError::BufferTooSmall)?;
        let words = words.get_mut(..=PARTIAL_RECORD_WORDS).ok_or(BakeError::BufferTooSmall)?;
        let (body, next) = words.split_at_mut(PARTIAL_RECORD_WORDS);
        body.copy_from_slice(&record.to_words());
        next.fill(end as i32 as u32);
    }
    Ok(2 + count * PARTIAL_RECORD_WORDS)
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

/// What [`audit`] saw.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Audit {
    /// Largest difference of delay in seconds.
    pub worst_delay: f64,
    /// Largest difference of the delay's slope, as the change from one instant to the next over the step; it holds
    /// [`PassTable::evaluation_noise`] over the step, so do not look closer than some 10 ms.
    pub worst_slope: f64,
    /// Instants looked at.
    pub instants: u32,
}

/// Checks a table against `delay` (seconds from the table's start) on a grid of `step` seconds (at least 1 us),
/// without trusting the fit: nothing here knows how the table was made.
///
/// # Errors
/// The instant's [`TableError`], which a sound table does not give inside its span.
pub fn audit(
    table: &PassTable<'_>,
    step: f64,
    mut delay: impl FnMut(f64) -> f64,
) -> Result<Audit, TableError> {
    let mut seen = Audit::default();
    let step = step.max(1e-6);
    let span = table.end().seconds_since(table.start());
    let mut before: Option<(f64, f64)> = None;
    let mut index = 0.0;
    while index * step <= span {
        let time = table.start().plus_seconds(index * step);
        let seconds = time.seconds_since(table.start());
        let stored = table.at(time)?.delay.to_bits() as f64 / 72_057_594_037_927_936.0;
        let difference = stored - delay(seconds);
        seen.worst_delay = seen.worst_delay.max(difference.abs());
        if let Some((earlier, then)) = before {
            seen.worst_slope = seen.worst_slope.max(((difference - then) / (seconds - earlier)).abs());
        }
        before = Some((seconds, difference));
        seen.instants = seen.instants.saturating_add(1);
        index += 1.0;
    }
    Ok(seen)
}
