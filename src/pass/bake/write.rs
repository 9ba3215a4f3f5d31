//! The words of a table: header, directory, records, lateness partial.
#![allow(
    clippy::arithmetic_side_effects,
    reason = "set-up: at most 256 segments, and binary exponents of floats"
)]
#![allow(
    clippy::cast_possible_truncation,
    reason = "set-up: fields are held below their width before, and words are cut out on purpose"
)]

use super::super::chebyshev::{self, Cosines};
use super::super::geometry::{Direction, TaggedAt};
use super::super::packing::checksum;
use super::super::table::{
    BASE_FRACTION, CELL_BITS, DEGREE, HEADER_WORDS, MAGIC, PARTIAL_RECORD_WORDS, PartialRecord, RECORD_WORDS,
    SPAN_FRACTION, VERSION, directory_entry,
};
use super::fit::{Fit, POINTS, SMOOTHNESS, Storage, round};
use super::{BakeError, BakeSettings, Units, plan};
use crate::time::GpsTime;

/// Degree of the lateness partial.
const PARTIAL_DEGREE: usize = 5;
/// Lateness in seconds at which the partial is taken, both ways.
const PARTIAL_LATENESS: f64 = 2.0;

/// Writes a whole table; returns its length in words.
pub(super) fn write(
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
    let (_, worst) = plan(units, settings, span, delay, |first, length, (fit, nodes)| {
        let shift = 16 * (segment % 2);
        let word = directory.get_mut(segment / 2)?;
        *word = *word & !(0xFFFF << shift) | (first << (16 - CELL_BITS) | length) << shift;
        let record = rest.get_mut(segment * RECORD_WORDS..)?.first_chunk_mut::<{ RECORD_WORDS + 1 }>()?;
        *record = packed(fit, *nodes);
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

/// A segment's record and the node after it.
fn packed(fit: &Fit, [start, end]: [i32; 2]) -> [u32; RECORD_WORDS + 1] {
    let [_, _, c2, c3, c4, c5, c6, c7, c8, c9] = fit.coefficients;
    let joined = |high: i32, low: i32, bits: u32| (high as u32) << bits | low as u32 & ((1 << bits) - 1);
    [
        start as u32,
        c2 as u32,
        c3 as u32,
        joined(c4, c9, 10),
        joined(c5, c8, 12),
        joined(c6, c7, 15),
        end as u32,
    ]
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

/// What lateness does to a segment.
struct Sampled {
    /// Change of the delay per second of lateness after sliding: its series, and its values at both ends.
    change: [f64; POINTS],
    nodes: [f64; 2],
    /// What a second of lateness changes in that: at both ends, and the coefficient 2 between them.
    bends: [f64; 2],
    bow: f64,
}

impl Sampled {
    /// The segment that starts at `start`, `half` long to either side of its middle, in seconds.
    fn new(start: f64, half: f64, late: &mut dyn FnMut(f64, f64) -> f64) -> Self {
        let mut slid = |seconds: f64, lateness: f64| late(seconds + lateness, lateness);
        let mut change = |seconds: f64| {
            let (later, earlier) = (slid(seconds, PARTIAL_LATENESS), slid(seconds, -PARTIAL_LATENESS));
            (later - earlier) / (2.0 * PARTIAL_LATENESS)
        };
        let values =
            core::array::from_fn(|index| change(start + half * (1.0 + chebyshev::point(index, POINTS))));
        let nodes = [change(start), change(start + 2.0 * half)];
        let mut bend = |seconds: f64| {
            let (later, earlier) = (slid(seconds, PARTIAL_LATENESS), slid(seconds, -PARTIAL_LATENESS));
            (later + earlier - 2.0 * slid(seconds, 0.0)) / (PARTIAL_LATENESS * PARTIAL_LATENESS)
        };
        let (first, middle, last) = (bend(start), bend(start + half), bend(start + 2.0 * half));
        Self {
            change: chebyshev::interpolate(&values, &Cosines::<POINTS>::new()),
            nodes,
            bends: [first, last],
            bow: (first + last) / 2.0 - middle,
        }
    }
}

/// Units of a partial section.
struct PartialUnits {
    fraction: i32,
    coarser: i32,
    bend: i32,
}

impl PartialUnits {
    /// The finest that hold every segment.
    fn holding(segments: impl Iterator<Item = Sampled>) -> Self {
        let (mut node, mut term, mut bend) = (1e-12_f64, 1e-12_f64, 1e-15_f64);
        for Sampled { change, nodes, bends: [first, last], bow } in segments {
            node = nodes.iter().fold(node, |most, node| most.max(node.abs()));
            // A coefficient of order 2 to 5 is at most this multiple of what the series holds there.
            term = term.max(change.iter().skip(2).fold(0.0, |sum, term| sum + term.abs()) * 20.0);
            bend = bend.max(first.abs()).max(last.abs()).max(bow.abs());
        }
        let exponent = |size: f64| libm::ilogb(size) + 1;
        let fraction = (30 - exponent(node)).min(59);
        let coarser = (fraction + exponent(term) - 15).max(0);
        Self { fraction, coarser, bend: (14 - exponent(bend)).min(59) }
    }

    fn record(&self, sampled: &Sampled) -> Option<[PartialRecord; 2]> {
        let orders = [(libm::ldexp(1.0, self.coarser - self.fraction), 32_767.0); PARTIAL_DEGREE + 1];
        let storage = Storage { node_unit: libm::ldexp(1.0, -self.fraction), orders: &orders };
        let nodes = sampled.nodes.map(|node| libm::round(node / storage.node_unit));
        let (coefficients, _) = round(&sampled.change, &storage, nodes)?;
        let [_, _, c2, c3, c4, c5, ..] = coefficients;
        let [first, last] = nodes;
        let bend = |value: f64| libm::round(libm::ldexp(value, self.bend)) as i16;
        let [start, end] = sampled.bends.map(bend);
        Some([
            PartialRecord {
                node: first as i32,
                coefficients: [c2, c3, c4, c5].map(|value| value as i16),
                bend: [start, bend(sampled.bow)],
            },
            PartialRecord { node: last as i32, coefficients: [0; 4], bend: [end, 0] },
        ])
    }
}

/// Writes the lateness partial; returns its length in words.
fn write_partial(
    partial: &mut [u32],
    directory: &[u32],
    count: usize,
    units: &Units,
    late: &mut dyn FnMut(f64, f64) -> f64,
) -> Result<usize, BakeError> {
    let mut sampled = |segment: usize| {
        let entry = directory_entry(directory, segment as u32) >> 16;
        let half = units.cell_seconds() * libm::ldexp(1.0, (entry & 0xF) as i32) / 2.0;
        Sampled::new(units.cell_seconds() * f64::from(entry >> (16 - CELL_BITS)), half, late)
    };
    let partial_units = PartialUnits::holding((0..count).map(&mut sampled));
    let (head, records) = partial.split_first_mut().ok_or(BakeError::BufferTooSmall)?;
    let PartialUnits { fraction, coarser, bend } = partial_units;
    *head = fraction as u32 | (coarser as u32) << 8 | (bend as u32) << 16;
    for segment in 0..count {
        let both = partial_units.record(&sampled(segment)).ok_or(BakeError::DelayNotUsable)?;
        let words = records.get_mut(segment * PARTIAL_RECORD_WORDS..).ok_or(BakeError::BufferTooSmall)?;
        // The next segment writes over the end with its own start.
        for (place, record) in words.chunks_exact_mut(PARTIAL_RECORD_WORDS).zip(&both) {
            place.copy_from_slice(&record.to_words());
        }
    }
    let length = 1 + (count + 1) * PARTIAL_RECORD_WORDS;
    (partial.len() >= length).then_some(length).ok_or(BakeError::BufferTooSmall)
}
