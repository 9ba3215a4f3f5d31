//! Repeatable inputs.

/// A repeatable stream of 64-bit words (SplitMix64, Steele, Lea and Flood 2014; constants from memory).
pub fn words(mut state: u64) -> impl Iterator<Item = u64> {
    std::iter::repeat_with(move || {
        state = state.wrapping_add(0x9E37_79B9_7F4A_7C15);
        let z = (state ^ (state >> 30)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
        let z = (z ^ (z >> 27)).wrapping_mul(0x94D0_49BB_1331_11EB);
        z ^ (z >> 31)
    })
}
