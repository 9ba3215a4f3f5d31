//! High halves of products: the one place where a target has code of its own.
//!
//! All of these are exact floors, so the bits are the same on every target. A core without a long
//! multiplication (Armv6-M, told here by its lack of atomics) forms the high word from 16-bit halves in
//! about 20 instructions, where the compiler would call a routine of about 50.
#![allow(clippy::arithmetic_side_effects, reason = "places are masked to 31 before")]
#![allow(clippy::cast_possible_truncation, reason = "words and half words are cut out on purpose")]

/// Whether the target multiplies 32 by 32 bits to 32 only.
pub(crate) const SHORT_PRODUCTS: bool = cfg!(all(target_arch = "arm", not(target_has_atomic = "32")));

/// floor(a b / 2^32) of two unsigned words.
#[inline(always)]
pub(crate) const fn high_u32(a: u32, b: u32) -> u32 {
    if SHORT_PRODUCTS { halves::high_u32(a, b) } else { ((a as u64).wrapping_mul(b as u64) >> 32) as u32 }
}

/// floor(a b / 2^32) of two signed words.
#[inline(always)]
pub(crate) const fn high_i32(a: i32, b: i32) -> i32 {
    if SHORT_PRODUCTS { halves::high_i32(a, b) } else { ((a as i64).wrapping_mul(b as i64) >> 32) as i32 }
}

/// floor(a b / 2^32) of an unsigned and a signed word.
#[inline(always)]
pub(crate) const fn high_u32_i32(a: u32, b: i32) -> i32 {
    if SHORT_PRODUCTS {
        // a = signed(a) + 2^32 [a has its top bit].
        halves::high_i32(a as i32, b).wrapping_add(b & (a as i32 >> 31))
    } else {
        ((a as i64).wrapping_mul(b as i64) >> 32) as i32
    }
}

/// floor(a^2 / 2^32) of a signed word.
#[inline(always)]
pub(crate) const fn high_square_i32(a: i32) -> i32 {
    if SHORT_PRODUCTS { halves::high_square_i32(a) } else { high_i32(a, a) }
}

/// Bits 8 to 39 of the product of a word and a half word.
#[inline(always)]
pub(crate) const fn middle_u32_u16(a: u32, b: u16) -> u32 {
    if SHORT_PRODUCTS {
        halves::middle_u32_u16(a, b)
    } else {
        ((a as u64).wrapping_mul(b as u64) >> 8) as u32
    }
}

/// a b of two unsigned words.
#[inline(always)]
pub(crate) const fn product_u32(a: u32, b: u32) -> u64 {
    if SHORT_PRODUCTS {
        (high_u32(a, b) as u64) << 32 | a.wrapping_mul(b) as u64
    } else {
        (a as u64).wrapping_mul(b as u64)
    }
}

/// a b of two signed words.
#[inline(always)]
pub(crate) const fn product_i32(a: i32, b: i32) -> i64 {
    if SHORT_PRODUCTS {
        (high_i32(a, b) as i64) << 32 | a.wrapping_mul(b) as u32 as i64
    } else {
        (a as i64).wrapping_mul(b as i64)
    }
}

/// a b of an unsigned and a signed word.
#[inline(always)]
pub(crate) const fn product_u32_i32(a: u32, b: i32) -> i64 {
    if SHORT_PRODUCTS {
        (high_u32_i32(a, b) as i64) << 32 | a.wrapping_mul(b as u32) as i64
    } else {
        (a as i64).wrapping_mul(b as i64)
    }
}

/// floor(a b / 2^32) of a signed double word and an unsigned word.
#[inline(always)]
pub(crate) const fn high_i64_u32(a: i64, b: u32) -> i64 {
    product_u32_i32(b, (a >> 32) as i32).wrapping_add(high_u32(a as u32, b) as i64)
}

/// floor(a / 2^places), `places` from 0 to 31, without the compiler's routine for any number of places.
#[inline(always)]
pub(crate) const fn shifted_right(a: i64, places: u32) -> i64 {
    let places = places & 31;
    let carried = ((a >> 32) as u32) << 1 << (31 - places);
    (((a >> 32) as i32 >> places) as i64) << 32 | (a as u32 >> places | carried) as i64
}

/// a 2^places modulo 2^64, `places` from 0 to 31.
#[inline(always)]
pub(crate) const fn shifted_left(a: u64, places: u32) -> u64 {
    let places = places & 31;
    let carried = (a as u32 >> 1) >> (31 - places);
    ((((a >> 32) as u32) << places | carried) as u64) << 32 | ((a as u32) << places) as u64
}

/// floor(a b / 2^32) of a signed double word and a signed word.
pub(crate) const fn high_i64_i32(a: i64, b: i32) -> i64 {
    product_i32((a >> 32) as i32, b).wrapping_add(high_u32_i32(a as u32, b) as i64)
}

/// floor(a b / 2^64) of two unsigned double words.
pub(crate) const fn high_u64(a: u64, b: u64) -> u64 {
    let (a_high, a_low) = ((a >> 32) as u32, a as u32);
    let (b_high, b_low) = ((b >> 32) as u32, b as u32);
    let cross = product_u32(a_high, b_low).wrapping_add(high_u32(a_low, b_low) as u64);
    // cross <= (2^32 - 1)^2 + 2^32 - 2 and the next sum adds 32 bits to at most (2^32 - 1)^2: no carry is lost.
    let middle = product_u32(a_low, b_high).wrapping_add(cross as u32 as u64);
    product_u32(a_high, b_high).wrapping_add(cross >> 32).wrapping_add(middle >> 32)
}

/// a b / 2^64 of two signed double words, at most 3 too small: the product of the low words and the low
/// halves of the mixed products are left out.
#[inline(always)]
pub(crate) const fn about_high_i64(a: i64, b: i64) -> i64 {
    let (a_high, b_high) = ((a >> 32) as i32, (b >> 32) as i32);
    product_i32(a_high, b_high)
        .wrapping_add(high_u32_i32(b as u32, a_high) as i64)
        .wrapping_add(high_u32_i32(a as u32, b_high) as i64)
}

/// The same from products of 16-bit halves.
mod halves {
    /// floor(a b / 2^32) of two unsigned words.
    #[inline(always)]
    pub(super) const fn high_u32(a: u32, b: u32) -> u32 {
        let (a_high, a_low) = (a >> 16, a & 0xffff);
        let (b_high, b_low) = (b >> 16, b & 0xffff);
        // At most (2^16 - 1)^2 + 2^16 - 1 in each of the two sums: no carry is lost.
        let cross = a_high.wrapping_mul(b_low).wrapping_add(a_low.wrapping_mul(b_low) >> 16);
        let middle = a_low.wrapping_mul(b_high).wrapping_add(cross & 0xffff);
        a_high.wrapping_mul(b_high).wrapping_add(cross >> 16).wrapping_add(middle >> 16)
    }

    /// floor(a b / 2^32) of two signed words.
    #[inline(always)]
    pub(super) const fn high_i32(a: i32, b: i32) -> i32 {
        let (a_high, a_low) = (a >> 16, a & 0xffff);
        let (b_high, b_low) = (b >> 16, b & 0xffff);
        // The low product fills an unsigned word; the two sums stay within a signed one, as above.
        let low = (a_low.wrapping_mul(b_low) as u32 >> 16) as i32;
        let cross = a_high.wrapping_mul(b_low).wrapping_add(low);
        let middle = a_low.wrapping_mul(b_high).wrapping_add(cross & 0xffff);
        a_high.wrapping_mul(b_high).wrapping_add(cross >> 16).wrapping_add(middle >> 16)
    }

    /// floor(a^2 / 2^32) of a signed word.
    #[inline(always)]
    pub(super) const fn high_square_i32(a: i32) -> i32 {
        let (high, low) = (a >> 16, a & 0xffff);
        // The sum is at most 32767 2^16 and at least -2^31.
        let cross = high.wrapping_mul(low).wrapping_add((low.wrapping_mul(low) as u32 >> 17) as i32);
        high.wrapping_mul(high).wrapping_add(cross >> 15)
    }

    /// Bits 8 to 39 of the product of a word and a half word.
    #[inline(always)]
    pub(super) const fn middle_u32_u16(a: u32, b: u16) -> u32 {
        let high = (a >> 16).wrapping_mul(b as u32) << 8;
        high.wrapping_add((a & 0xffff).wrapping_mul(b as u32) >> 8)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Every pair of words with extreme halves, and a walk through the rest.
    fn pairs() -> impl Iterator<Item = (u32, u32)> {
        let halves = [0_u32, 1, 2, 0x7fff, 0x8000, 0x8001, 0xfffe, 0xffff];
        let words = move || halves.into_iter().flat_map(move |high| halves.map(|low| high << 16 | low));
        let extreme = words().flat_map(move |a| words().map(move |b| (a, b)));
        let walk =
            (0..100_000_u32).map(|step| (step.wrapping_mul(0x9e37_79b9), step.wrapping_mul(0x85eb_ca6b)));
        extreme.chain(walk)
    }

    #[test]
    fn halves_give_the_same_words_as_long_products() {
        for (a, b) in pairs() {
            let unsigned = ((u64::from(a) * u64::from(b)) >> 32) as u32;
            let signed = ((i64::from(a as i32) * i64::from(b as i32)) >> 32) as i32;
            assert_eq!(halves::high_u32(a, b), unsigned);
            assert_eq!(halves::high_i32(a as i32, b as i32), signed);
            let mixed = halves::high_i32(a as i32, b as i32).wrapping_add(b as i32 & (a as i32 >> 31));
            assert_eq!(mixed, high_u32_i32(a, b as i32));
            assert_eq!(halves::high_square_i32(a as i32), high_i32(a as i32, a as i32));
            assert_eq!(
                halves::middle_u32_u16(a, b as u16),
                ((u64::from(a) * u64::from(b as u16)) >> 8) as u32
            );
        }
    }

    #[test]
    fn long_products_are_exact() {
        for ((a, b), (c, d)) in pairs().zip(pairs().skip(777)) {
            let (x, y) = (u64::from(a) << 32 | u64::from(c), u64::from(d) << 32 | u64::from(b));
            assert_eq!(high_u64(x, y), ((u128::from(x) * u128::from(y)) >> 64) as u64);
            let floor = ((i128::from(x as i64) * i128::from(y as i64)) >> 64) as i64;
            assert!((0..=3).contains(&(floor - about_high_i64(x as i64, y as i64))));
            let word = i128::from(a as i32);
            assert_eq!(high_i64_i32(x as i64, a as i32), ((i128::from(x as i64) * word) >> 32) as i64);
            assert_eq!(product_u32(a, b), u64::from(a) * u64::from(b));
            assert_eq!(product_u32_i32(a, b as i32), i64::from(a) * i64::from(b as i32));
            assert_eq!(product_i32(a as i32, b as i32), i64::from(a as i32) * i64::from(b as i32));
        }
    }
}
