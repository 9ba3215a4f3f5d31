//! What the program offers on its command line.
//!
//! Results go to standard output, warnings and progress to standard error.

use anyhow::ensure;
use clap::{Parser, Subcommand, ValueEnum};
use std::path::PathBuf;

pub mod bake;
pub mod contacts;
pub mod rehearse;
pub mod trace;

/// Steers a radio's oscillator along a moving carrier. Without a command an invented pass is rehearsed.
#[derive(Debug, Parser)]
#[command(name = "shiftkeel", version)]
pub struct Arguments {
    /// What to do; without it a built-in pass is rehearsed.
    #[command(subcommand)]
    pub command: Option<Command>,
}

impl Arguments {
    /// Does it.
    ///
    /// # Errors
    /// Whatever keeps it from a result, in words for the user.
    pub fn run(self) -> anyhow::Result<()> {
        match self.command {
            Some(command) => command.run(),
            // As if the command had been given, with its own defaults.
            None => match Self::try_parse_from(["shiftkeel", "rehearse"])?.command {
                Some(command) => command.run(),
                None => Ok(()),
            },
        }
    }
}

/// The commands.
#[derive(Debug, Subcommand)]
pub enum Command {
    /// Elevation, range, range rate, rapidity and shift of one object over time
    Trace(trace::TraceArguments),
    /// Passes of one or many objects over a site in a window of time
    Contacts(contacts::ContactArguments),
    /// Arc and table of one pass, as files and as source for firmware
    Bake(bake::BakeArguments),
    /// A whole pass steered by the firmware's own code, beside an independent reference
    Rehearse(rehearse::RehearseArguments),
}

impl Command {
    /// Does it.
    ///
    /// # Errors
    /// Whatever keeps it from a result, in words for the user.
    pub fn run(&self) -> anyhow::Result<()> {
        match self {
            Self::Trace(arguments) => trace::run(arguments),
            Self::Contacts(arguments) => contacts::run(arguments),
            Self::Bake(arguments) => bake::run(arguments),
            Self::Rehearse(arguments) => rehearse::run(arguments),
        }
    }
}

/// Where the elements come from.
#[derive(Clone, Debug, clap::Args)]
pub struct ElementArguments {
    /// Two-line element file, with one or many objects
    #[arg(long, value_name = "FILE")]
    pub elements: PathBuf,
    /// Object in the file: its name, a part of it that fits only one, or its catalogue number
    #[arg(long, value_name = "NAME|NUMBER")]
    pub object: Option<String>,
}

/// How results are written.
#[derive(Clone, Copy, Debug, PartialEq, Eq, ValueEnum)]
pub enum Format {
    /// Columns for reading
    Table,
    /// Comma-separated, full precision, one heading line
    Csv,
    /// An array of objects, full precision
    Json,
}

/// Refuses a carrier that is none.
///
/// # Errors
/// With what to give instead.
pub fn check_carrier(hertz: f64) -> anyhow::Result<()> {
    ensure!(
        hertz > 0.0 && hertz <= 1e12,
        "--carrier {hertz} is not a carrier; give hertz above 0 and up to 1e12, such as 437e6"
    );
    Ok(())
}

/// Refuses a UT1 - UTC that cannot be.
///
/// # Errors
/// With the limit.
pub fn check_dut1(seconds: f64) -> anyhow::Result<()> {
    ensure!(seconds.abs() <= 1.0, "--dut1 {seconds} is beyond 1 s; UT1 is kept within 0.9 s of UTC");
    Ok(())
}

/// A warning on standard error.
pub fn warn(text: &str) {
    eprintln!("warning: {text}");
}

/// Rows as columns that line up, numbers to the right.
pub fn table(headings: &[&str], rows: &[Vec<String>]) -> String {
    let mut widths: Vec<usize> = headings.iter().map(|heading| heading.chars().count()).collect();
    for row in rows {
        for (width, cell) in widths.iter_mut().zip(row) {
            *width = (*width).max(cell.chars().count());
        }
    }
    let line = |cells: &mut dyn Iterator<Item = &str>| {
        let padded: Vec<String> =
            cells.zip(&widths).map(|(cell, width)| format!("{cell:>width$}", width = *width)).collect();
        padded.join("  ") + "\n"
    };
    let mut text = line(&mut headings.iter().copied());
    for row in rows {
        text += &line(&mut row.iter().map(String::as_str));
    }
    text
}

/// Writes to standard output; a reader that has seen enough (a closed pipe) is no error.
///
/// # Errors
/// Any other failure to write.
pub fn print(text: &str) -> anyhow::Result<()> {
    use std::io::Write;
    match std::io::stdout().lock().write_all(text.as_bytes()) {
        Err(error) if error.kind() != std::io::ErrorKind::BrokenPipe => Err(error.into()),
        _ => Ok(()),
    }
}
