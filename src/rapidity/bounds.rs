//! The worst error of each routine of this module: the one table that docs, tests and the README quote.
//!
//! Units are those in the last place of the result, or of its mantissa. Up to 32 bits of input the bound is over
//! all inputs; in 64 bits it is argued beside the code (at most 1 unit) and measured on random and hard inputs.
//! A test fails when the measured worst exceeds a bound, when a bound is looser than 1.25 times it, and when a
//! public routine is missing here.

/// A routine and its worst error.
#[derive(Clone, Copy, Debug)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Bound {
    /// Path of the routine below `rapidity`.
    pub routine: &'static str,
    /// What the error is counted in.
    pub unit: &'static str,
    /// The largest error.
    pub worst: f64,
}

macro_rules! bounds {
    ($($constant:ident, $routine:literal, $unit:literal, $worst:literal;)*) => {
        $(
            #[doc = concat!("Worst error of `", $routine, "`, in units of ", $unit, ".")]
            pub const $constant: f64 = $worst;
        )*

        /// All bounds, in the order of the modules.
        pub const TABLE: &[Bound] = &[
            $(Bound { routine: $routine, unit: $unit, worst: $constant },)*
        ];
    };
}

bounds! {
    RANGE_RATE, "Rapidity::from_range_rate", "2^-60", 0.52;
    RANGE_RATE_MM_PER_S, "Rapidity::from_range_rate_mm_per_s", "2^-60", 0.52;
    RANGE_RATE_WIDE, "Rapidity::from_range_rate_wide", "2^-60", 0.75;
    RANGE_RATE_F32, "Rapidity::from_range_rate_f32", "2^-60", 0.75;
    BETA, "Rapidity::from_beta", "2^-60", 0.7;
    BETA_SHORT, "Rapidity::from_beta_32", "2^-60", 0.7;
    TRANSVERSE_SPEED, "Rapidity::from_transverse_speed", "2^-60", 0.77;
    RATIO, "Rapidity::from_ratio", "2^-60", 0.85;
    FREQUENCIES, "Rapidity::from_frequencies", "2^-60", 0.85;
    PARTS_PER_BILLION, "Rapidity::from_parts_per_billion", "2^-60", 0.82;
    POTENTIAL, "Rapidity::from_potential", "2^-60", 0.51;
    FACTOR_OF_BETA, "ShiftFactor::from_beta", "the mantissa", 0.75;
    TO_FACTOR, "Rapidity::to_factor", "the mantissa", 0.52;
    TO_OFFSET, "Rapidity::to_offset", "the mantissa", 0.85;
    TO_BETA, "Rapidity::to_beta", "2^-63", 0.6;
    TO_BETA_SHORT, "Rapidity::to_beta_32", "2^-31", 0.51;
    COMPOSE_BETA, "compose_beta_32", "2^-31", 0.51;
    NARROW_RAPIDITY_OF_BETA, "narrow::rapidity_of_beta", "2^-44", 0.501;
    NARROW_BETA_OF_RAPIDITY, "narrow::beta_of_rapidity", "2^-44", 0.501;
    NARROW_OFFSET_OF_RAPIDITY, "narrow::offset_of_rapidity", "2^-44", 0.502;
    NARROW_RAPIDITY_OF_OFFSET, "narrow::rapidity_of_offset", "2^-44", 0.502;
    NARROW_RAPIDITY_OF_SLOPE, "narrow::rapidity_of_slope", "2^-44", 0.502;
    NARROW_SLOPE_OF_RAPIDITY, "narrow::slope_of_rapidity", "2^-44", 0.502;
    FIRST_ORDER_RANGE_RATE, "narrow::first_order_range_rate", "2^-16 m/s", 1.2;
    FIRST_ORDER_RANGE_RATE_BELOW_8_KM_S, "narrow::first_order_range_rate below 8 km/s", "2^-16 m/s", 0.65;
    RAPIDITY_OF_BETA_32, "fixed_32::rapidity_of_beta", "2^-28", 0.502;
    BETA_OF_RAPIDITY_32, "fixed_32::beta_of_rapidity", "2^-31", 0.52;
    FACTOR_OF_RAPIDITY_32, "fixed_32::factor_of_rapidity", "the mantissa", 0.52;
    FACTOR_OF_BETA_32, "fixed_32::factor_of_beta", "the mantissa", 0.52;
    OFFSET_OF_RAPIDITY_32, "fixed_32::offset_of_rapidity", "the mantissa", 0.52;
    RAPIDITY_OF_BETA_F32, "float_32::rapidity_of_beta", "the float", 0.5;
    BETA_OF_RAPIDITY_F32, "float_32::beta_of_rapidity", "the float", 0.5;
    FACTOR_OF_RAPIDITY_F32, "float_32::factor_of_rapidity", "the float", 0.5;
    FACTOR_OF_BETA_F32, "float_32::factor_of_beta", "the float", 0.5;
    OFFSET_OF_RAPIDITY_F32, "float_32::offset_of_rapidity", "the float", 0.5;
}
