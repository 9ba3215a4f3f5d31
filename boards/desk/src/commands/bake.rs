//! `bake`: the arc and the table of a pass.

use super::ElementArguments;
use crate::age::ElementAge;
use crate::baking::{Baked, Order, Pass, Which, bytes, words};
use crate::elements::{ElementFile, ElementSet};
use crate::frames::Site;
use crate::geometric::Direction;
use crate::horizon::Horizon;
use crate::instant;
use anyhow::{bail, ensure};
use chrono::{DateTime, Utc};
use clap::ValueEnum;
use shiftkeel::pass::{Arc, PassTable, TaggedAt};
use std::fmt::Write as _;
use std::path::{Path, PathBuf};

/// Time between two looks of the audit, s.
const AUDIT_STEP: f64 = 0.01;

/// At which end time is read.
#[derive(Clone, Copy, Debug, PartialEq, Eq, ValueEnum)]
pub enum Tag {
    /// Reception (down, two-way) or transmission (up) at the ground
    Ground,
    /// Transmission (down) or reception (up) at the spacecraft
    Spacecraft,
}

/// Which pass of which object over which site, and how closely.
#[derive(Clone, Debug, clap::Args)]
pub struct PassArguments {
    /// A time inside the pass, ISO 8601, UTC
    #[arg(long, value_name = "ISO", value_parser = instant::read, conflicts_with = "after")]
    pub at: Option<DateTime<Utc>>,
    /// The first pass in view at this time or later, ISO 8601, UTC
    #[arg(long, value_name = "ISO", value_parser = instant::read)]
    pub after: Option<DateTime<Utc>>,
    /// Elevation in degrees above which the spacecraft counts as in view
    #[arg(long, value_name = "DEGREES", default_value_t = 0.0, allow_hyphen_values = true)]
    pub least_elevation: f64,
    /// Carrier in hertz for which the tolerances hold
    #[arg(long, value_name = "HZ", default_value_t = 437e6, allow_hyphen_values = true)]
    pub carrier: f64,
    /// Largest frequency error of the table, millihertz [default: 10, above 437 MHz in proportion]
    #[arg(long, value_name = "MILLIHERTZ", allow_hyphen_values = true)]
    pub millihertz: Option<f64>,
    /// Largest phase error of the table, cycles [default: 0.01, above 437 MHz in proportion]
    #[arg(long, value_name = "CYCLES", allow_hyphen_values = true)]
    pub cycles: Option<f64>,
    /// Largest velocity error of the arc on each axis, mm/s [default: 0.1, or what a long pass allows]
    #[arg(long, value_name = "MM_S", allow_hyphen_values = true)]
    pub arc_millimetres: Option<f64>,
    /// Which way the signal goes
    #[arg(long, value_enum, default_value = "down")]
    pub direction: Direction,
    /// UT1 - UTC in seconds, as published by the Earth rotation service
    #[arg(long, value_name = "SECONDS", default_value_t = 0.0, allow_hyphen_values = true)]
    pub dut1: f64,
}

impl PassArguments {
    /// The order, checked.
    ///
    /// # Errors
    /// With what to give instead.
    pub fn order(&self, tagged_at: TaggedAt, lateness_partial: bool) -> anyhow::Result<Order> {
        super::check_carrier(self.carrier)?;
        super::check_dut1(self.dut1)?;
        let given = [
            ("--millihertz", self.millihertz),
            ("--cycles", self.cycles),
            ("--arc-millimetres", self.arc_millimetres),
        ];
        for (name, value) in given.into_iter().filter_map(|(name, value)| Some((name, value?))) {
            ensure!(
                value > 0.0 && value.is_finite(),
                "{name} {value} is no tolerance; give a number above 0"
            );
        }
        let scale = (self.carrier / 437e6).max(1.0);
        Ok(Order {
            carrier: self.carrier,
            millihertz: self.millihertz.unwrap_or(10.0 * scale),
            cycles: self.cycles.unwrap_or(0.01 * scale),
            arc_millimetres: self.arc_millimetres,
            direction: self.direction,
            tagged_at,
            lateness_partial,
            dut1: self.dut1,
        })
    }

    /// Finds the pass.
    ///
    /// # Errors
    /// When there is none, or no time is given.
    pub fn pass(&self, set: &ElementSet, site: Site) -> anyhow::Result<Pass> {
        let which = match (self.at, self.after) {
            (Some(time), _) => Which::At(time),
            (None, Some(time)) => Which::After(time),
            (None, None) => bail!("which pass? give --at a time inside it, or --after a time before it"),
        };
        Pass::find(set, site, self.dut1, which, &Horizon::flat(self.least_elevation)?)
    }
}

/// What `bake` takes.
#[derive(Clone, Debug, clap::Args)]
#[command(after_help = "\
The arc is the spacecraft's Earth-fixed path: it serves every site, carrier and direction. The table is the delay of \
the signal for one site and direction. Both are files of little-endian 32-bit words; the table is checked once with \
its CRC-32 and then read in place. The table is held against the arc before it is written, and read back after.

Examples:
  shiftkeel bake --elements pass.txt --site 45.0,7.5,300 --at 2026-06-01T12:12:00Z --carrier 437e6
  shiftkeel bake --elements pass.txt --site 45.0,7.5,300 --after 2026-06-01 --carrier 145.9e6 --millihertz 1 \
--direction up --lateness-partial --source pass.rs")]
pub struct BakeArguments {
    /// Elements and object.
    #[command(flatten)]
    pub elements: ElementArguments,
    /// Ground site: degrees, degrees, metres above the WGS-84 ellipsoid; south and west negative
    #[arg(long, value_name = "LAT,LON,HEIGHT_M", allow_hyphen_values = true)]
    pub site: Site,
    /// Pass and tolerances.
    #[command(flatten)]
    pub pass: PassArguments,
    /// At which end the table's time is read
    #[arg(long, value_enum, default_value = "ground")]
    pub tagged: Tag,
    /// Let the table answer for a spacecraft that is late, up to 8 s
    #[arg(long)]
    pub lateness_partial: bool,
    /// Where the arc is written
    #[arg(long, value_name = "FILE", default_value = "pass.arc")]
    pub arc: PathBuf,
    /// Where the table is written
    #[arg(long, value_name = "FILE", default_value = "pass.table")]
    pub table: PathBuf,
    /// Also write both as source: Rust for a name that ends in .rs, C for .c or .h
    #[arg(long, value_name = "FILE")]
    pub source: Option<PathBuf>,
    /// What the source calls them: NAME_ARC and NAME_TABLE
    #[arg(long, default_value = "PASS", requires = "source")]
    pub name: String,
}

/// Runs the command.
///
/// # Errors
/// When there is no such pass, the tolerances cannot be met, or a file cannot be written.
pub fn run(arguments: &BakeArguments) -> anyhow::Result<()> {
    let tagged_at = match arguments.tagged {
        Tag::Ground => TaggedAt::Ground,
        Tag::Spacecraft => TaggedAt::Spacecraft,
    };
    let order = arguments.pass.order(tagged_at, arguments.lateness_partial)?;
    let language = arguments.source.as_deref().map(Language::of).transpose()?;
    let sound = |c: char| c.is_ascii_alphanumeric() || c == '_';
    ensure!(
        arguments.name.chars().all(sound) && arguments.name.starts_with(|c: char| c.is_ascii_alphabetic()),
        "--name {} is no name for a constant; give letters, digits and underscores, such as PASS",
        arguments.name
    );
    let file = ElementFile::open(&arguments.elements.elements)?;
    let time = arguments.pass.at.or(arguments.pass.after).unwrap_or_default();
    let set = file.choose(arguments.elements.object.as_deref(), time)?;
    let pass = arguments.pass.pass(set, arguments.site)?;
    if let Some(text) = ElementAge::new(set, pass.reference()).warning(&set.label(), Some(order.carrier)) {
        super::warn(&text);
    }
    let baked = Baked::new(pass, set, order)?;
    // Nothing that does not stand the audit reaches a file.
    let seen = baked.verify(&baked.table, AUDIT_STEP)?;
    write_whole(&arguments.arc, &bytes(&baked.arc))?;
    write_whole(&arguments.table, &bytes(&baked.table))?;
    if let (Some(path), Some(language)) = (&arguments.source, language) {
        write_whole(path, source(&baked, set, language, &arguments.name).as_bytes())?;
    }
    let arc = words(&std::fs::read(&arguments.arc)?)?;
    ensure!(Arc::new(&arc)?.words() == baked.arc, "{} does not read back", arguments.arc.display());
    let table = words(&std::fs::read(&arguments.table)?)?;
    ensure!(
        PassTable::new(&table)?.words() == baked.table,
        "{} does not read back",
        arguments.table.display()
    );
    super::print(&summary(&baked, set, arguments, seen.instants)?)
}

fn summary(baked: &Baked, set: &ElementSet, arguments: &BakeArguments, looks: u32) -> anyhow::Result<String> {
    let table = PassTable::new(&baked.table)?;
    let (pass, carrier) = (&baked.pass, baked.order.carrier);
    let unit = (-60f64).exp2();
    let mut text = String::new();
    writeln!(
        text,
        "pass      {} from {} to {} UTC, {:.1} s, highest {:.1} degrees",
        set.label(),
        pass.utc(pass.start),
        pass.utc(pass.end),
        pass.end - pass.start,
        pass.highest.to_degrees()
    )?;
    writeln!(
        text,
        "arc       {} bytes in {}, off by at most {:.3} mHz and {:.5} cycles from the orbit",
        baked.arc.len() * 4,
        arguments.arc.display(),
        baked.arc_bound.hertz * 1e3,
        baked.arc_bound.cycles
    )?;
    writeln!(
        text,
        "table     {} bytes, {} segments in {}, off by at most {:.3} mHz and {:.5} cycles from the arc",
        baked.table.len() * 4,
        table.segment_count(),
        arguments.table.display(),
        f64::from(table.proven_slope()) * unit * carrier * 1e3,
        f64::from(table.proven_delay()) * unit * carrier
    )?;
    writeln!(text, "carrier   {carrier} Hz; both bounds grow in proportion to it")?;
    writeln!(text, "verified  held against the arc at {looks} instants, and read back")?;
    if let Some(path) = &arguments.source {
        writeln!(text, "source    {}", path.display())?;
    }
    Ok(text)
}

/// Writes a file whole: into a temporary one beside it, which then takes its name.
///
/// # Errors
/// When it cannot be written; an old file of that name is then still whole.
pub fn write_whole(path: &Path, bytes: &[u8]) -> anyhow::Result<()> {
    let mut temporary = path.as_os_str().to_os_string();
    temporary.push(".part");
    let temporary = PathBuf::from(temporary);
    let written = std::fs::write(&temporary, bytes).and_then(|()| std::fs::rename(&temporary, path));
    written.map_err(|error| {
        // Nothing more can be done about what is left of it.
        let _ = std::fs::remove_file(&temporary);
        anyhow::anyhow!("{} cannot be written: {error}; check the folder and its rights", path.display())
    })
}

/// A language of firmware.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Language {
    Rust,
    C,
}

impl Language {
    fn of(path: &Path) -> anyhow::Result<Self> {
        match path.extension().and_then(|ending| ending.to_str()) {
            Some("rs") => Ok(Self::Rust),
            Some("c" | "h") => Ok(Self::C),
            _ => bail!("--source {}: the name ends in .rs for Rust, in .c or .h for C", path.display()),
        }
    }
}

/// Arc and table as source.
fn source(baked: &Baked, set: &ElementSet, language: Language, name: &str) -> String {
    let pass = &baked.pass;
    let about = format!(
        "object {:05}, {} to {} UTC, site {:.7} {:.7} degrees {:.0} m",
        set.number,
        pass.utc(pass.start),
        pass.utc(pass.end),
        pass.site.latitude().to_degrees(),
        pass.site.longitude().to_degrees(),
        pass.site.height()
    );
    let mut text = match language {
        Language::Rust => format!("// Baked by shiftkeel: {about}.\n"),
        Language::C => format!("/* Baked by shiftkeel: {about}. */\n#include <stdint.h>\n"),
    };
    for (name, words) in [(format!("{name}_ARC"), &baked.arc), (format!("{name}_TABLE"), &baked.table)] {
        let (open, close) = match language {
            Language::Rust => (format!("\npub static {name}: [u32; {}] = [\n", words.len()), "];\n"),
            Language::C => (format!("\nstatic const uint32_t {name}[{}] = {{\n", words.len()), "};\n"),
        };
        text += &open;
        for line in words.chunks(6) {
            let cells: Vec<String> = line.iter().map(|word| format!("0x{word:08X}")).collect();
            text += &format!("    {},\n", cells.join(", "));
        }
        text += close;
    }
    text
}
