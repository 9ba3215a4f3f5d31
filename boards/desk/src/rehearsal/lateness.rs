//! A spacecraft that is later in its orbit than its elements say: what that costs, and what telling the table helps.
//!
//! Lateness is made in the orbit, with the Earth turning on meanwhile, never by sliding the table.

use super::alternatives::Alternative;
use super::curve::Curve;
use super::{Rehearsal, truth_model};
use crate::baking::Baked;
use crate::orbit::OrbitError;
use anyhow::ensure;
use shiftkeel::pass::TableError;

/// Largest lateness that a table's partial takes, s.
const LARGEST: f64 = 8.0;
/// Time between two looks, s.
const LOOK: f64 = 0.1;

/// Rapidity at a time.
type Source<'a> = &'a dyn Fn(f64) -> Result<f64, TableError>;

/// Refuses what a table cannot be told.
///
/// # Errors
/// Beyond 8 s.
pub fn check(lateness: f64) -> anyhow::Result<()> {
    ensure!(
        lateness.abs() <= LARGEST,
        "--late {lateness} is beyond the {LARGEST} s that a table can be told of; get newer elements"
    );
    Ok(())
}

/// Errors of three tables for a spacecraft that is `lateness` s late: not told, told through its partial, baked again.
///
/// # Errors
/// When the orbit cannot be followed, or the table has no partial.
pub fn rows(rehearsal: &Rehearsal<'_>, baked: &Baked, lateness: f64) -> anyhow::Result<Vec<Alternative>> {
    let table = &rehearsal.table;
    ensure!(table.has_lateness(), "this table cannot be told of lateness; bake it with --lateness-partial");
    let reference = baked.pass.reference_gps()?;
    let origin = table.start().seconds_since(reference);
    let span =
        (origin + lateness.max(0.0), origin + table.end().seconds_since(table.start()) + lateness.min(0.0));
    let model = truth_model(baked, lateness)?;
    let late = Curve::hold(span.0, span.1, |t| Ok::<_, OrbitError>([model.delay(t)?, model.rapidity(t)?]))?;
    let geometry = baked.geometry(lateness)?;
    let told = (lateness * 24f64.exp2()).round() as i32;
    let rapidity = |bits: i64| bits as f64 * (-60f64).exp2();
    let plain = |t: f64| Ok(rapidity(table.at(reference.plus_seconds(t))?.rapidity.to_bits()));
    let partial = |t: f64| Ok(rapidity(table.at_late(reference.plus_seconds(t), told)?.rapidity.to_bits()));
    let again = |t: f64| Ok(geometry.delay_and_rapidity(t).1);
    let rows: [(&'static str, Source<'_>); 3] = [
        ("not told of it", &plain),
        ("told, through the table's partial", &partial),
        ("arc seen anew, as a fresh table would", &again),
    ];
    let truth = rehearsal.heard(&late);
    let looks = ((span.1 - span.0) / LOOK) as u64;
    let measured = rows.into_iter().map(|(name, source)| {
        let (mut worst, mut squares) = (0.0_f64, 0.0);
        for look in 0..looks {
            // Half a step inside, so that rounding of the ends does not matter.
            let t = span.0 + (look as f64 + 0.5) * LOOK;
            let off = truth.shift_of(source(t)?) - truth.shift(t);
            worst = worst.max(off.abs());
            squares += off * off;
        }
        Ok(Alternative { name, worst_hz: worst, rms_hz: (squares / looks.max(1) as f64).sqrt() })
    });
    measured.collect()
}
