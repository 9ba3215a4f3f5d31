//! A linear transponder: one passband, two channels that must move together.

use super::TuningError;
use super::channel::narrowed;
use crate::frequency::{Frequency, divide_nearest};
use crate::rapidity::Rapidity;
use crate::rapidity::narrow::{offset_of_rapidity, rapidity_of_offset};

/// A transponder that holds the sum (inverting) or the difference (not inverting) of uplink and downlink
/// constant at the spacecraft.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct LinearTransponder {
    /// f_up + f_down (inverting) or f_down - f_up (not inverting) at the spacecraft; for a downlink below the
    /// uplink, f_up - f_down with `downlink_below`.
    pub constant: Frequency,
    /// Whether the passband is turned over.
    pub inverting: bool,
    /// Not inverting only: the constant is subtracted from the uplink.
    pub downlink_below: bool,
    /// ln(true / nominal) of the spacecraft's oscillator, which makes the constant.
    pub crystal: Rapidity,
}

/// What the user keeps still while the Doppler moves the rest.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub enum Still {
    /// The place in the passband: everybody else hears a steady signal.
    Spacecraft,
    /// The own receiver's dial: the transmitter moves for both links.
    OwnEar,
    /// The own transmitter's dial: the receiver moves for both links.
    OwnTransmitter,
}

/// Both carriers at a place in the passband, and what moves with what.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct TransponderPair {
    /// Uplink carrier at the spacecraft.
    pub up: Frequency,
    /// Downlink carrier at the spacecraft.
    pub down: Frequency,
    /// down / up and up / down in 2^-28, signed with the passband's sense.
    down_over_up: i64,
    up_over_down: i64,
    still: Still,
}

impl LinearTransponder {
    /// The pair for an uplink carrier at the spacecraft: the user's place in the passband.
    ///
    /// # Errors
    /// [`TuningError::TransponderNotUsable`] when the downlink is not a positive frequency of the format or the two
    /// are a factor 16 or more apart.
    #[allow(
        clippy::arithmetic_side_effects,
        clippy::cast_possible_truncation,
        reason = "set-up: sums of two numbers of 64 bits in 128; a ratio is at most 2^32"
    )]
    pub fn pair(&self, up: Frequency, still: Still) -> Result<TransponderPair, TuningError> {
        let constant = super::plan::scaled_frequency(self.constant, self.crystal)?;
        let (up_bits, constant) = (i128::from(up.to_bits()), i128::from(constant));
        let down = match (self.inverting, self.downlink_below) {
            (true, _) => constant - up_bits,
            (false, false) => up_bits + constant,
            (false, true) => up_bits - constant,
        };
        let down = u64::try_from(down).map_err(|_| TuningError::TransponderNotUsable)?;
        let ratio = |above: u64, below: u64| -> Result<i64, TuningError> {
            if below == 0 || above >> 4 >= below {
                return Err(TuningError::TransponderNotUsable);
            }
            // At most 2^32.
            let (whole, fraction) = divide_nearest(u128::from(above) << RATIO_BITS, below);
            let ratio = whole as i64 + (fraction >> 63) as i64;
            Ok(if self.inverting { -ratio } else { ratio })
        };
        Ok(TransponderPair {
            up,
            down: Frequency::from_bits(down),
            down_over_up: ratio(down, up.to_bits())?,
            up_over_down: ratio(up.to_bits(), down)?,
            still,
        })
    }
}

impl TransponderPair {
    /// Rapidities to hand to the transmitting channel (carrier [`Self::up`]) and the receiving one (carrier
    /// [`Self::down`]), from those of the two links (positive = approaching).
    ///
    /// # Accuracy
    /// Where a dial stands still, 1.01 x 2^-44 of both carriers together (0.05 mHz for two of 437 MHz) and 2^-29 of
    /// the shift (`tests/transponder.rs`); exact for [`Still::Spacecraft`].
    ///
    /// # Errors
    /// [`TuningError::TooFast`] when a link's rapidity is beyond 2^-13, or when its shift in hertz is more than
    /// 2^-13 of the carrier that shall move with it.
    ///
    /// # Source
    /// With the receiver still, the downlink at the spacecraft is f_down exp(-L_down); the uplink there follows
    /// by the transponder's rule, off by (f_down/f_up) expm1(-L_down) in proportion; the logarithm of that adds
    /// to the uplink's own.
    pub fn rapidities(&self, up: Rapidity, down: Rapidity) -> Result<(Rapidity, Rapidity), TuningError> {
        match self.still {
            Still::Spacecraft => Ok((up, down)),
            Still::OwnEar => {
                let moved = moved(down, self.down_over_up)?;
                Ok((up.saturating_sub(moved), Rapidity::ZERO))
            }
            Still::OwnTransmitter => {
                // The uplink at the spacecraft is f_up exp(+L_up).
                let moved = moved(up.saturating_neg(), self.up_over_down)?;
                Ok((Rapidity::ZERO, down.saturating_add(moved)))
            }
        }
    }
}

/// Fraction bits of the carriers' ratio, which is below 16: its product with an offset fits 64 bits.
const RATIO_BITS: u32 = 28;

/// ln(1 + ratio expm1(-L)).
fn moved(rapidity: Rapidity, ratio: i64) -> Result<Rapidity, TuningError> {
    let narrow = narrowed(rapidity)?;
    let product = i64::from(offset_of_rapidity(narrow.saturating_neg())).wrapping_mul(ratio);
    let rounded = product.wrapping_add(1 << (RATIO_BITS - 1)) >> RATIO_BITS;
    let offset = i32::try_from(rounded).map_err(|_| TuningError::TooFast)?;
    Ok(Rapidity::from_bits(i64::from(rapidity_of_offset(offset)) << 16))
}
