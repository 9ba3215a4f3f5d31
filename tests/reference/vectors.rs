//! Loader of the committed vectors. The files are compiled in, so that any crate may use them from any folder.

use super::{Site, Vector};

const PASS: &str = include_str!("synthetic_pass.csv");
const PASS_POSITIONS: &str = include_str!("synthetic_pass_positions.csv");
const PASS_GEOMETRIC: &str = include_str!("synthetic_pass_geometric.csv");
const PASS_LATE: &str = include_str!("synthetic_pass_late.csv");
const ORBIT_PASSES: &str = include_str!("orbit_passes.csv");
const ORBIT_POSITIONS: &str = include_str!("orbit_positions.csv");
const ORBIT_VECTORS: &str = include_str!("orbit_vectors.csv");
/// Element lines of every object, each after a line with its name.
pub const ELEMENTS: &str = include_str!("orbits.txt");

/// The object of `synthetic_pass*.csv`.
pub const SYNTHETIC: u32 = 90001;
/// Its epoch, t = 0.
pub const SYNTHETIC_EPOCH_UTC: &str = "2026-06-01T12:00:00Z";
/// Its site.
pub const SYNTHETIC_SITE: Site = Site { latitude_deg: 45.0, longitude_deg: 7.5, height_m: 300.0 };

/// A comma-separated file with one header line.
pub struct Table {
    names: Vec<&'static str>,
    rows: Vec<Vec<&'static str>>,
}

impl Table {
    /// Panics when a row's width differs from the header's.
    pub fn parse(text: &'static str) -> Self {
        let mut lines = text.lines();
        let names: Vec<_> = lines.next().expect("a header").split(',').collect();
        let rows: Vec<Vec<_>> = lines.map(|line| line.split(',').collect()).collect();
        assert!(!rows.is_empty() && rows.iter().all(|row| row.len() == names.len()), "a damaged vector file");
        Self { names, rows }
    }

    /// The rows of one object only; panics when there are none.
    pub fn of(self, object: u32) -> Self {
        let (column, wanted) = (self.index("object"), object.to_string());
        let rows: Vec<_> = self.rows.into_iter().filter(|row| row[column] == wanted).collect();
        assert!(!rows.is_empty(), "no rows of object {object}");
        Self { names: self.names, rows }
    }

    fn index(&self, name: &str) -> usize {
        self.names.iter().position(|n| *n == name).unwrap_or_else(|| panic!("no column {name}"))
    }

    pub fn text(&self, name: &str) -> Vec<&'static str> {
        let column = self.index(name);
        self.rows.iter().map(|row| row[column]).collect()
    }

    pub fn column(&self, name: &str) -> Vec<f64> {
        self.text(name).iter().map(|cell| cell.parse().expect("a number")).collect()
    }
}

/// 340 to 1090 s by 2.5 s, all taggings: `t_s`, `elevation_deg`, `{tag}_delay_s`, `{tag}_rapidity`, `{tag}_shift_hz`.
pub fn synthetic_pass() -> Table {
    Table::parse(PASS)
}

/// By 10 s: `t_s`, `elevation_deg`, `azimuth_deg`, `range_m`, `range_rate_m_s`, `derived_range_rate_m_s`.
pub fn synthetic_pass_geometric() -> Table {
    Table::parse(PASS_GEOMETRIC)
}

/// Late in orbit, downlink at reception: `t_s`, `{late_1|late_3|early_2}_delay_s`, `.._rapidity`.
pub fn synthetic_pass_late() -> Table {
    Table::parse(PASS_LATE)
}

/// Downlink at reception and uplink at transmission of one of the objects of [`orbit_passes`].
pub fn orbit_vectors(object: u32) -> Table {
    Table::parse(ORBIT_VECTORS).of(object)
}

/// A pass of `orbit_passes.csv`; times in s after `epoch_utc`.
#[derive(Clone, Copy, Debug)]
pub struct OrbitPass {
    pub object: u32,
    pub epoch_utc: &'static str,
    pub site: Site,
    pub rise: f64,
    pub set: f64,
    pub first: f64,
    pub last: f64,
}

pub fn orbit_passes() -> Vec<OrbitPass> {
    let table = Table::parse(ORBIT_PASSES);
    let (object, epoch) = (table.column("object"), table.text("epoch_utc"));
    let (lat, lon, height) =
        (table.column("latitude_deg"), table.column("longitude_deg"), table.column("height_m"));
    let (rise, set) = (table.column("rise_s"), table.column("set_s"));
    let (first, last) = (table.column("first_s"), table.column("last_s"));
    (0..object.len())
        .map(|k| OrbitPass {
            object: object[k] as u32,
            epoch_utc: epoch[k],
            site: Site { latitude_deg: lat[k], longitude_deg: lon[k], height_m: height[k] },
            rise: rise[k],
            set: set[k],
            first: first[k],
            last: last[k],
        })
        .collect()
}

/// The two element lines of an object.
pub fn element_lines(object: u32) -> [&'static str; 2] {
    let start = format!("1 {object:05}U");
    let mut lines = ELEMENTS.lines().skip_while(|line| !line.starts_with(&start));
    [lines.next().expect("the object"), lines.next().expect("its second line")]
}

/// Earth-fixed positions, m, evenly spaced in time.
#[derive(Clone, Debug)]
pub struct Grid {
    pub start: f64,
    pub step: f64,
    pub positions: Vec<Vector>,
}

impl Grid {
    fn new(table: &Table) -> Self {
        let (t, x, y, z) =
            (table.column("t_s"), table.column("x_m"), table.column("y_m"), table.column("z_m"));
        let step = t[1] - t[0];
        assert!(t.windows(2).all(|pair| pair[1] - pair[0] == step), "positions must be evenly spaced");
        Self { start: t[0], step, positions: (0..t.len()).map(|k| [x[k], y[k], z[k]]).collect() }
    }

    pub fn end(&self) -> f64 {
        self.start + self.step * (self.positions.len() - 1) as f64
    }

    /// Interpolation through the ten points round `t`; panics outside the grid.
    pub fn at(&self, t: f64) -> Vector {
        const POINTS: usize = 10;
        assert!(t >= self.start && t <= self.end(), "{t} is outside {}..{}", self.start, self.end());
        let place = (t - self.start) / self.step;
        let last = self.positions.len() - POINTS;
        let first = (place.floor() as usize).saturating_sub(POINTS / 2 - 1).min(last);
        let x = place - first as f64;
        let mut sum = [0.0; 3];
        for j in 0..POINTS {
            let weight: f64 =
                (0..POINTS).filter(|k| *k != j).map(|k| (x - k as f64) / (j as f64 - k as f64)).product();
            for (axis, total) in sum.iter_mut().enumerate() {
                *total += weight * self.positions[first + j][axis];
            }
        }
        sum
    }
}

/// Positions of the synthetic pass (0.5 s apart) or of one of the objects of [`orbit_passes`].
pub fn positions(object: u32) -> Grid {
    if object == SYNTHETIC {
        Grid::new(&Table::parse(PASS_POSITIONS))
    } else {
        Grid::new(&Table::parse(ORBIT_POSITIONS).of(object))
    }
}
