//! Two-line element files: one or many objects, with or without name lines.
//!
//! Every digit is checked before it is used: length, columns, checksum, ranges. A message names the file,
//! the line, what is wrong with it and what to do.

use chrono::{DateTime, NaiveDate, TimeDelta, Utc};
use std::path::Path;

mod lines;
pub use lines::LineError;

/// One element set of one object.
#[derive(Clone, Debug, PartialEq)]
pub struct ElementSet {
    /// The name line above the elements, if there was one.
    pub name: Option<String>,
    /// Catalogue number; Alpha-5 letters are already turned into digits.
    pub number: u32,
    /// Where the first element line stands in its file, counted from 1.
    pub line: usize,
    /// UTC epoch of the elements.
    pub epoch: DateTime<Utc>,
    /// The mean elements as SGP4 takes them.
    pub mean: sgp4::Elements,
}

impl ElementSet {
    /// The name if there is one, else the catalogue number.
    pub fn label(&self) -> String {
        self.name.clone().unwrap_or_else(|| format!("{:05}", self.number))
    }
}

/// Why an element file could not be used.
#[derive(Debug, thiserror::Error)]
#[non_exhaustive]
pub enum ElementsError {
    /// The file cannot be opened or read.
    #[error("cannot read the element file {file}: {source}; check the path")]
    Unreadable {
        /// The file.
        file: String,
        /// What the system said.
        source: std::io::Error,
    },
    /// A line is wrong.
    #[error("{file}, line {line}: {reason}")]
    Line {
        /// The file.
        file: String,
        /// Its line, counted from 1.
        line: usize,
        /// What is wrong and what to do.
        reason: LineError,
    },
    /// There are no elements in it.
    #[error("{file} holds no element sets; it needs pairs of lines that start with '1 ' and '2 '")]
    Empty {
        /// The file.
        file: String,
    },
    /// Several objects and none chosen.
    #[error("{file} holds {count} objects ({some}); choose one with --object NAME or --object NUMBER")]
    Undecided {
        /// The file.
        file: String,
        /// How many there are.
        count: usize,
        /// The first few of them.
        some: String,
    },
    /// No such object.
    #[error("{file} holds no object '{wanted}'; it holds {some}")]
    Unknown {
        /// The file.
        file: String,
        /// What was asked for.
        wanted: String,
        /// The first few that are there.
        some: String,
    },
    /// A part of a name that fits several objects.
    #[error("'{wanted}' fits {count} objects in {file} ({some}); give the whole name or the number")]
    Ambiguous {
        /// The file.
        file: String,
        /// What was asked for.
        wanted: String,
        /// How many fit.
        count: usize,
        /// The first few of them.
        some: String,
    },
}

/// The element sets of one file, in its order.
#[derive(Clone, Debug)]
pub struct ElementFile {
    file: String,
    sets: Vec<ElementSet>,
}

impl ElementFile {
    /// Reads a file; Windows and Unix line ends, blank lines and lines that start with `#` are all right.
    ///
    /// # Errors
    /// The first thing wrong with it, with its line.
    pub fn open(path: &Path) -> Result<Self, ElementsError> {
        let file = path.display().to_string();
        match std::fs::read(path) {
            Ok(bytes) => Self::read(&file, &String::from_utf8_lossy(&bytes)),
            Err(source) => Err(ElementsError::Unreadable { file, source }),
        }
    }

    /// Reads text; `file` is what messages call it.
    ///
    /// # Errors
    /// As [`ElementFile::open`].
    pub fn read(file: &str, text: &str) -> Result<Self, ElementsError> {
        let failed = |line: usize, reason| ElementsError::Line { file: file.to_string(), line, reason };
        let mut sets = Vec::new();
        let mut name: Option<String> = None;
        let mut first: Option<(usize, &str)> = None;
        for (index, raw) in text.trim_start_matches('\u{feff}').lines().enumerate() {
            let number = index + 1;
            let line = raw.trim_end();
            if line.trim().is_empty() || line.starts_with('#') {
                continue;
            }
            match (line.starts_with("1 "), line.starts_with("2 "), first.take()) {
                (true, _, None) => first = Some((number, line)),
                (_, true, Some(top)) => sets.push(
                    lines::element_set(name.take(), top, (number, line))
                        .map_err(|(line, reason)| failed(line, reason))?,
                ),
                (_, true, None) => return Err(failed(number, LineError::SecondWithoutFirst)),
                (_, _, Some((top, _))) => return Err(failed(top, LineError::FirstWithoutSecond)),
                (false, false, None) => {
                    name = Some(line.strip_prefix("0 ").unwrap_or(line).trim().to_string());
                }
            }
        }
        if let Some((top, _)) = first {
            return Err(failed(top, LineError::FirstWithoutSecond));
        }
        if sets.is_empty() {
            return Err(ElementsError::Empty { file: file.to_string() });
        }
        Ok(Self { file: file.to_string(), sets })
    }

    /// All sets, in the file's order.
    pub fn sets(&self) -> &[ElementSet] {
        &self.sets
    }

    /// One set of each object, in order of appearance: the one whose epoch is nearest to `time`.
    pub fn objects(&self, time: DateTime<Utc>) -> Vec<&ElementSet> {
        let away = |set: &ElementSet| (set.epoch - time).abs();
        let mut chosen: Vec<&ElementSet> = Vec::new();
        let mut place = std::collections::HashMap::new();
        for set in &self.sets {
            let at = *place.entry(set.number).or_insert_with(|| {
                chosen.push(set);
                chosen.len() - 1
            });
            if away(set) < away(chosen[at]) {
                chosen[at] = set;
            }
        }
        chosen
    }

    /// The object called `wanted` (its whole name, its number, or a part of its name that fits only one;
    /// capitals do not matter), by the element set whose epoch is nearest to `time`.
    ///
    /// # Errors
    /// When none or several fit, or when nothing is asked for and there are several objects.
    pub fn choose(&self, wanted: Option<&str>, time: DateTime<Utc>) -> Result<&ElementSet, ElementsError> {
        let objects = self.objects(time);
        let file = || self.file.clone();
        let Some(wanted) = wanted.map(str::trim) else {
            return match objects.as_slice() {
                [only] => Ok(only),
                many => {
                    Err(ElementsError::Undecided { file: file(), count: many.len(), some: some_of(many) })
                }
            };
        };
        let capitals = wanted.to_uppercase();
        let named = |set: &&&ElementSet| set.name.as_ref().map(|name| name.to_uppercase());
        let number = lines::catalogue_number(wanted);
        let groups: [Vec<&ElementSet>; 3] = [
            objects.iter().filter(|set| named(set).as_deref() == Some(capitals.as_str())).copied().collect(),
            objects.iter().filter(|set| Some(set.number) == number).copied().collect(),
            objects
                .iter()
                .filter(|set| named(set).is_some_and(|name| !capitals.is_empty() && name.contains(&capitals)))
                .copied()
                .collect(),
        ];
        match groups.into_iter().find(|group| !group.is_empty()).as_deref() {
            Some([only]) => Ok(only),
            Some(many) => Err(ElementsError::Ambiguous {
                file: file(),
                wanted: wanted.to_string(),
                count: many.len(),
                some: some_of(many),
            }),
            None => Err(ElementsError::Unknown {
                file: file(),
                wanted: wanted.to_string(),
                some: some_of(&objects),
            }),
        }
    }
}

/// The first few objects, for a message.
fn some_of(sets: &[&ElementSet]) -> String {
    let mut text: Vec<String> = sets
        .iter()
        .take(6)
        .map(|set| match &set.name {
            Some(name) => format!("{name} ({:05})", set.number),
            None => format!("{:05}", set.number),
        })
        .collect();
    if sets.len() > 6 {
        text.push(format!("and {} more", sets.len() - 6));
    }
    text.join(", ")
}

/// The epoch of a two-digit year and a day with eight fraction digits, exact to a nanosecond.
fn epoch(year: u32, day: u32, fraction_of_1e8: u32) -> Option<DateTime<Utc>> {
    let year = if year < 57 { 2000 + year } else { 1900 + year };
    let midnight = NaiveDate::from_yo_opt(year as i32, day)?.and_hms_opt(0, 0, 0)?.and_utc();
    midnight.checked_add_signed(TimeDelta::nanoseconds(i64::from(fraction_of_1e8) * 864_000))
}
