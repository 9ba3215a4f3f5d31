//! What a rehearsal prints, what it judges, and `summary.json`.

use super::alternatives::Alternative;
use super::oscillator::Oscillator;
use super::{Outcome, Rehearsal, stages::Seen};
use crate::age::ElementAge;
use crate::elements::ElementSet;
use serde::Serialize;
use shiftkeel::tuning::{Assumed, Assumptions, Bound, Excluded, ProvenPart};
use std::fmt::Write;

mod followed;

pub use followed::FollowedSummary;

/// Less than this part of the whole bound backed by what its parts were seen to do counts as padded. The parts do
/// not peak at the same instant, so it is their sum that is held against the bound, not the worst of the whole.
const LEAST_OF_ALL: f64 = 0.3;
/// A part that makes up more than this of the whole ...
const SUBSTANTIAL: f64 = 0.1;
/// ... counts as padded when less than this of it was seen.
const LEAST_OF_PART: f64 = 0.2;

/// One line of the proven block.
#[derive(Clone, Debug, Serialize)]
pub struct PartRow {
    /// Its name.
    pub part: &'static str,
    /// Bound of the frequency, Hz.
    pub bound_hz: f64,
    /// Largest seen, Hz; none where the part has no stage of its own.
    pub seen_hz: Option<f64>,
    /// Bound of the phase, cycles; none where the phase is not steered.
    pub bound_cycles: Option<f64>,
    /// Largest seen, cycles.
    pub seen_cycles: Option<f64>,
}

/// One line of the assumed and excluded blocks.
#[derive(Clone, Debug, Serialize)]
pub struct EstimateRow {
    /// Its name.
    pub part: &'static str,
    /// Hertz.
    pub hz: f64,
}

/// All that a rehearsal says.
#[derive(Clone, Debug, Serialize)]
pub struct Summary {
    /// Name or number of the object.
    pub object: String,
    /// Carrier, Hz.
    pub carrier_hz: f64,
    /// UTC of the first instant.
    pub start_utc: String,
    /// UTC of the last instant.
    pub end_utc: String,
    /// Intervals steered.
    pub ticks: u64,
    /// Instants looked at.
    pub instants: u64,
    /// Words written to the device, or ramps started.
    pub retunes: u64,
    /// Worst error of the frequency, Hz.
    pub worst_error_hz: f64,
    /// Root of the mean square of it, Hz.
    pub rms_error_hz: f64,
    /// UTC of the worst.
    pub worst_utc: String,
    /// What it may be at most, Hz.
    pub proven_bound_hz: f64,
    /// Worst error of the phase, cycles; none where it is not steered.
    pub worst_error_cycles: Option<f64>,
    /// What it may be at most, cycles; none where it is not steered.
    pub proven_bound_cycles: Option<f64>,
    /// Whether no instant was outside.
    pub within_bound: bool,
    /// Parts whose bound is far above what was seen.
    pub padded: Vec<String>,
    /// Part by part.
    pub proven: Vec<PartRow>,
    /// One sigma each.
    pub assumed: Vec<EstimateRow>,
    /// Root of the sum of their squares, Hz.
    pub assumed_total_hz: f64,
    /// Estimates of what the model leaves out.
    pub excluded: Vec<EstimateRow>,
    /// What is commonly done instead.
    pub alternatives: Vec<Alternative>,
    /// How late the spacecraft is in truth, and what that costs.
    pub late: Option<Late>,
    /// What the reference itself is uncertain by, Hz.
    pub reference_noise_hz: f64,
}

/// A late spacecraft.
#[derive(Clone, Debug, Serialize)]
pub struct Late {
    /// Seconds later in its orbit than its elements say.
    pub seconds: f64,
    /// What it costs.
    pub rows: Vec<Alternative>,
}

fn finite(value: f64) -> Option<f64> {
    value.is_finite().then_some(value)
}

/// What was seen of a part.
fn seen_of(part: ProvenPart, outcome: &Outcome, oscillator: &Oscillator) -> Option<Seen> {
    let stages = &outcome.stages;
    let holds = oscillator.bits.is_some();
    match part {
        ProvenPart::Arc => Some(stages.arc),
        ProvenPart::Table => Some(stages.table),
        ProvenPart::Arithmetic if oscillator.steers_phase() => Some(stages.arithmetic),
        ProvenPart::Word if holds && oscillator.steers_phase() => Some(stages.word),
        ProvenPart::Ramp if !holds => Some(stages.rule),
        ProvenPart::Hold if holds => Some(stages.rule),
        _ => None,
    }
}

/// The proven parts that are not zero, with what was seen of each.
pub fn part_rows(outcome: &Outcome, oscillator: &Oscillator) -> Vec<PartRow> {
    let parts = ProvenPart::ALL.into_iter().filter(|&part| outcome.proven.part(part) != Bound::default());
    parts
        .map(|part| {
            let bound = outcome.proven.part(part);
            let seen = seen_of(part, outcome, oscillator);
            PartRow {
                part: part.name(),
                bound_hz: bound.hertz,
                seen_hz: seen.map(|seen| seen.hertz),
                bound_cycles: finite(bound.cycles),
                // The phase of the arithmetic is inside the table's, which is read through it.
                seen_cycles: seen
                    .filter(|_| bound.cycles.is_finite() && part != ProvenPart::Arithmetic)
                    .map(|seen| seen.cycles),
            }
        })
        .collect()
}

/// Bounds that are far above what was seen, with the figures.
pub fn padded(rows: &[PartRow]) -> Vec<String> {
    let hertz: Vec<_> = rows.iter().map(|row| (row.part, row.seen_hz, row.bound_hz)).collect();
    let cycles: Vec<_> =
        rows.iter().filter_map(|row| Some((row.part, row.seen_cycles, row.bound_cycles?))).collect();
    let whole = cycles.len() == rows.len();
    let mut found = padded_in(&hertz, "Hz");
    if whole {
        found.extend(padded_in(&cycles, "cycles"));
    }
    found
}

/// The same in one unit: name, seen, bound.
fn padded_in(parts: &[(&str, Option<f64>, f64)], unit: &str) -> Vec<String> {
    let total: f64 = parts.iter().map(|(_, _, bound)| bound).sum();
    let backed: f64 = parts.iter().filter_map(|(_, seen, _)| *seen).sum();
    let mut found = Vec::new();
    let mut judge = |name: &str, seen: f64, bound: f64, least: f64| {
        if seen < least * bound {
            found.push(format!("{name}: {seen:.3e} of {bound:.3e} {unit} seen, less than {least}"));
        }
    };
    judge("all parts", backed, total, LEAST_OF_ALL);
    for &(name, seen, bound) in parts {
        if let Some(seen) = seen
            && bound > SUBSTANTIAL * total
        {
            judge(name, seen, bound, LEAST_OF_PART);
        }
    }
    found
}

impl Summary {
    /// Of a rehearsal.
    pub fn new(
        set: &ElementSet,
        rehearsal: &Rehearsal<'_>,
        outcome: &Outcome,
        alternatives: Vec<Alternative>,
        late: Option<(f64, Vec<Alternative>)>,
    ) -> Self {
        let pass = &rehearsal.baked.pass;
        let carrier = rehearsal.baked.order.carrier;
        let total = outcome.proven.total();
        let proven = part_rows(outcome, &rehearsal.oscillator);
        let age = ElementAge::new(set, pass.reference());
        let assumptions = Assumptions { lateness: age.lateness, ..Assumptions::default() };
        let assumed = Assumed::of(&assumptions, carrier, rehearsal.table.extremes().rate);
        let excluded = Excluded::of(carrier);
        let steered = rehearsal.oscillator.steers_phase();
        Self {
            object: set.label(),
            carrier_hz: carrier,
            start_utc: pass.utc(outcome.span.0),
            end_utc: pass.utc(outcome.span.1),
            ticks: outcome.ticks,
            instants: outcome.instants,
            retunes: outcome.retunes,
            worst_error_hz: outcome.worst.hertz,
            rms_error_hz: outcome.rms_hertz,
            worst_utc: pass.utc(outcome.worst_time),
            proven_bound_hz: total.hertz,
            worst_error_cycles: steered.then_some(outcome.worst.cycles),
            proven_bound_cycles: finite(total.cycles),
            within_bound: outcome.is_within(),
            padded: padded(&proven),
            proven,
            assumed: assumed.parts.map(|(part, hz)| EstimateRow { part, hz }).to_vec(),
            assumed_total_hz: assumed.total(),
            excluded: vec![
                EstimateRow { part: "ionosphere", hz: excluded.ionosphere },
                EstimateRow { part: "troposphere", hz: excluded.troposphere },
            ],
            alternatives,
            late: late.map(|(seconds, rows)| Late { seconds, rows }),
            reference_noise_hz: outcome.reference_noise.hertz,
        }
    }

    /// The blocks for reading.
    pub fn text(&self) -> String {
        let mut text = String::new();
        self.write(&mut text).unwrap_or_default();
        text
    }

    fn write(&self, text: &mut String) -> std::fmt::Result {
        self.write_proven(text)?;
        self.write_estimates(text)?;
        let measured = |row: &Alternative| vec![row.name.to_string(), hertz(row.worst_hz), hertz(row.rms_hz)];
        if let Some(late) = &self.late {
            writeln!(text, "\nLATE by {} s in truth: worst, rms of the table's shift", late.seconds)?;
            text.push_str(&lines(late.rows.iter().map(measured)));
        }
        writeln!(text, "\nINSTEAD, on the same pass: worst, rms")?;
        text.push_str(&lines(self.alternatives.iter().map(measured)));
        let verdict = if self.within_bound {
            "No instant was outside the bound."
        } else {
            "OUTSIDE: at least one instant was outside the bound."
        };
        writeln!(text, "\n{verdict}")?;
        for part in &self.padded {
            writeln!(text, "PADDED: {part} of the bound.")?;
        }
        Ok(())
    }

    fn write_proven(&self, text: &mut String) -> std::fmt::Result {
        writeln!(
            text,
            "PROVEN: how far the oscillator may be from what the model says; {} intervals, {} instants looked at",
            thousands(self.ticks),
            thousands(self.instants)
        )?;
        let (unit, scale) = if self.proven_bound_hz < 0.5 { ("mHz", 1e3) } else { ("Hz", 1.0) };
        let (seen, bound) = (format!("seen {unit}"), format!("bound {unit}"));
        let headings = ["part", &seen, &bound, "seen/bound", "seen cycles", "bound cycles", "seen/bound"];
        let whole = PartRow {
            part: "all together",
            bound_hz: self.proven_bound_hz,
            seen_hz: Some(self.worst_error_hz),
            bound_cycles: self.proven_bound_cycles,
            seen_cycles: self.worst_error_cycles,
        };
        let rows: Vec<Vec<String>> =
            self.proven.iter().chain([&whole]).map(|row| row.cells(&whole, scale)).collect();
        text.push_str(&indented(&crate::commands::table(&headings, &rows)));
        writeln!(
            text,
            "  worst at {}, rms {}. Each part is seen by its own stage: arc against orbit, table against arc,\n  \
             mean steps against exact delays, words against steps, and the rule of steering against the motion.\n",
            self.worst_utc,
            hertz(self.rms_error_hz)
        )
    }

    fn write_estimates(&self, text: &mut String) -> std::fmt::Result {
        let row = |row: &EstimateRow| vec![row.part.to_string(), hertz(row.hz)];
        let total = hertz(self.assumed_total_hz);
        writeln!(text, "ASSUMED: one sigma each, common practice; together {total}")?;
        text.push_str(&lines(self.assumed.iter().map(row)));
        writeln!(text, "\nEXCLUDED: not in the model; estimates above 10 degrees")?;
        text.push_str(&lines(self.excluded.iter().map(row)));
        Ok(())
    }
}

/// A bound below this part of the whole gets no ratio: the f64 comparison itself rounds there.
const NEGLIGIBLE: f64 = 1e-4;

impl PartRow {
    /// Its cells, in a table that ends with the `whole`; hertz times `scale`.
    fn cells(&self, whole: &Self, scale: f64) -> Vec<String> {
        let number = |value: Option<f64>, digits: usize| match value {
            None => "-".to_string(),
            Some(value) if value != 0.0 && value < 0.5 * 0.1f64.powi(digits as i32) => {
                format!("<{:.digits$}", 0.1f64.powi(digits as i32))
            }
            Some(value) => format!("{value:.digits$}"),
        };
        let ratio = |seen: Option<f64>, bound: Option<f64>, whole: Option<f64>| match (seen, bound, whole) {
            (Some(seen), Some(bound), Some(whole)) if bound > NEGLIGIBLE * whole => {
                format!("{:.2}", seen / bound)
            }
            _ => "-".to_string(),
        };
        vec![
            self.part.to_string(),
            number(self.seen_hz.map(|hertz| hertz * scale), 4),
            number(Some(self.bound_hz * scale), 4),
            ratio(self.seen_hz, Some(self.bound_hz), Some(whole.bound_hz)),
            number(self.seen_cycles, 6),
            number(self.bound_cycles, 6),
            ratio(self.seen_cycles, self.bound_cycles, whole.bound_cycles),
        ]
    }
}

/// Hertz with a unit that suits its size.
pub fn hertz(value: f64) -> String {
    let size = value.abs();
    if size >= 1e4 {
        format!("{:.2} kHz", value * 1e-3)
    } else if size >= 100.0 {
        format!("{value:.1} Hz")
    } else if size >= 1.0 {
        format!("{value:.2} Hz")
    } else if size >= 0.1 {
        format!("{value:.3} Hz")
    } else if size >= 1e-5 {
        format!("{:.3} mHz", value * 1e3)
    } else {
        format!("{:.2} uHz", value * 1e6)
    }
}

/// A count with its thousands apart.
fn thousands(value: u64) -> String {
    let digits = value.to_string();
    let mut text = String::new();
    for (at, digit) in digits.chars().enumerate() {
        if at > 0 && (digits.len() - at).is_multiple_of(3) {
            text.push(' ');
        }
        text.push(digit);
    }
    text
}

/// Rows without a heading: the first column to the left.
fn lines(rows: impl Iterator<Item = Vec<String>>) -> String {
    let rows: Vec<Vec<String>> = rows.collect();
    let first = rows.iter().map(|row| row[0].chars().count()).max().unwrap_or(0);
    let mut text = String::new();
    for row in rows {
        text += &format!("  {:<first$}", row[0]);
        for cell in &row[1..] {
            text += &format!("  {cell:>12}");
        }
        text.push('\n');
    }
    text
}

fn indented(text: &str) -> String {
    text.lines().map(|line| format!("  {line}\n")).collect()
}
