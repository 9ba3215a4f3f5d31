//! High halves of products: the one place where a target may need code of its own.
//!
//! All of these are exact floors, so the bits are the same on every target.

/// floor(a b / 2^32) of two signed words.
pub(crate) const fn high_i32(a: i32, b: i32) -> i32 {
    ((a as i64).wrapping_mul(b as i64) >> 32) as i32
}

/// floor(a b / 2^32) of a signed double word and a signed word.
pub(crate) const fn high_i64_i32(a: i64, b: i32) -> i64 {
    let low = (a as u32 as i64).wrapping_mul(b as i64) >> 32;
    (a >> 32).wrapping_mul(b as i64).wrapping_add(low)
}

/// floor(a b / 2^64) of two unsigned double words.
pub(crate) const fn high_u64(a: u64, b: u64) -> u64 {
    let (a_high, a_low) = (a >> 32, a as u32 as u64);
    let (b_high, b_low) = (b >> 32, b as u32 as u64);
    let cross = a_high.wrapping_mul(b_low).wrapping_add(a_low.wrapping_mul(b_low) >> 32);
    // cross <= (2^32 - 1)^2 + 2^32 - 2 and the next sum adds at most (2^32 - 1)^2 to 32 bits: no carry is lost.
    let middle = a_low.wrapping_mul(b_high).wrapping_add(cross as u32 as u64);
    a_high.wrapping_mul(b_high).wrapping_add(cross >> 32).wrapping_add(middle >> 32)
}

/// floor(a b / 2^64) of two signed double words.
pub(crate) const fn high_i64(a: i64, b: i64) -> i64 {
    // a = unsigned(a) - 2^64 [a < 0], the same for b.
    let unsigned = high_u64(a as u64, b as u64) as i64;
    unsigned.wrapping_sub((a >> 63) & b).wrapping_sub((b >> 63) & a)
}
