//! The worst error of each routine: the one table that docs, tests and the README quote.

/// [`super::fixed_32::rapidity_of_beta`], units of 2^-28.
pub const RAPIDITY_OF_BETA_32: f64 = 0.51;
/// [`super::fixed_32::beta_of_rapidity`], units of 2^-31.
pub const BETA_OF_RAPIDITY_32: f64 = 0.52;
/// [`super::fixed_32::factor_of_rapidity`], units of the mantissa.
pub const FACTOR_OF_RAPIDITY_32: f64 = 0.52;
/// [`super::fixed_32::factor_of_beta`], units of the mantissa.
pub const FACTOR_OF_BETA_32: f64 = 0.52;
/// [`super::fixed_32::offset_of_rapidity`], units of the mantissa.
pub const OFFSET_OF_RAPIDITY_32: f64 = 0.52;
