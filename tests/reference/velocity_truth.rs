//! Passes and noise for the tests of the velocity filter, in f64 and independent of the crate.

use std::f64::consts::PI;

/// Speed of light, m/s.
pub const LIGHT: f64 = 299_792_458.0;

/// Range rate of a pass over time.
pub trait Pass {
    /// m/s at `t` seconds, positive = receding.
    fn range_rate(&self, t: f64) -> f64;
}

/// The synthetic pass of the check values, as Chebyshev series (velocity_pass.py made them).
pub struct Synthetic(Vec<(f64, f64, Vec<f64>)>);

impl Synthetic {
    pub fn load() -> Self {
        let rows = include_str!("velocity_pass.csv").lines().map(|line| {
            let row: Vec<f64> = line.split(',').map(|cell| cell.parse().unwrap()).collect();
            (row[0], row[1], row[2..].to_vec())
        });
        Self(rows.collect())
    }
}

impl Pass for Synthetic {
    fn range_rate(&self, t: f64) -> f64 {
        let (start, length, series) =
            self.0.iter().rev().find(|segment| segment.0 <= t).unwrap_or(&self.0[0]);
        let x = 2.0 * (t - start) / length - 1.0;
        let (mut one, mut two) = (0.0, 0.0);
        for coefficient in series.iter().skip(1).rev() {
            (one, two) = (2.0 * x * one - two + coefficient, one);
        }
        x * one - two + series[0]
    }
}

/// A circular orbit over a turning sphere: closest approach near t = 0.
pub struct Circular {
    pub height: f64,
    pub inclination: f64,
    /// Angle at the Earth's centre between the ground track and the site, rad.
    pub offset: f64,
    /// Latitude argument at t = 0, rad.
    pub argument: f64,
}

impl Circular {
    fn line(&self, t: f64) -> [f64; 3] {
        let radius = 6_371_000.0 + self.height;
        let rate = (3.986004418e14 / radius.powi(3)).sqrt();
        // Satellite in a frame that turns with the Earth and is aligned with the inertial one at 0.
        let place = |u: f64, turn: f64| {
            let (node, height) = (u.cos(), u.sin());
            let (x, y, z) = (node, height * self.inclination.cos(), height * self.inclination.sin());
            [x * turn.cos() + y * turn.sin(), -x * turn.sin() + y * turn.cos(), z]
        };
        let satellite = place(self.argument + rate * t, 7.292115e-5 * t);
        // The site: below the satellite at t = 0, moved along the orbit's normal by the offset.
        let below = place(self.argument, 0.0);
        let normal = [0.0, -self.inclination.sin(), self.inclination.cos()];
        let mut line = [0.0; 3];
        for axis in 0..3 {
            let site = below[axis] * self.offset.cos() + normal[axis] * self.offset.sin();
            line[axis] = radius * satellite[axis] - 6_371_000.0 * site;
        }
        line
    }

    fn range(&self, t: f64) -> f64 {
        self.line(t).iter().map(|part| part * part).sum::<f64>().sqrt()
    }
}

impl Pass for Circular {
    fn range_rate(&self, t: f64) -> f64 {
        // Central differences, 4th order; rounding 1e-9 / 0.05, truncation below 1e-6 m/s.
        let h = 0.05;
        (8.0 * (self.range(t + h) - self.range(t - h)) - (self.range(t + 2.0 * h) - self.range(t - 2.0 * h)))
            / (12.0 * h)
    }
}

/// A seeded generator (SplitMix64).
pub struct Noise(pub u64);

impl Noise {
    /// Evenly between 0 and 1, both excluded.
    pub fn even(&mut self) -> f64 {
        self.0 = self.0.wrapping_add(0x9E37_79B9_7F4A_7C15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94D0_49BB_1331_11EB);
        z ^= z >> 31;
        ((z >> 11) as f64 + 0.5) / (1u64 << 53) as f64
    }

    /// Normal, mean 0, standard deviation 1.
    pub fn normal(&mut self) -> f64 {
        (-2.0 * self.even().ln()).sqrt() * (2.0 * PI * self.even()).cos()
    }

    /// An outlier: +100 or -100 m/s on one estimate in twenty, 0 on the others.
    pub fn outlier(&mut self) -> f64 {
        let (hit, sign) = (self.even() < 0.05, self.even() < 0.5);
        if !hit {
            0.0
        } else if sign {
            100.0
        } else {
            -100.0
        }
    }
}
