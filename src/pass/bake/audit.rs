//! A checker that knows nothing of the fit.

use super::super::table::{PassTable, TableError};

/// What [`audit`] saw.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Audit {
    /// Largest difference of delay in seconds.
    pub worst_delay: f64,
    /// Largest difference of the delay's slope, as the change from one instant to the next over the step; it holds
    /// [`PassTable::evaluation_noise`] over the step, so do not look closer than some 10 ms.
    pub worst_slope: f64,
    /// Instants looked at.
    pub instants: u32,
}

/// Checks a table against `delay` (seconds from the table's start) on a grid of `step` seconds (at least 1 us),
/// without trusting the fit: nothing here knows how the table was made.
///
/// # Errors
/// The instant's [`TableError`], which a sound table does not give inside its span.
pub fn audit(
    table: &PassTable<'_>,
    step: f64,
    mut delay: impl FnMut(f64) -> f64,
) -> Result<Audit, TableError> {
    let mut seen = Audit::default();
    let step = step.max(1e-6);
    let span = table.end().seconds_since(table.start());
    let mut before: Option<(f64, f64)> = None;
    let mut index = 0.0;
    while index * step <= span {
        let time = table.start().plus_seconds(index * step);
        let seconds = time.seconds_since(table.start());
        let stored = table.at(time)?.delay.to_bits() as f64 / 72_057_594_037_927_936.0;
        let difference = stored - delay(seconds);
        seen.worst_delay = seen.worst_delay.max(difference.abs());
        if let Some((earlier, then)) = before {
            seen.worst_slope = seen.worst_slope.max(((difference - then) / (seconds - earlier)).abs());
        }
        before = Some((seconds, difference));
        seen.instants = seen.instants.saturating_add(1);
        index += 1.0;
    }
    Ok(seen)
}
