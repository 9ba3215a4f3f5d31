//! `trace`: one object over time.

use super::{ElementArguments, Format};
use crate::age::ElementAge;
use crate::elements::{ElementFile, ElementSet};
use crate::frames::Site;
use crate::geometric::{Direction, GeometricModel, Sight};
use crate::instant;
use crate::orbit::{Orbit, OrbitError};
use crate::vacuum::VacuumModel;
use anyhow::{Context, bail, ensure};
use chrono::{DateTime, Utc};
use clap::ValueEnum;
use serde::Serialize;

/// Most rows that are written.
const MOST_ROWS: f64 = 5e6;

/// Which physics.
#[derive(Clone, Copy, Debug, PartialEq, Eq, ValueEnum)]
pub enum Model {
    /// Instantaneous geometry with SGP4's own velocity
    Geometric,
    /// Light time, time dilation and potential; the velocity is the derivative of the position
    Vacuum,
}

/// What `trace` takes.
#[derive(Clone, Debug, clap::Args)]
#[command(after_help = "\
The rapidity is ln(received/transmitted frequency): positive while approaching. The shift is what the receiving \
end finds beside the carrier: for 'down' the ground receiver, for 'up' the spacecraft, for 'two-way' the ground \
receiver, after a coherent transponder, beside the carrier as it would come back from a transponder at rest. The \
range rate is positive while receding. With the vacuum model range and range rate are those of the light time.

Examples:
  shiftkeel trace --elements pass.txt --site 45.0,7.5,300 --from 2026-06-01T12:05:00Z --to 2026-06-01T12:18:00Z \
--step 30 --carrier 437e6
  shiftkeel trace --elements many.txt --object 90001 --site -33.9,18.4,20 --from 2026-06-01T12:00:00Z --to \
2026-06-01T13:00:00Z --step 1 --carrier 8.4e9 --model vacuum --direction up --format csv")]
pub struct TraceArguments {
    /// Elements and object.
    #[command(flatten)]
    pub elements: ElementArguments,
    /// Ground site: degrees, degrees, metres above the WGS-84 ellipsoid; south and west negative
    #[arg(long, value_name = "LAT,LON,HEIGHT_M", allow_hyphen_values = true)]
    pub site: Site,
    /// First time, ISO 8601, UTC
    #[arg(long, value_name = "ISO", value_parser = instant::read)]
    pub from: DateTime<Utc>,
    /// Last time, ISO 8601, UTC
    #[arg(long, value_name = "ISO", value_parser = instant::read)]
    pub to: DateTime<Utc>,
    /// Seconds between rows
    #[arg(long, value_name = "SECONDS", allow_hyphen_values = true)]
    pub step: f64,
    /// Carrier in hertz as transmitted, such as 437e6; without it there is no shift column to fill
    #[arg(long, value_name = "HZ", allow_hyphen_values = true)]
    pub carrier: Option<f64>,
    /// Which physics
    #[arg(long, value_enum, default_value = "geometric")]
    pub model: Model,
    /// Which way the signal goes
    #[arg(long, value_enum, default_value = "down")]
    pub direction: Direction,
    /// How rows are written
    #[arg(long, value_enum, default_value = "table")]
    pub format: Format,
    /// UT1 - UTC in seconds, as published by the Earth rotation service
    #[arg(long, value_name = "SECONDS", default_value_t = 0.0, allow_hyphen_values = true)]
    pub dut1: f64,
}

/// One row; the field names are the headings.
#[derive(Clone, Debug, Serialize)]
pub struct TraceRow {
    /// UTC, ISO 8601.
    pub time_utc: String,
    /// Elevation, degrees.
    pub elevation_deg: f64,
    /// Azimuth, degrees from north over east.
    pub azimuth_deg: f64,
    /// Range, km.
    pub range_km: f64,
    /// Range rate, km/s, positive = receding.
    pub range_rate_km_s: f64,
    /// ln(received / transmitted).
    pub rapidity: f64,
    /// Shift, Hz.
    pub shift_hz: Option<f64>,
}

const HEADINGS: [&str; 7] =
    ["time_utc", "elevation_deg", "azimuth_deg", "range_km", "range_rate_km_s", "rapidity", "shift_hz"];

impl TraceRow {
    fn new(time: DateTime<Utc>, sight: &Sight, carrier: Option<f64>) -> Self {
        Self {
            time_utc: instant::write(time),
            elevation_deg: sight.look.elevation.to_degrees(),
            azimuth_deg: sight.look.azimuth.to_degrees(),
            range_km: sight.range * 1e-3,
            range_rate_km_s: sight.range_rate * 1e-3,
            rapidity: sight.rapidity,
            shift_hz: carrier.map(|hertz| sight.shift(hertz)),
        }
    }

    fn cells(&self) -> Vec<String> {
        vec![
            self.time_utc.clone(),
            format!("{:.4}", self.elevation_deg),
            format!("{:.4}", self.azimuth_deg),
            format!("{:.6}", self.range_km),
            format!("{:+.9}", self.range_rate_km_s),
            format!("{:+.12e}", self.rapidity),
            self.shift_hz.map_or_else(|| "-".to_string(), |hertz| format!("{hertz:+.4}")),
        ]
    }
}

/// Either model, behind one question.
enum Either {
    Geometric(GeometricModel, Direction),
    Vacuum(VacuumModel),
}

impl Either {
    fn sight(&self, t: f64) -> Result<Sight, OrbitError> {
        match self {
            Self::Geometric(model, direction) => model.sight(t, *direction),
            Self::Vacuum(model) => model.sight(t),
        }
    }
}

/// The rows of a trace.
///
/// # Errors
/// When times, step or carrier make no sense, or the orbit ends on the way.
pub fn rows(arguments: &TraceArguments, set: &ElementSet) -> anyhow::Result<Vec<TraceRow>> {
    let span = instant::seconds_between(arguments.from, arguments.to);
    let step = arguments.step;
    ensure!(span >= 0.0, "--from is {:.0} s after --to; exchange them", -span);
    ensure!(step > 0.0 && step.is_finite(), "--step {step} is not a time; give seconds above 0");
    super::check_dut1(arguments.dut1)?;
    arguments.carrier.map_or(Ok(()), super::check_carrier)?;
    let count = (span / step + 1e-9).floor();
    ensure!(count < MOST_ROWS, "that makes {count:.0} rows, more than {MOST_ROWS:.0}; use a longer --step");
    let orbit = Orbit::new(set, arguments.from)?;
    let model = match arguments.model {
        Model::Geometric => {
            Either::Geometric(GeometricModel::new(orbit, arguments.site, arguments.dut1), arguments.direction)
        }
        Model::Vacuum => {
            let (site, dut1) = (arguments.site, arguments.dut1);
            Either::Vacuum(VacuumModel::new(orbit, site, dut1, arguments.direction, (0.0, span))?)
        }
    };
    (0..=count as u64)
        .map(|row| {
            let t = row as f64 * step;
            let time = instant::after(arguments.from, t).context("the time is beyond the calendar")?;
            Ok(TraceRow::new(time, &model.sight(t)?, arguments.carrier))
        })
        .collect()
}

/// Runs the command.
///
/// # Errors
/// As [`rows`], or when the elements or the output cannot be used.
pub fn run(arguments: &TraceArguments) -> anyhow::Result<()> {
    let file = ElementFile::open(&arguments.elements.elements)?;
    let set = file.choose(arguments.elements.object.as_deref(), arguments.from)?;
    let ages = [arguments.from, arguments.to].map(|time| ElementAge::new(set, time));
    let older = if ages[1].days.abs() > ages[0].days.abs() { &ages[1] } else { &ages[0] };
    if let Some(text) = older.warning(&set.label(), arguments.carrier) {
        super::warn(&text);
    }
    let rows = rows(arguments, set)?;
    let highest = rows.iter().map(|row| row.elevation_deg).fold(f64::NEG_INFINITY, f64::max);
    if highest < 0.0 {
        super::warn(&format!(
            "{} stays below the horizon from --from to --to (at best {highest:.1} degrees); `shiftkeel contacts` \
             finds its passes",
            set.label()
        ));
    }
    super::print(&match arguments.format {
        Format::Table => super::table(&HEADINGS, &rows.iter().map(TraceRow::cells).collect::<Vec<_>>()),
        Format::Json => serde_json::to_string_pretty(&rows)? + "\n",
        Format::Csv => csv_text(&rows)?,
    })
}

/// Rows as comma-separated text.
///
/// # Errors
/// When a row cannot be written.
pub fn csv_text<Row: Serialize>(rows: &[Row]) -> anyhow::Result<String> {
    let mut writer = csv::Writer::from_writer(Vec::new());
    for row in rows {
        writer.serialize(row)?;
    }
    match writer.into_inner() {
        Ok(bytes) => Ok(String::from_utf8(bytes)?),
        Err(error) => bail!("the rows cannot be written: {error}"),
    }
}
