//! `rehearse`: a whole pass steered by the crate's own code, beside an independent reference.

use super::bake::PassArguments;
use crate::age::ElementAge;
use crate::baking::{Baked, words};
use crate::elements::{ElementFile, ElementSet};
use crate::frames::Site;
use crate::geometric::Direction;
use crate::instant;
use crate::rehearsal::estimates::Stream;
use crate::rehearsal::oscillator::Oscillator;
use crate::rehearsal::report::{FollowedSummary, Summary};
use crate::rehearsal::{Rehearsal, alternatives, lateness, plot};
use anyhow::{Context, anyhow, bail, ensure};
use clap::ValueEnum;
use indicatif::{ProgressBar, ProgressStyle};
use serde::Serialize;
use shiftkeel::pass::{PassTable, TaggedAt};
use std::fmt::Write as _;
use std::path::{Path, PathBuf};
use std::str::FromStr;

/// The invented spacecraft of the built-in pass.
const ELEMENTS: &str = "\
1 90001U 26001A   26152.50000000  .00000000  00000-0  10000-4 0  9995
2 90001  97.6000 255.0000 0010000  90.0000   0.0000 15.05491974    12
";
/// Its site.
const SITE: &str = "45.0,7.5,300";
/// A time inside its pass.
const TIME: &str = "2026-06-01T12:11:55Z";

/// What steers.
#[derive(Clone, Copy, Debug, PartialEq, Eq, ValueEnum)]
pub enum Source {
    /// A pass table
    Table,
    /// Range-rate estimates through the velocity filter
    Estimates,
}

/// Two numbers with a comma between.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Pair(f64, f64);

impl FromStr for Pair {
    type Err = String;

    fn from_str(text: &str) -> Result<Self, String> {
        let parts = text.split_once(',').map(|(first, second)| (first.trim().parse(), second.trim().parse()));
        match parts {
            Some((Ok(first), Ok(second))) => Ok(Self(first, second)),
            _ => Err("write two numbers with a comma between, such as 2,0.4".to_string()),
        }
    }
}

/// What `rehearse` takes.
#[derive(Clone, Debug, clap::Args)]
#[command(after_help = "\
Without --elements an invented pass is flown: object 90001 over 45 N 7.5 E on 2026-06-01, 437 MHz. The oscillator is \
looked at from the first to the last clock of every interval. The command fails when one instant is outside the proven \
bound, and when the bound is padded: what its parts were seen to do sums to less than 0.3 of it, or to less than 0.2 \
of a part that makes up more than 0.1 of it.

Examples:
  shiftkeel rehearse --elements pass.txt --site 45.0,7.5,300 --at 2026-06-01T12:12:00Z --carrier 145.9e6
  shiftkeel rehearse --clock 100e6 --tick 0.001 --bits 32 --millihertz 1
  shiftkeel rehearse --clock 25e6 --tick 0.05 --bits 28 --deadband 5 --quiet 2,0.4
  shiftkeel rehearse --late 3
  shiftkeel rehearse --source estimates --estimates 1 --noise 0.5 --gap 300,20 --outliers 0.02")]
pub struct RehearseArguments {
    /// Two-line element file, with one or many objects; without it the invented pass
    #[arg(long, value_name = "FILE")]
    pub elements: Option<PathBuf>,
    /// Object in the file: its name, a part of it that fits only one, or its catalogue number
    #[arg(long, value_name = "NAME|NUMBER", requires = "elements")]
    pub object: Option<String>,
    /// Ground site: degrees, degrees, metres above the WGS-84 ellipsoid; south and west negative
    #[arg(long, value_name = "LAT,LON,HEIGHT_M", allow_hyphen_values = true)]
    pub site: Option<Site>,
    /// Pass and tolerances.
    #[command(flatten)]
    pub pass: PassArguments,
    /// Steer with this table instead of a fresh one: is it the right one for this pass?
    #[arg(long, value_name = "FILE")]
    pub table: Option<PathBuf>,
    /// Clock of the oscillator, hertz
    #[arg(long, value_name = "HZ", default_value_t = 48e3)]
    pub clock: f64,
    /// Time between two steerings, seconds
    #[arg(long, value_name = "SECONDS", default_value_t = 0.01)]
    pub tick: f64,
    /// Width of the word of a device that cannot ramp; without it a 64-bit oscillator that ramps
    #[arg(long, value_name = "BITS")]
    pub bits: Option<u32>,
    /// Change below which the device's word stays, hertz; only the frequency is then steered
    #[arg(long, value_name = "HZ", default_value_t = 0.0)]
    pub deadband: f64,
    /// No retuning for LENGTH seconds out of every EVERY; only the frequency is then steered
    #[arg(long, value_name = "EVERY,LENGTH")]
    pub quiet: Option<Pair>,
    /// What steers: a table, or range-rate estimates through the velocity filter
    #[arg(long, value_enum, default_value = "table")]
    pub source: Source,
    /// Estimates a second
    #[arg(long, value_name = "PER_SECOND", default_value_t = 10.0)]
    pub estimates: f64,
    /// Standard deviation of an estimate, m/s
    #[arg(long, value_name = "M_S", default_value_t = 0.1)]
    pub noise: f64,
    /// No estimates for LENGTH seconds, FROM seconds after the start
    #[arg(long, value_name = "FROM,LENGTH")]
    pub gap: Option<Pair>,
    /// Part of the estimates that is wildly wrong
    #[arg(long, value_name = "PART", default_value_t = 0.01)]
    pub outliers: f64,
    /// Seed of the noise
    #[arg(long, default_value_t = 1)]
    pub seed: u64,
    /// Seconds by which the spacecraft is later in its orbit than its elements say, up to 8
    #[arg(long, value_name = "SECONDS", allow_hyphen_values = true)]
    pub late: Option<f64>,
    /// Folder for summary.json and the picture
    #[arg(long, value_name = "DIR", default_value = "target/rehearsal")]
    pub out: PathBuf,
}

/// Runs the command.
///
/// # Errors
/// When there is no such pass, an instant is outside the bound, or the bound is padded.
pub fn run(arguments: &RehearseArguments) -> anyhow::Result<()> {
    let quiet = arguments.quiet.map(|Pair(every, length)| (every, length));
    let oscillator =
        Oscillator::new(arguments.clock, arguments.tick, arguments.bits, arguments.deadband, quiet)?;
    let (set, site, pass) = scenario(arguments)?;
    arguments.late.map_or(Ok(()), lateness::check)?;
    let order = pass.order(TaggedAt::Ground, arguments.late.is_some())?;
    let found = pass.pass(&set, site)?;
    if let Some(text) = ElementAge::new(&set, found.reference()).warning(&set.label(), Some(order.carrier)) {
        super::warn(&text);
    }
    let baked = Baked::new(found, &set, order)?;
    let given = arguments.table.as_deref().map(read_table).transpose()?;
    let table = given.as_deref().unwrap_or(&baked.table);
    let table = PassTable::new(table).with_context(|| name_of(arguments))?;
    let rehearsal = Rehearsal::new(&baked, table, oscillator).with_context(|| name_of(arguments))?;
    match arguments.source {
        Source::Table => by_table(arguments, &set, &rehearsal),
        Source::Estimates => by_estimates(arguments, &set, &rehearsal),
    }
}

/// Steered by the table.
fn by_table(
    arguments: &RehearseArguments,
    set: &ElementSet,
    rehearsal: &Rehearsal<'_>,
) -> anyhow::Result<()> {
    let progress = bar();
    let outcome = rehearsal.run(|part| progress.set_position((part * 1000.0) as u64))?;
    progress.finish_and_clear();
    let alternatives = alternatives::all(rehearsal, outcome.span)?;
    let late = arguments
        .late
        .map(|late| Ok::<_, anyhow::Error>((late, lateness::rows(rehearsal, rehearsal.baked, late)?)));
    let summary = Summary::new(set, rehearsal, &outcome, alternatives, late.transpose()?);
    let heading = heading(set, rehearsal, outcome.span)?;
    super::print(&format!(
        "{}\n  retuned {} times\n\n{}",
        heading.join("\n"),
        outcome.retunes,
        summary.text()
    ))?;
    keep(&arguments.out, &summary, |path| {
        plot::draw(path, &plot::of_table(&heading, &outcome, &summary.alternatives))
    })?;
    verdict(&summary)
}

/// Steered by estimates.
fn by_estimates(
    arguments: &RehearseArguments,
    set: &ElementSet,
    rehearsal: &Rehearsal<'_>,
) -> anyhow::Result<()> {
    ensure!(
        rehearsal.baked.order.direction == Direction::Down,
        "estimates are measured on the downlink; leave --direction away"
    );
    let stream = Stream {
        rate: arguments.estimates,
        noise: arguments.noise,
        gap: arguments.gap.map(|Pair(from, length)| (from, length)),
        outliers: arguments.outliers,
        seed: arguments.seed,
    };
    stream.check()?;
    let followed = rehearsal.follow(&stream)?;
    let summary = FollowedSummary::new(set, rehearsal, &stream, &followed);
    let mut heading = heading(set, rehearsal, followed.span)?;
    if let Some(line) = heading.get_mut(2) {
        // There is a table, but here only the span is taken from it.
        *line = format!(
            "  range-rate estimates: {} a second of {} m/s, {} of {} wildly wrong",
            stream.rate, stream.noise, followed.outliers, followed.estimates
        );
        if let Some((from, length)) = stream.gap {
            write!(line, ", none for {length} s from {from} s on")?;
        }
    }
    super::print(&format!("{}\n\n{}", heading.join("\n"), summary.text()))?;
    keep(&arguments.out, &summary, |path| plot::draw(path, &plot::of_estimates(&heading, &followed)))?;
    summary.verdict()
}

/// Elements, site and pass: the given ones, or the invented ones.
fn scenario(arguments: &RehearseArguments) -> anyhow::Result<(ElementSet, Site, PassArguments)> {
    let mut pass = arguments.pass.clone();
    let Some(path) = &arguments.elements else {
        if pass.at.is_none() && pass.after.is_none() {
            pass.at = Some(instant::read(TIME)?);
        }
        let site = arguments.site.map_or_else(|| SITE.parse(), Ok)?;
        let file = ElementFile::read("the built-in elements", ELEMENTS)?;
        let set = file.sets().first().context("the built-in elements are empty")?.clone();
        return Ok((set, site, pass));
    };
    let Some(site) = arguments.site else {
        bail!("--elements needs --site LAT,LON,HEIGHT_M: from where is the pass seen?");
    };
    let file = ElementFile::open(path)?;
    let time = pass.at.or(pass.after).unwrap_or_default();
    Ok((file.choose(arguments.object.as_deref(), time)?.clone(), site, pass))
}

fn read_table(path: &Path) -> anyhow::Result<Vec<u32>> {
    let bytes =
        std::fs::read(path).map_err(|error| anyhow!("cannot read the table {}: {error}", path.display()))?;
    words(&bytes).with_context(|| path.display().to_string())
}

fn name_of(arguments: &RehearseArguments) -> String {
    arguments.table.as_ref().map_or_else(|| "the fresh table".to_string(), |path| path.display().to_string())
}

/// What is rehearsed, in a few lines; the first also heads the picture.
fn heading(set: &ElementSet, rehearsal: &Rehearsal<'_>, span: (f64, f64)) -> anyhow::Result<Vec<String>> {
    let (baked, oscillator) = (rehearsal.baked, &rehearsal.oscillator);
    let (pass, order) = (&baked.pass, &baked.order);
    let way = match order.direction {
        Direction::Down => "down",
        Direction::Up => "up",
        Direction::TwoWay => "two-way",
    };
    let truth = rehearsal.heard(&rehearsal.truth);
    let (first, last) = (truth.shift(span.0), truth.shift(span.1));
    let mut device = format!("{} Hz clock, every {} s", oscillator.hertz(), oscillator.interval());
    match oscillator.bits {
        None => device += ", 64 bits, ramped",
        Some(bits) => write!(device, ", {bits}-bit word held")?,
    }
    if oscillator.deadband > 0.0 {
        write!(device, ", deadband {} Hz", oscillator.deadband)?;
    }
    if let Some((every, length)) = oscillator.quiet {
        write!(device, ", quiet for {length} of every {every} s")?;
    }
    Ok(vec![
        format!(
            "Object {} over {:.4}, {:.4} degrees, {way} at {:.6} MHz",
            set.label(),
            pass.site.latitude().to_degrees(),
            pass.site.longitude().to_degrees(),
            order.carrier * 1e-6
        ),
        format!(
            "  {} to {}, highest {:.1} degrees, shift {first:+.1} to {last:+.1} Hz, at most {:.1} Hz/s",
            pass.utc(span.0),
            pass.utc(span.1),
            pass.highest.to_degrees(),
            rehearsal.table.extremes().rate * order.carrier
        ),
        format!(
            "  arc of {} bytes, table of {} bytes in {} segments",
            baked.arc.len() * 4,
            rehearsal.table.words().len() * 4,
            rehearsal.table.segment_count()
        ),
        format!("  oscillator: {device}"),
    ])
}

/// Writes summary and picture.
fn keep(
    out: &Path,
    summary: &impl Serialize,
    draw: impl Fn(&Path) -> anyhow::Result<()>,
) -> anyhow::Result<()> {
    std::fs::create_dir_all(out).map_err(|error| {
        anyhow!("the folder {} cannot be made: {error}; give another --out", out.display())
    })?;
    let json = serde_json::to_string_pretty(summary)? + "\n";
    super::bake::write_whole(&out.join("summary.json"), json.as_bytes())?;
    draw(&out.join("plot.svg"))?;
    super::print(&format!("Written: summary.json and plot.svg in {}\n", out.display()))
}

/// A progress bar, seen on a terminal only.
fn bar() -> ProgressBar {
    let bar = ProgressBar::new(1000);
    match ProgressStyle::with_template("{bar:32} {percent} % of the pass, {eta} left") {
        Ok(style) => bar.with_style(style),
        Err(_) => bar,
    }
}

fn verdict(summary: &Summary) -> anyhow::Result<()> {
    ensure!(
        summary.within_bound,
        "outside the proven bound: {:.6} Hz seen of {:.6} Hz, at {}",
        summary.worst_error_hz,
        summary.proven_bound_hz,
        summary.worst_utc
    );
    ensure!(summary.padded.is_empty(), "the bound is padded: {}", summary.padded.join("; "));
    Ok(())
}
