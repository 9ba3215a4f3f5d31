//! Where the shift meets the radio: from a motion to the word that an oscillator takes.
//!
//! A [`Channel`] is the RF plan folded into constants: carrier, conversions, injection side, clock, the offset
//! of each crystal, receive or transmit. Per tick only `W0 + Wf expm1(L)` remains, or the same from the
//! difference of two delays, which is exact in phase.
//!
//! When to retune is not the channel's business: [`Sweep`] is for oscillators that ramp, [`Hold`] for those
//! that keep one word over an interval. Both carry what they could not express into the next interval, so the
//! phase error never accumulates.
//!
//! A transmitting channel needs a [`Permission`] that names the frequencies it may radiate on.

mod bounds;
mod channel;
mod error;
mod gain;
mod hold;
mod permission;
mod plan;
mod ramp;
mod stretch;
mod sweep;
mod transponder;

pub use bounds::{Assumed, Assumptions, Bound, Excluded, Proven, ProvenPart, Steering};
pub use channel::{Channel, RatioChannel};
pub use error::TuningError;
pub use hold::{Held, Hold};
pub use permission::Permission;
pub use plan::{Conversion, Injection, RfPlan, Translation};
pub use stretch::{Stretch, StretchError, Stride};
pub use sweep::{Sweep, Swept};
pub use transponder::{LinearTransponder, Still, TransponderPair};
