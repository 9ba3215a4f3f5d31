//! What a rehearsal by estimates says.

use super::{hertz, thousands};
use crate::elements::ElementSet;
use crate::rehearsal::Rehearsal;
use crate::rehearsal::estimates::{Followed, Stream};
use anyhow::ensure;
use serde::Serialize;

/// What a rehearsal by estimates says.
#[derive(Clone, Debug, Serialize)]
pub struct FollowedSummary {
    /// Name or number of the object.
    pub object: String,
    /// Carrier, Hz.
    pub carrier_hz: f64,
    /// UTC of the first instant.
    pub start_utc: String,
    /// Intervals steered.
    pub ticks: u64,
    /// Intervals without a prediction.
    pub unsteered: u64,
    /// Estimates that came, and how many of them were wildly wrong.
    pub estimates: [u64; 2],
    /// Standard deviation of an estimate, Hz.
    pub noise_hz: f64,
    /// The oscillator's mean frequency against the filter's word for it: worst, Hz.
    pub worst_error_hz: f64,
    /// What it may be at most, Hz.
    pub proven_bound_hz: f64,
    /// The same of the phase, with what is carried forward, cycles.
    pub worst_error_cycles: f64,
    /// What it may be at most, cycles.
    pub proven_bound_cycles: f64,
    /// Whether no interval was outside of these.
    pub within_bound: bool,
    /// Error against the truth: worst, Hz.
    pub true_error_hz: f64,
    /// Root of the mean square of it, Hz.
    pub true_error_rms_hz: f64,
    /// Uncertainty that the filter states (about 95 %): median and largest, Hz.
    pub stated_hz: [f64; 2],
    /// Part of the intervals inside it.
    pub inside_stated: f64,
}

/// A stated 95 % that holds less often than this is not honest: many estimates share one error, so that a single
/// pass scatters by some percent.
const LEAST_INSIDE: f64 = 0.85;

impl FollowedSummary {
    /// Of a rehearsal.
    pub fn new(set: &ElementSet, rehearsal: &Rehearsal<'_>, stream: &Stream, followed: &Followed) -> Self {
        let pass = &rehearsal.baked.pass;
        let carrier = rehearsal.baked.order.carrier;
        Self {
            object: set.label(),
            carrier_hz: carrier,
            start_utc: pass.utc(followed.span.0),
            ticks: followed.ticks,
            unsteered: followed.unsteered,
            estimates: [followed.estimates, followed.outliers],
            noise_hz: stream.noise * carrier / crate::SPEED_OF_LIGHT,
            worst_error_hz: followed.steering.hertz,
            proven_bound_hz: followed.proven.hertz,
            worst_error_cycles: followed.steering.cycles,
            proven_bound_cycles: followed.proven.cycles,
            within_bound: followed.steering.is_within(&followed.proven),
            true_error_hz: followed.worst_hertz,
            true_error_rms_hz: followed.rms_hertz,
            stated_hz: followed.stated_hertz,
            inside_stated: followed.inside,
        }
    }

    /// The blocks for reading.
    pub fn text(&self) -> String {
        let [estimates, outliers] = self.estimates;
        let [median, largest] = self.stated_hz;
        format!(
            "PROVEN: the oscillator against the filter's word; {} intervals\n  mean frequency of an interval    {} seen \
             of {}\n  phase, with what is carried on   {:.2e} seen of {:.2e} cycles\n\nASSUMED: the filter against the \
             truth; {} estimates of {} each, {} of them wild\n  error        worst {}, rms {}\n  stated (95 %) median {}, \
             largest {}; {:.1} % of the intervals were inside\n  {} intervals had no prediction\n",
            thousands(self.ticks),
            hertz(self.worst_error_hz),
            hertz(self.proven_bound_hz),
            self.worst_error_cycles,
            self.proven_bound_cycles,
            thousands(estimates),
            hertz(self.noise_hz),
            outliers,
            hertz(self.true_error_hz),
            hertz(self.true_error_rms_hz),
            hertz(median),
            hertz(largest),
            self.inside_stated * 100.0,
            thousands(self.unsteered),
        )
    }

    /// Whether it stands.
    ///
    /// # Errors
    /// When an interval was outside what is proven, or the stated uncertainty did not hold.
    pub fn verdict(&self) -> anyhow::Result<()> {
        ensure!(
            self.within_bound,
            "outside the proven bound: {:.3e} Hz seen of {:.3e} Hz",
            self.worst_error_hz,
            self.proven_bound_hz
        );
        ensure!(
            self.inside_stated >= LEAST_INSIDE,
            "the filter's stated uncertainty held in {:.1} % of the intervals only, {:.0} % are the least",
            self.inside_stated * 100.0,
            LEAST_INSIDE * 100.0
        );
        Ok(())
    }
}
