//! `contacts`: the passes of one or many objects over a site.

use super::trace::csv_text;
use super::{ElementArguments, Format};
use crate::age::ElementAge;
use crate::contacts::{Contact, Found, find};
use crate::elements::{ElementFile, ElementSet};
use crate::frames::Site;
use crate::geometric::{Direction, GeometricModel};
use crate::horizon::Horizon;
use crate::instant;
use crate::orbit::Orbit;
use anyhow::{anyhow, ensure};
use chrono::{DateTime, Utc};
use indicatif::{ProgressBar, ProgressStyle};
use rayon::prelude::*;
use serde::Serialize;
use std::path::PathBuf;

/// Most warnings of one kind before they are summed up.
const MOST_WARNINGS: usize = 5;

/// What `contacts` takes.
#[derive(Clone, Debug, clap::Args)]
#[command(after_help = "\
One row for each pass and carrier, in order of time. A pass that is in view already at --from has no rise, one that is \
still in view at --to has no set. Times, ranges and shifts are those of instantaneous geometry. The largest shift is \
positive when it is that of the approach; the steepest rate is how fast the shift falls near closest approach.

Examples:
  shiftkeel contacts --elements many.txt --site 45.0,7.5,300 --from 2026-06-01 --to 2026-06-02 --carrier 437e6
  shiftkeel contacts --elements many.txt --object 90001 --site -33.9,18.4,20 --from 2026-06-01 --to 2026-06-08 \
--least-elevation 10 --mask hills.txt --format csv")]
pub struct ContactArguments {
    /// Elements and object; without --object all objects of the file.
    #[command(flatten)]
    pub elements: ElementArguments,
    /// Ground site: degrees, degrees, metres above the WGS-84 ellipsoid; south and west negative
    #[arg(long, value_name = "LAT,LON,HEIGHT_M", allow_hyphen_values = true)]
    pub site: Site,
    /// Begin of the window, ISO 8601, UTC
    #[arg(long, value_name = "ISO", value_parser = instant::read)]
    pub from: DateTime<Utc>,
    /// End of the window, ISO 8601, UTC
    #[arg(long, value_name = "ISO", value_parser = instant::read)]
    pub to: DateTime<Utc>,
    /// Carriers in hertz, such as 437e6,2.2e9
    #[arg(long = "carrier", value_name = "HZ", value_delimiter = ',', allow_hyphen_values = true)]
    pub carriers: Vec<f64>,
    /// Which way the signal goes
    #[arg(long, value_enum, default_value = "down")]
    pub direction: Direction,
    /// Elevation in degrees above which the spacecraft counts as in view
    #[arg(long, value_name = "DEGREES", default_value_t = 0.0, allow_hyphen_values = true)]
    pub least_elevation: f64,
    /// Horizon mask: a file with lines of AZIMUTH,ELEVATION in degrees, straight lines between them
    #[arg(long, value_name = "FILE")]
    pub mask: Option<PathBuf>,
    /// How rows are written
    #[arg(long, value_enum, default_value = "table")]
    pub format: Format,
    /// UT1 - UTC in seconds, as published by the Earth rotation service
    #[arg(long, value_name = "SECONDS", default_value_t = 0.0, allow_hyphen_values = true)]
    pub dut1: f64,
}

/// One row; the field names are the headings.
#[derive(Clone, Debug, Serialize)]
pub struct ContactRow {
    /// Name, or number when there is none.
    pub object: String,
    /// Catalogue number.
    pub number: u32,
    /// When it rises, unless it was in view already.
    pub rise_utc: Option<String>,
    /// Azimuth at the begin of the pass.
    pub rise_azimuth_deg: f64,
    /// Closest approach.
    pub closest_utc: String,
    /// Range then.
    pub closest_km: f64,
    /// Highest elevation.
    pub highest_deg: f64,
    /// When it sets, unless it is still in view.
    pub set_utc: Option<String>,
    /// Azimuth at the end of the pass.
    pub set_azimuth_deg: f64,
    /// How long it is in view inside the window.
    pub duration_s: f64,
    /// The carrier.
    pub carrier_hz: Option<f64>,
    /// Largest shift.
    pub largest_shift_hz: Option<f64>,
    /// Steepest rate of the shift.
    pub steepest_rate_hz_s: Option<f64>,
}

const HEADINGS: [&str; 13] = [
    "object",
    "number",
    "rise_utc",
    "rise_azimuth_deg",
    "closest_utc",
    "closest_km",
    "highest_deg",
    "set_utc",
    "set_azimuth_deg",
    "duration_s",
    "carrier_hz",
    "largest_shift_hz",
    "steepest_rate_hz_s",
];

impl ContactRow {
    fn new(set: &ElementSet, contact: &Contact, reference: DateTime<Utc>, carrier: Option<f64>) -> Self {
        let time = |t: f64| {
            let rounded = (t * 1e3).round() * 1e-3;
            instant::after(reference, rounded).map_or_else(String::new, instant::write)
        };
        Self {
            object: set.label(),
            number: set.number,
            rise_utc: contact.rises.then(|| time(contact.start)),
            rise_azimuth_deg: contact.start_azimuth.to_degrees(),
            closest_utc: time(contact.closest),
            closest_km: contact.closest_range * 1e-3,
            highest_deg: contact.highest_elevation.to_degrees(),
            set_utc: contact.sets.then(|| time(contact.end)),
            set_azimuth_deg: contact.end_azimuth.to_degrees(),
            duration_s: contact.end - contact.start,
            carrier_hz: carrier,
            largest_shift_hz: carrier.map(|hertz| hertz * contact.largest_offset),
            steepest_rate_hz_s: carrier.map(|hertz| hertz * contact.steepest_rate),
        }
    }

    fn cells(&self) -> Vec<String> {
        let number = |value: Option<f64>, digits: usize| {
            value.map_or_else(|| "-".to_string(), |value| format!("{value:+.digits$}"))
        };
        vec![
            self.object.clone(),
            format!("{:05}", self.number),
            self.rise_utc.clone().unwrap_or_else(|| "before".to_string()),
            format!("{:.1}", self.rise_azimuth_deg),
            self.closest_utc.clone(),
            format!("{:.3}", self.closest_km),
            format!("{:.2}", self.highest_deg),
            self.set_utc.clone().unwrap_or_else(|| "after".to_string()),
            format!("{:.1}", self.set_azimuth_deg),
            format!("{:.1}", self.duration_s),
            self.carrier_hz.map_or_else(|| "-".to_string(), |hertz| format!("{hertz:.0}")),
            number(self.largest_shift_hz, 1),
            number(self.steepest_rate_hz_s, 2),
        ]
    }
}

/// Runs the command.
///
/// # Errors
/// When the arguments make no sense, no object can be used, or there is no pass.
pub fn run(arguments: &ContactArguments) -> anyhow::Result<()> {
    let span = instant::seconds_between(arguments.from, arguments.to);
    ensure!(span > 0.0, "the window from --from to --to is {span:.0} s long; --to must be later than --from");
    super::check_dut1(arguments.dut1)?;
    arguments.carriers.iter().try_for_each(|&hertz| super::check_carrier(hertz))?;
    let mut horizon = Horizon::flat(arguments.least_elevation)?;
    if let Some(path) = &arguments.mask {
        horizon = horizon.with_mask_file(path)?;
    }
    let file = ElementFile::open(&arguments.elements.elements)?;
    let middle = arguments.from + (arguments.to - arguments.from) / 2;
    let sets = match &arguments.elements.object {
        Some(wanted) => vec![file.choose(Some(wanted), middle)?],
        None => file.objects(middle),
    };
    warn_of_age(&sets, arguments);
    let searched = search_all(&sets, &horizon, arguments, span);
    warn_of_ends(&searched);
    let rows = rows(&sets, &searched, arguments);
    if rows.is_empty() {
        return Err(nothing_found(&sets, &searched, arguments));
    }
    super::print(&match arguments.format {
        Format::Table => super::table(&HEADINGS, &rows.iter().map(ContactRow::cells).collect::<Vec<_>>()),
        Format::Json => serde_json::to_string_pretty(&rows)? + "\n",
        Format::Csv => csv_text(&rows)?,
    })
}

/// All objects, on all cores.
fn search_all(
    sets: &[&ElementSet],
    horizon: &Horizon,
    arguments: &ContactArguments,
    span: f64,
) -> Vec<Found> {
    let style = ProgressStyle::with_template("{bar:32} {pos}/{len} objects, {eta} left");
    let progress = ProgressBar::new(sets.len() as u64);
    let progress = style.map_or_else(|_| progress.clone(), |style| progress.clone().with_style(style));
    let searched = sets
        .par_iter()
        .map(|set| {
            let found = match Orbit::new(set, arguments.from) {
                Ok(orbit) => {
                    let model = GeometricModel::new(orbit, arguments.site, arguments.dut1);
                    find(&model, horizon, arguments.direction, (0.0, span))
                }
                Err(error) => Found { ended: Some(error), ..Found::default() },
            };
            progress.inc(1);
            found
        })
        .collect();
    progress.finish_and_clear();
    searched
}

fn rows(sets: &[&ElementSet], searched: &[Found], arguments: &ContactArguments) -> Vec<ContactRow> {
    let mut passes: Vec<(&ElementSet, &Contact)> = sets
        .iter()
        .zip(searched)
        .flat_map(|(set, found)| found.contacts.iter().map(move |contact| (*set, contact)))
        .collect();
    passes.sort_by(|a, b| a.1.start.total_cmp(&b.1.start));
    let carriers: Vec<Option<f64>> = match arguments.carriers.as_slice() {
        [] => vec![None],
        some => some.iter().copied().map(Some).collect(),
    };
    let row = |(set, contact): &(&ElementSet, &Contact)| {
        let (set, contact) = (*set, *contact);
        let rows =
            carriers.iter().map(move |carrier| ContactRow::new(set, contact, arguments.from, *carrier));
        rows.collect::<Vec<_>>()
    };
    passes.iter().flat_map(row).collect()
}

fn warn_of_age(sets: &[&ElementSet], arguments: &ContactArguments) {
    let carrier = arguments.carriers.iter().copied().reduce(f64::max);
    let warnings: Vec<String> = sets
        .iter()
        .filter_map(|set| {
            let ages = [arguments.from, arguments.to].map(|time| ElementAge::new(set, time));
            let [first, last] = &ages;
            let older = if last.days.abs() > first.days.abs() { last } else { first };
            older.warning(&set.label(), carrier)
        })
        .collect();
    warn_some(&warnings, "objects have elements that are old");
}

fn warn_of_ends(searched: &[Found]) {
    let warnings: Vec<String> =
        searched.iter().filter_map(|found| found.ended.as_ref()).map(ToString::to_string).collect();
    warn_some(&warnings, "objects cannot be followed to the end of the window");
}

fn warn_some(warnings: &[String], what: &str) {
    for text in warnings.iter().take(MOST_WARNINGS) {
        super::warn(text);
    }
    if warnings.len() > MOST_WARNINGS {
        super::warn(&format!("{} more {what}", warnings.len() - MOST_WARNINGS));
    }
}

/// Why there is no row: the nearest thing to a pass, or that no object could be used.
fn nothing_found(sets: &[&ElementSet], searched: &[Found], arguments: &ContactArguments) -> anyhow::Error {
    let best = sets
        .iter()
        .zip(searched)
        .filter_map(|(set, found)| found.best.map(|(clearance, t)| (clearance, t, set)))
        .max_by(|a, b| a.0.total_cmp(&b.0));
    let Some((clearance, t, set)) = best else {
        return anyhow!("no object can be followed in this window; use newer elements");
    };
    let time = instant::after(arguments.from, t.round()).map_or_else(String::new, instant::write);
    anyhow!(
        "no pass between {} and {}: the nearest to one is {} at about {time}, {:.1} degrees below what counts as \
         in view; choose a longer window or a lower --least-elevation",
        instant::write(arguments.from),
        instant::write(arguments.to),
        set.label(),
        -clearance.to_degrees(),
    )
}
