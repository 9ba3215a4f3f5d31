//! The columns of one element set.

use super::{ElementSet, epoch};

/// What is wrong with an element line, and what to do about it.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum LineError {
    /// Not 69 columns.
    #[error("the line has {found} columns, an element line has 69; copy it again, with all of its spaces")]
    Length {
        /// Columns found.
        found: usize,
    },
    /// The checksum does not fit.
    #[error(
        "the checksum in column 69 is {found}, the other 68 columns give {computed}; a digit was changed, \
         fetch the elements again"
    )]
    Checksum {
        /// The line's own.
        found: u32,
        /// That of its first 68 columns.
        computed: u32,
    },
    /// Something else where a number belongs.
    #[error(
        "'{found}' stands in columns {first} to {last} where the {field} belongs: expected {expected}; \
         fetch the elements again"
    )]
    Field {
        /// What the columns hold.
        field: &'static str,
        /// First column, counted from 1.
        first: usize,
        /// Last column.
        last: usize,
        /// What stands there.
        found: String,
        /// What should.
        expected: &'static str,
    },
    /// A character between two fields.
    #[error(
        "column {column} holds '{found}' where a space belongs; the columns have slipped, copy the line again"
    )]
    NotASpace {
        /// The column, counted from 1.
        column: usize,
        /// What stands there.
        found: char,
    },
    /// The lines are of two objects.
    #[error(
        "this line is of object {second:05}, the line before it of {first:05}; put the pair together again"
    )]
    TwoObjects {
        /// Number on the first line.
        first: u32,
        /// Number on the second line.
        second: u32,
    },
    /// Line 1 is alone.
    #[error("a line 1 without its line 2 below it; add the missing line")]
    FirstWithoutSecond,
    /// Line 2 is alone.
    #[error("a line 2 without its line 1 above it; add the missing line")]
    SecondWithoutFirst,
}

/// One line as characters, so that columns are columns whatever the text holds.
struct Columns(Vec<char>);

/// Where a field stands (columns from 1, both ends included) and what it is called.
type Place = (usize, usize, &'static str);

impl Columns {
    fn new(line: &str, spaces: &[usize]) -> Result<Self, LineError> {
        let columns = Self(line.chars().collect());
        if columns.0.len() != 69 {
            return Err(LineError::Length { found: columns.0.len() });
        }
        match spaces.iter().find(|&&column| columns.0[column - 1] != ' ') {
            Some(&column) => Err(LineError::NotASpace { column, found: columns.0[column - 1] }),
            None => Ok(columns),
        }
    }

    fn text(&self, (first, last, _): Place) -> String {
        self.0[first - 1..last].iter().collect()
    }

    fn wrong(&self, place: Place, expected: &'static str) -> LineError {
        let (first, last, field) = place;
        LineError::Field { field, first, last, found: self.text(place).trim().to_string(), expected }
    }

    /// Digits with leading spaces; all spaces are zero.
    fn digits(&self, place: Place) -> Result<u32, LineError> {
        let text = self.text(place);
        let digits = text.trim();
        match digits {
            "" => Ok(0),
            _ if digits.bytes().all(|byte| byte.is_ascii_digit()) => {
                digits.parse().map_err(|_| self.wrong(place, "fewer digits"))
            }
            _ => Err(self.wrong(place, "digits")),
        }
    }

    /// A decimal fraction with its point, and a sign in front if it has one.
    fn decimal(&self, place: Place, least: f64, most: f64, range: &'static str) -> Result<f64, LineError> {
        let text = self.text(place);
        let shape = text.trim().trim_start_matches(['+', '-']);
        let plain = shape.bytes().all(|byte| byte.is_ascii_digit() || byte == b'.') && shape.contains('.');
        let value: f64 = match (plain, text.trim().parse()) {
            (true, Ok(value)) => value,
            _ => return Err(self.wrong(place, "a decimal number")),
        };
        if (least..=most).contains(&value) { Ok(value) } else { Err(self.wrong(place, range)) }
    }

    /// Sign, five digits after an unwritten point, and a signed power of ten: ` 12345-3` is 0.12345e-3.
    fn power(&self, place: Place) -> Result<f64, LineError> {
        let (first, last, field) = place;
        let wrong = || self.wrong(place, "five digits and a power of ten such as 12345-3");
        let mantissa = self.text((first, last - 2, field));
        let exponent = self.text((last - 1, last, field));
        let digits = mantissa.trim().trim_start_matches(['+', '-']).replace(' ', "0");
        if !digits.bytes().all(|byte| byte.is_ascii_digit()) {
            return Err(wrong());
        }
        let whole: f64 = if digits.is_empty() { 0.0 } else { digits.parse().map_err(|_| wrong())? };
        let power: i32 = exponent.trim().parse().map_err(|_| wrong())?;
        let sign = if mantissa.trim_start().starts_with('-') { -1.0 } else { 1.0 };
        Ok(sign * whole / 10f64.powi(digits.len() as i32) * 10f64.powi(power))
    }

    fn number(&self) -> Result<u32, LineError> {
        let place = (3, 7, "catalogue number");
        catalogue_number(self.text(place).trim()).ok_or_else(|| {
            self.wrong(place, "five digits, or a capital letter other than I and O and four digits")
        })
    }

    fn checksum(&self) -> Result<(), LineError> {
        let found = self.0[68].to_digit(10).ok_or_else(|| self.wrong((69, 69, "checksum"), "a digit"))?;
        let value = |&column: &char| if column == '-' { 1 } else { column.to_digit(10).unwrap_or(0) };
        let computed = self.0[..68].iter().map(value).sum::<u32>() % 10;
        if found == computed { Ok(()) } else { Err(LineError::Checksum { found, computed }) }
    }
}

/// A catalogue number: up to nine digits, or Alpha-5 (a letter for ten to thirty-three, then four digits).
pub(super) fn catalogue_number(text: &str) -> Option<u32> {
    let mut rest = text.chars();
    match rest.next()?.to_ascii_uppercase() {
        letter if letter.is_ascii_alphabetic() && letter != 'I' && letter != 'O' => {
            let digits = rest.as_str();
            let skipped = u32::from(letter > 'I') + u32::from(letter > 'O');
            let leading = u32::from(letter) - u32::from('A') + 10 - skipped;
            let plain = digits.len() == 4 && digits.bytes().all(|byte| byte.is_ascii_digit());
            if plain { Some(leading * 10_000 + digits.parse::<u32>().ok()?) } else { None }
        }
        _ if text.len() <= 9 && text.bytes().all(|byte| byte.is_ascii_digit()) => text.parse().ok(),
        _ => None,
    }
}

/// One element set from its two lines, each with its place in the file.
pub(super) fn element_set(
    name: Option<String>,
    (top_at, top): (usize, &str),
    (low_at, low): (usize, &str),
) -> Result<ElementSet, (usize, LineError)> {
    let above = |reason| (top_at, reason);
    let below = |reason| (low_at, reason);
    let (number, epoch, mut mean) = first_line(top).map_err(above)?;
    let second = second_line(low, &mut mean).map_err(below)?;
    if second != number {
        return Err(below(LineError::TwoObjects { first: number, second }));
    }
    mean.object_name = name.clone();
    Ok(ElementSet { name, number, line: top_at, epoch, mean })
}

fn first_line(line: &str) -> Result<(u32, chrono::DateTime<chrono::Utc>, sgp4::Elements), LineError> {
    let columns = Columns::new(line, &[2, 9, 18, 33, 44, 53, 62, 64])?;
    let number = columns.number()?;
    let year = columns.digits((19, 20, "epoch year"))?;
    let day_place = (21, 23, "epoch day");
    let day = columns.digits(day_place)?;
    let fraction_place = (24, 32, "fraction of the epoch day");
    let fraction = columns.text(fraction_place);
    let digits = fraction.strip_prefix('.').unwrap_or("").trim_end();
    if digits.is_empty() || !digits.bytes().all(|byte| byte.is_ascii_digit()) {
        return Err(columns.wrong(fraction_place, "a point and eight digits"));
    }
    let parts: u32 = format!("{digits:0<8}").parse().map_err(|_| columns.wrong(fraction_place, "digits"))?;
    let epoch =
        epoch(year, day, parts).ok_or_else(|| columns.wrong(day_place, "a day of that year, 1 to 366"))?;
    let rate = columns.decimal((34, 43, "rate of the mean motion"), -9.0, 9.0, "a number below 1")?;
    let mean = sgp4::Elements {
        object_name: None,
        international_designator: None,
        norad_id: u64::from(number),
        classification: sgp4::Classification::Unclassified,
        datetime: epoch.naive_utc(),
        mean_motion_dot: rate,
        mean_motion_ddot: columns.power((45, 52, "second rate of the mean motion"))?,
        drag_term: columns.power((54, 61, "drag term"))?,
        element_set_number: u64::from(columns.digits((65, 68, "element set number"))?),
        inclination: 0.0,
        right_ascension: 0.0,
        eccentricity: 0.0,
        argument_of_perigee: 0.0,
        mean_anomaly: 0.0,
        mean_motion: 0.0,
        revolution_number: 0,
        ephemeris_type: columns.digits((63, 63, "ephemeris type"))? as u8,
    };
    columns.checksum()?;
    Ok((number, epoch, mean))
}

fn second_line(line: &str, mean: &mut sgp4::Elements) -> Result<u32, LineError> {
    let columns = Columns::new(line, &[2, 8, 17, 26, 34, 43, 52])?;
    let number = columns.number()?;
    let turn = "degrees from 0 to 360";
    mean.inclination = columns.decimal((9, 16, "inclination"), 0.0, 180.0, "degrees from 0 to 180")?;
    mean.right_ascension = columns.decimal((18, 25, "right ascension of the node"), 0.0, 360.0, turn)?;
    mean.eccentricity = f64::from(columns.digits((27, 33, "eccentricity"))?) / 1e7;
    mean.argument_of_perigee = columns.decimal((35, 42, "argument of perigee"), 0.0, 360.0, turn)?;
    mean.mean_anomaly = columns.decimal((44, 51, "mean anomaly"), 0.0, 360.0, turn)?;
    let place = (53, 63, "mean motion");
    mean.mean_motion = columns.decimal(place, 1e-8, 18.0, "revolutions a day, above 0 and below 18")?;
    mean.revolution_number = u64::from(columns.digits((64, 68, "revolution number"))?);
    columns.checksum()?;
    Ok(number)
}
