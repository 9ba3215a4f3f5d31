//! The RF plan: what lies between the antenna and the oscillator.
#![allow(
    clippy::arithmetic_side_effects,
    reason = "set-up: 64 bits times 61 in 128, and a sum of two such products"
)]

use super::TuningError;
use crate::frequency::Frequency;
use crate::rapidity::Rapidity;
use crate::rapidity::wide_product::high_u64;

/// One frequency conversion between the antenna and the oscillator.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Conversion {
    /// Nominal frequency of the local oscillator.
    pub frequency: Frequency,
    /// ln(true / nominal frequency) of the crystal that makes it.
    pub crystal: Rapidity,
}

/// On which side of the carrier the last local oscillator lies.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Default)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub enum Injection {
    /// Below the carrier: the intermediate frequency rises with the carrier.
    #[default]
    LowSide,
    /// Above the carrier: the intermediate frequency falls as the carrier rises.
    HighSide,
}

/// A translation by hertz in a transponder that is not coherent: added to the frequency, not to the logarithms.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Translation {
    /// Nominal size.
    pub frequency: Frequency,
    /// Whether it lowers the carrier.
    pub downwards: bool,
    /// ln(true / nominal frequency) of the spacecraft's oscillator that makes it.
    pub crystal: Rapidity,
}

/// Carrier, conversions, oscillator clock and crystals of a channel.
///
/// Receive: `cycles per clock = s (f0 exp(L - Kc) - sum LO_i exp(K_i - Kc)) / fclk`; transmit the same with
/// `exp(-L - Kc)`, so that the far end hears f0. Crystal offsets K are ln(true / nominal frequency), positive
/// = fast; each offset, and its difference to Kc, below 2^-10 (976 ppm).
///
/// # Accuracy
/// The step at no shift is within half of 2^-64 cycle per clock where all offsets are zero, and within 2^-60 of
/// all frequencies of the plan together (1 nHz at 1 GHz) where they are not (`tests/channel.rs`).
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct RfPlan<'a> {
    /// Carrier f0 at the far end, in its own time.
    pub carrier: Frequency,
    /// Added to the carrier by a transponder that is not coherent.
    pub translation: Option<Translation>,
    /// Conversions, in any order.
    pub conversions: &'a [Conversion],
    /// Sign s of the last conversion.
    pub injection: Injection,
    /// Nominal oscillator clock fclk.
    pub clock: Frequency,
    /// Offset Kc of the crystal that makes the clock.
    pub clock_crystal: Rapidity,
}

/// The plan in 2^-80 Hz, exact but for the crystals' exponentials (2^-60).
pub(super) struct Folded {
    /// s (f0 - sum LO_i exp(K_i)), over exp(Kc).
    pub(super) nominal: i128,
    /// f0 over exp(Kc).
    pub(super) carrier: i128,
    /// f0 in true hertz.
    pub(super) true_carrier: i128,
}

impl RfPlan<'_> {
    /// A carrier straight into an oscillator at `clock`, all crystals exact.
    pub const fn direct(carrier: Frequency, clock: Frequency) -> Self {
        Self {
            carrier,
            translation: None,
            conversions: &[],
            injection: Injection::LowSide,
            clock,
            clock_crystal: Rapidity::ZERO,
        }
    }

    pub(super) fn fold(&self) -> Result<Folded, TuningError> {
        if self.clock.to_bits() == 0 {
            return Err(TuningError::ClockZero);
        }
        let clock = self.clock_crystal.to_bits();
        let carrier_over = |crystal: i64| -> Result<i128, TuningError> {
            let mut sum = scaled(self.carrier, crystal.saturating_neg())?;
            if let Some(shift) = self.translation {
                let size = scaled(shift.frequency, shift.crystal.to_bits().saturating_sub(crystal))?;
                sum += if shift.downwards { -size } else { size };
            }
            Ok(sum)
        };
        let carrier = carrier_over(clock)?;
        // 2^120 is 2^40 Hz.
        if carrier <= 0 || carrier >= 1 << 120 {
            return Err(TuningError::CarrierNotUsable);
        }
        let mut nominal = carrier;
        for conversion in self.conversions {
            nominal = nominal
                .checked_sub(scaled(
                    conversion.frequency,
                    conversion.crystal.to_bits().saturating_sub(clock),
                )?)
                .ok_or(TuningError::CarrierNotUsable)?;
        }
        if self.injection == Injection::HighSide {
            nominal = nominal.checked_neg().ok_or(TuningError::CarrierNotUsable)?;
        }
        Ok(Folded { nominal, carrier, true_carrier: carrier_over(0)? })
    }
}

/// Frequency times exp(`crystal`), in the format's 2^-24 Hz.
pub(super) fn scaled_frequency(frequency: Frequency, crystal: Rapidity) -> Result<u64, TuningError> {
    u64::try_from(scaled(frequency, crystal.to_bits())? >> 56).map_err(|_| TuningError::CarrierNotUsable)
}

/// Frequency times exp(`crystal`), in 2^-80 Hz.
#[inline(never)]
pub(super) fn scaled(frequency: Frequency, crystal: i64) -> Result<i128, TuningError> {
    let offset = small_offset(crystal)?;
    let whole = frequency.to_bits();
    let more = i128::from(high(offset, whole)) << 64 | i128::from(whole.wrapping_mul(offset as u64));
    Ok((i128::from(whole) << 56) + (more >> 4))
}

/// expm1 of a crystal offset, I4F60, by six terms: below 2^-10 the seventh is under 2^-82.
#[allow(clippy::cast_possible_truncation, reason = "as small as the offset itself: below 2^51")]
fn small_offset(crystal: i64) -> Result<i64, TuningError> {
    const ONE: i64 = 1 << 60;
    if crystal.unsigned_abs() >= 1 << 50 {
        return Err(TuningError::CrystalTooFar);
    }
    let times = |a: i64, b: i64| high(a << 2, (b << 2) as u64);
    // x/1 (1 + x/2 (1 + ...)).
    let inverses = [ONE / 6, ONE / 5, ONE / 4, ONE / 3, ONE / 2];
    let sum = inverses.iter().fold(0, |sum, &inverse| times(times(crystal, ONE.wrapping_add(sum)), inverse));
    Ok(times(crystal, ONE.wrapping_add(sum)))
}

/// floor(a b / 2^64) of a signed and an unsigned word: the unsigned product less b where the sign is set.
fn high(a: i64, b: u64) -> i64 {
    high_u64(a as u64, b).wrapping_sub(b & (a >> 63) as u64) as i64
}
