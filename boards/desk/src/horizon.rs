//! What a site sees: a least elevation, and a mask of hills and houses.

use std::f64::consts::TAU;
use std::path::Path;

/// Why a horizon mask could not be used.
#[derive(Debug, thiserror::Error)]
#[non_exhaustive]
pub enum HorizonError {
    /// The file cannot be opened or read.
    #[error("cannot read the horizon mask {file}: {source}; check the path")]
    Unreadable {
        /// The file.
        file: String,
        /// What the system said.
        source: std::io::Error,
    },
    /// A line is wrong.
    #[error(
        "{file}, line {line}: '{found}' is not a point of a horizon mask; write AZIMUTH,ELEVATION in degrees, \
         azimuth 0 to 360 from north over east, elevation -90 to 90"
    )]
    Point {
        /// The file.
        file: String,
        /// Its line, counted from 1.
        line: usize,
        /// What stands there.
        found: String,
    },
    /// Two elevations at one azimuth.
    #[error("{file} gives two elevations for azimuth {azimuth} degrees; leave one of them")]
    Twice {
        /// The file.
        file: String,
        /// The azimuth in degrees.
        azimuth: f64,
    },
    /// No points.
    #[error("{file} holds no points; a horizon mask has lines of AZIMUTH,ELEVATION in degrees")]
    Empty {
        /// The file.
        file: String,
    },
    /// Not an elevation.
    #[error("a least elevation of {degrees} degrees makes no sense; give -90 to 90")]
    LeastElevation {
        /// What was given.
        degrees: f64,
    },
}

/// The elevation above which a site sees the sky.
#[derive(Clone, Debug, PartialEq)]
pub struct Horizon {
    least: f64,
    /// Azimuth and elevation in rad, by azimuth; straight lines between, round the circle.
    mask: Vec<(f64, f64)>,
}

impl Horizon {
    /// The same elevation all round, in degrees.
    ///
    /// # Errors
    /// When it is not between -90 and 90.
    pub fn flat(degrees: f64) -> Result<Self, HorizonError> {
        if !(-90.0..=90.0).contains(&degrees) {
            return Err(HorizonError::LeastElevation { degrees });
        }
        Ok(Self { least: degrees.to_radians(), mask: Vec::new() })
    }

    /// With a mask from a file: lines of `azimuth,elevation` in degrees, in any order; `#` starts a comment.
    ///
    /// # Errors
    /// When the file cannot be read or a line is no point.
    pub fn with_mask_file(self, path: &Path) -> Result<Self, HorizonError> {
        let file = path.display().to_string();
        match std::fs::read_to_string(path) {
            Ok(text) => self.with_mask(&file, &text),
            Err(source) => Err(HorizonError::Unreadable { file, source }),
        }
    }

    /// With a mask from text; `file` is what messages call it.
    ///
    /// # Errors
    /// As [`Horizon::with_mask_file`].
    pub fn with_mask(mut self, file: &str, text: &str) -> Result<Self, HorizonError> {
        let file = file.to_string();
        let mut points: Vec<(f64, f64)> = Vec::new();
        for (index, raw) in text.lines().enumerate() {
            let content = raw.split('#').next().unwrap_or("").trim();
            if content.is_empty() {
                continue;
            }
            let point = point(content).ok_or_else(|| HorizonError::Point {
                file: file.clone(),
                line: index + 1,
                found: content.into(),
            })?;
            points.push(point);
        }
        points.sort_by(|a, b| a.0.total_cmp(&b.0));
        if points.is_empty() {
            return Err(HorizonError::Empty { file });
        }
        if let Some(pair) = points.windows(2).find(|pair| pair[0].0 == pair[1].0) {
            return Err(HorizonError::Twice { file, azimuth: pair[0].0.to_degrees() });
        }
        self.mask = points;
        Ok(self)
    }

    /// The elevation to be above at an azimuth, both rad.
    pub fn elevation(&self, azimuth: f64) -> f64 {
        let (Some(first), Some(last)) = (self.mask.first(), self.mask.last()) else { return self.least };
        let azimuth = azimuth.rem_euclid(TAU);
        let next = self.mask.partition_point(|point| point.0 <= azimuth);
        let (left, right) = match (next.checked_sub(1).and_then(|at| self.mask.get(at)), self.mask.get(next))
        {
            (Some(left), Some(right)) => (*left, *right),
            (Some(left), None) => (*left, (first.0 + TAU, first.1)),
            (None, Some(right)) => ((last.0 - TAU, last.1), *right),
            (None, None) => (*first, *last),
        };
        let share = if right.0 > left.0 { (azimuth - left.0) / (right.0 - left.0) } else { 0.0 };
        (left.1 + share * (right.1 - left.1)).max(self.least)
    }

    /// The lowest elevation anywhere, rad.
    pub fn lowest(&self) -> f64 {
        let of_mask = self.mask.iter().map(|point| point.1).fold(f64::INFINITY, f64::min);
        if self.mask.is_empty() { self.least } else { of_mask.max(self.least) }
    }

    /// The highest elevation anywhere, rad.
    pub fn highest(&self) -> f64 {
        self.mask.iter().map(|point| point.1).fold(self.least, f64::max)
    }
}

/// Azimuth in [0, 2 pi) and elevation, rad.
fn point(text: &str) -> Option<(f64, f64)> {
    let (azimuth, elevation) = text.split_once(',')?;
    let azimuth: f64 = azimuth.trim().parse().ok()?;
    let elevation: f64 = elevation.trim().parse().ok()?;
    let fits = (0.0..=360.0).contains(&azimuth) && (-90.0..=90.0).contains(&elevation);
    // 360 is 0 again; a mask that names both, with one elevation, closes the circle with a point too many.
    fits.then(|| (if azimuth == 360.0 { TAU } else { azimuth.to_radians() }, elevation.to_radians()))
}
