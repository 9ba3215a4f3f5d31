//! Three-component vectors in metres or metres per second.

use std::ops::{Add, Mul, Neg, Sub};

/// A vector in a right-handed Cartesian frame.
#[derive(Clone, Copy, Debug, PartialEq, Default)]
pub struct Vector {
    /// First component.
    pub x: f64,
    /// Second component.
    pub y: f64,
    /// Third component.
    pub z: f64,
}

impl Vector {
    /// From its components.
    pub const fn new(x: f64, y: f64, z: f64) -> Self {
        Self { x, y, z }
    }

    /// Scalar product.
    pub fn dot(self, other: Self) -> f64 {
        self.x * other.x + self.y * other.y + self.z * other.z
    }

    /// Length.
    pub fn length(self) -> f64 {
        self.dot(self).sqrt()
    }

    /// Turned about the third axis by `angle` radians, counterclockwise seen from its tip.
    pub fn turned_about_z(self, angle: f64) -> Self {
        let (sine, cosine) = angle.sin_cos();
        Self::new(cosine * self.x - sine * self.y, sine * self.x + cosine * self.y, self.z)
    }

    /// Velocity of this point in a frame that turns about the third axis at `rate` rad/s.
    pub fn swept_about_z(self, rate: f64) -> Self {
        Self::new(-rate * self.y, rate * self.x, 0.0)
    }
}

impl Add for Vector {
    type Output = Self;
    fn add(self, other: Self) -> Self {
        Self::new(self.x + other.x, self.y + other.y, self.z + other.z)
    }
}

impl Sub for Vector {
    type Output = Self;
    fn sub(self, other: Self) -> Self {
        Self::new(self.x - other.x, self.y - other.y, self.z - other.z)
    }
}

impl Neg for Vector {
    type Output = Self;
    fn neg(self) -> Self {
        Self::new(-self.x, -self.y, -self.z)
    }
}

impl Mul<f64> for Vector {
    type Output = Self;
    fn mul(self, factor: f64) -> Self {
        Self::new(self.x * factor, self.y * factor, self.z * factor)
    }
}

/// Position and velocity.
#[derive(Clone, Copy, Debug, PartialEq, Default)]
pub struct State {
    /// Position, m.
    pub position: Vector,
    /// Velocity, m/s.
    pub velocity: Vector,
}
