//! Fixed-point evaluation of a table: the same instructions at every instant, no division, no branch on data.
//!
//! The local argument u runs from -1/2 to 1/2 over a segment. Its top 16 bits u0 go through three nested
//! multiplications at once (value, slope, half the curvature); the rest d of the argument, below 2^-16, enters
//! by Taylor: P(u0 + d) = P + d (P' + d P''/2), the next term being below 2^-63 s. A product with 16 bits is
//! cheap on a core that has only a 32-bit multiplier.
//!
//! Units: orders 9 to 5 of the value in 2^-(Q+4) s in 32 bits (the fields' widths rule out overflow), orders
//! 4 to 0 in 2^-(Q+14) s in 64 bits, slope and curvature in 2^-(Q-2) s in 32 bits.

use super::{CELL_BITS, HEADER_WORDS, RECORD_WORDS};
use crate::rapidity::{Delay, Motion, Rapidity, RapidityRate, narrow};

/// Bound on what truncation adds to one evaluation, in 2^-(Q+16) s, beside [`LAST_SHIFT`].
///
/// Every truncation makes its term smaller by less than one unit, and enters the result times u^k, |u| <= 1/2:
///
/// | where | unit, in 2^-(Q+16) s | orders k | error for u > 0 | for u < 0 |
/// |---|---|---|---|---|
/// | 32-bit products | 2^12 | 8 to 5 | -240 to 0 | -80 to 160 |
/// | 64-bit products | 4 | 4 to 0 | -8 to 0 | -6 to 3 |
/// | slope (2 units an order, 3 in the bend) times d | 4 | | -28 to 2 | -22 to 8 |
/// | product with d, Taylor's next term | 4, 2 | | -6 to 2 | -6 to 2 |
///
/// So one evaluation is off by -282 to 173 units, and two of them differ by at most the sum.
pub(in crate::pass) const NOISE: u32 = 282;
/// Bound on the difference of two evaluations' errors, in the same unit; see [`NOISE`].
pub(super) const DIFFERENCE_NOISE: u32 = 455;
/// What the last shift, to the delay's 2^-56 s, may cut off, in 2^-60 s.
pub(in crate::pass) const LAST_SHIFT: u32 = 16;
/// Least Q of the format.
const LEAST_FRACTION: u32 = 24;

/// What the header says about units, unpacked once.
#[derive(Clone, Copy, Debug)]
pub(super) struct Layout {
    /// Q.
    fraction: u8,
    /// Shift that puts the cell number into the top 12 bits.
    align: u8,
    /// Directory entries, a power of two.
    entries: u16,
    /// -1 when time is read at the transmitting end, else 0: the sign of the slope in the logarithm.
    negate: i32,
    /// log2 of a cell in seconds.
    cell: i8,
}

/// Where an instant lies: segment, its log2 length in cells, top 16 bits of the argument and the rest.
#[derive(Clone, Copy)]
pub(super) struct Place {
    pub(super) segment: usize,
    pub(super) length: u32,
    pub(super) coarse: i32,
    pub(super) rest: u32,
}

impl Layout {
    /// `None` when a field is outside the format.
    pub(super) fn new(header: &[u32; HEADER_WORDS]) -> Option<Self> {
        let fraction = header[13] & 0xFF;
        let cell = header[13] >> 8 & 0xFF;
        let segments = header[13] >> 16;
        let sane = (LEAST_FRACTION..=46).contains(&fraction)
            && (20..=48).contains(&cell)
            && (1..=1024).contains(&segments);
        // Down tagged at the ground, up tagged at the spacecraft and two-way read the receiver's time.
        let at_transmitter = matches!(header[0] & 7, 1 | 4);
        sane.then(|| Self {
            fraction: fraction as u8,
            align: (64 - CELL_BITS - cell) as u8,
            entries: segments.next_power_of_two().max(2) as u16,
            negate: -i32::from(at_transmitter),
            cell: cell as i8 - 30,
        })
    }

    pub(super) fn directory_words(&self) -> usize {
        usize::from(self.entries / 2)
    }

    pub(super) fn fraction(&self) -> u32 {
        u32::from(self.fraction)
    }

    /// Bound on the difference of two evaluations' errors in 2^-60 s.
    pub(super) fn difference_noise(&self) -> u32 {
        let finest = DIFFERENCE_NOISE << (60 - 16 - LEAST_FRACTION);
        (finest >> self.fraction().saturating_sub(LEAST_FRACTION)) + LAST_SHIFT
    }

    /// Bound on what the evaluation adds to a rapidity in 2^-60: 7 units of the slope a segment (see [`NOISE`]),
    /// `shortest` being the log2 of the shortest segment in cells, and the kernel's rounding to 2^-44.
    pub(super) fn rapidity_noise(&self, shortest: u32) -> u32 {
        let seconds = i32::from(self.cell) + shortest as i32;
        let slope = shifted(7, 60 + 2 - i32::from(self.fraction) - seconds).min(i64::from(u32::MAX >> 1));
        slope as u32 + (3 << 15)
    }

    /// Finds the segment of a time since the epoch, in 2^-30 s, by a search of fixed depth.
    #[inline]
    pub(super) fn locate(&self, directory: &[u32], elapsed: i64, fraction: u32) -> Place {
        let aligned = (elapsed as u64) << self.align | (u64::from(fraction) << self.align) >> 32;
        let key = ((aligned >> 48) as u32) | 0xF;
        let entry = |index: u32| {
            let word = directory.get((index / 2) as usize).copied().unwrap_or(u32::MAX);
            word >> (16 * (index % 2)) & 0xFFFF
        };
        let mut segment = 0;
        let mut step = u32::from(self.entries / 2);
        while step != 0 {
            // All ones when the entry is beyond the key.
            let beyond = (key.wrapping_sub(entry(segment + step)) as i32 >> 31) as u32;
            segment += step & !beyond;
            step /= 2;
        }
        let found = entry(segment);
        let length = found & 0xF;
        // A segment is never longer than a table; a damaged directory's longer ones wrap here.
        let local = aligned
            .wrapping_sub(u64::from(found >> 4) << (64 - CELL_BITS))
            .wrapping_shl(CELL_BITS.wrapping_sub(length));
        let argument = local ^ (1 << 63);
        Place {
            segment: segment as usize,
            length,
            coarse: (argument >> 32) as i32 >> 16,
            rest: (argument >> 16) as u32,
        }
    }

    /// Value, slope and curvature of a record at a place.
    #[inline]
    pub(super) fn motion(&self, record: &[u32; RECORD_WORDS + 1], place: &Place, base: i64) -> Motion {
        let [start, second, third, fourth, fifth, sixth, end] = *record;
        let u = place.coarse;
        let (c9, c8, c7) = ((fourth << 22) as i32, (fifth << 20) as i32, (sixth << 17) as i32);
        let (c6, c5, c4) = ((sixth as i32) >> 15, (fifth as i32) >> 12, (fourth as i32) >> 10);
        let (c3, c2) = (third as i32, second as i32);

        // Orders 9 to 5: value a, slope b, half curvature c.
        let mut a = c9 >> 3;
        let mut b = a >> 6;
        a = times(a, u).wrapping_add(c8 >> 3);
        let mut c = b;
        b = times(b, u).wrapping_add(a >> 6);
        for coefficient in [c7 >> 1, c6 << 14, c5 << 11] {
            a = times(a, u).wrapping_add(coefficient);
            c = times(c, u).wrapping_add(b);
            b = times(b, u).wrapping_add(a >> 6);
        }
        // Orders 4 to 2 in 64 bits.
        let mut long = i64::from(a) << 10;
        for coefficient in [i64::from(c4) << 20, i64::from(c3) << 17, i64::from(c2) << 16] {
            long = times_long(long, u).wrapping_add(coefficient);
            c = times(c, u).wrapping_add(b);
            b = times(b, u).wrapping_add((long >> 16) as i32);
        }
        // Orders 1 and 0 from the nodes.
        let odd = c3.wrapping_add((c5.wrapping_add((c7 >> 17) << 3).wrapping_add((c9 >> 22) << 4)) << 2);
        let even = c2.wrapping_add((c4.wrapping_add(c6 << 2).wrapping_add((c8 >> 20) << 3)) << 2);
        let first = i64::from(end).wrapping_sub(i64::from(start)).wrapping_sub(i64::from(odd));
        let zeroth = i64::from(end).wrapping_add(i64::from(start)).wrapping_sub(i64::from(even));
        long = times_long(long, u).wrapping_add(first << 15);
        c = times(c, u).wrapping_add(b);
        b = times(b, u).wrapping_add((long >> 16) as i32);
        long = times_long(long, u).wrapping_add(zeroth << 14);

        // The rest of the argument.
        let bend = (c >> 16).wrapping_mul((place.rest >> 16) as i32) >> 16;
        long = long.wrapping_add(high_part(b.wrapping_add(bend), place.rest));
        let slope = b.wrapping_add(bend).wrapping_add(bend);
        self.scale(long, slope, c, place.length, base)
    }

    /// Half of a segment's length in seconds.
    pub(super) fn half_length(&self, length: u32) -> f64 {
        libm::ldexp(0.5, i32::from(self.cell) + length as i32)
    }

    /// A unit of the slope's evaluation at the shortest segment, or of its 44-bit result.
    pub(super) fn slope_resolution(&self, directory: &[u32]) -> f64 {
        let shortest = directory
            .iter()
            .flat_map(|word| [word & 0xFFFF, word >> 16])
            .filter(|&entry| entry != 0xFFFF)
            .fold(0xF, |least, entry| least.min(entry & 0xF));
        let unit = libm::ldexp(1.0, 2 - i32::from(self.fraction));
        (unit / (2.0 * self.half_length(shortest))).max(libm::ldexp(1.0, -44))
    }

    /// A slope per segment, per second.
    pub(super) fn per_second(&self, slope: i64, length: u32) -> i64 {
        shifted(slope, -(i32::from(self.cell) + length as i32))
    }

    /// From the segment's units to seconds and pure numbers.
    #[inline]
    fn scale(&self, value: i64, slope: i32, bend: i32, length: u32, base: i64) -> Motion {
        let fraction = i32::from(self.fraction);
        let seconds = i32::from(self.cell) + length as i32;
        let delay = shifted(value, Delay::FRACTION_BITS as i32 - 14 - fraction).wrapping_add(base);
        // Slope in 2^-44.
        let narrow_slope = shifted(i64::from(slope) << 24, 44 - 24 + 2 - fraction - seconds) as i32;
        let signed = (narrow_slope ^ self.negate).wrapping_sub(self.negate);
        let rapidity = narrow::rapidity_of_slope(signed);
        let rapidity = (rapidity ^ self.negate).wrapping_sub(self.negate);
        let rate = shifted(i64::from(bend), 60 + 1 + 2 - fraction - 2 * seconds).wrapping_neg();
        Motion {
            delay: Delay::from_bits(delay),
            rapidity: Rapidity::from_bits(i64::from(rapidity) << 16),
            rate: RapidityRate::from_bits(rate),
        }
    }
}

/// `value` times a 16-bit fraction: floor(value u / 2^16).
#[inline(always)]
fn times(value: i32, u: i32) -> i32 {
    ((i64::from(value) * i64::from(u)) >> 16) as i32
}

/// The same for 64 bits; |value| < 2^48.
#[inline(always)]
pub(super) fn times_long(value: i64, u: i32) -> i64 {
    value.wrapping_mul(i64::from(u)) >> 16
}

/// floor(value rest / 2^32).
#[inline(always)]
fn high_part(value: i32, rest: u32) -> i64 {
    (i64::from(value) * i64::from(rest)) >> 32
}

/// Shifted left by `places`, or right when negative; within +-63.
#[inline(always)]
fn shifted(value: i64, places: i32) -> i64 {
    let left = places & !(places >> 31);
    let right = places.wrapping_neg() & (places >> 31);
    (value << left) >> right
}
