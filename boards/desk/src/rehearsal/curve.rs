//! A motion held as polynomials, so that it can be asked at millions of instants.
//!
//! Pieces of 8 s, 16 Chebyshev nodes each: what the model says between the nodes is met to the noise of the model
//! itself, and [`Curve::largest_departure`] measures that against the model asked directly.

use std::f64::consts::PI;

/// Nodes of a piece.
const NODES: usize = 16;
/// Length of a piece, s.
const PIECE: f64 = 8.0;

/// Delay in seconds and rapidity over time in seconds.
#[derive(Clone, Debug)]
pub struct Curve {
    first: f64,
    pieces: Vec<[[f64; NODES]; 2]>,
}

impl Curve {
    /// Holds `model` (time to delay and rapidity) from `from` to `to`.
    ///
    /// # Errors
    /// The model's own.
    pub fn hold<E>(from: f64, to: f64, mut model: impl FnMut(f64) -> Result<[f64; 2], E>) -> Result<Self, E> {
        let count = ((to - from) / PIECE).floor() as usize + 1;
        let mut pieces = Vec::with_capacity(count);
        for piece in 0..count {
            let middle = from + (piece as f64 + 0.5) * PIECE;
            let mut values = [[0.0; NODES]; 2];
            let [delays, rapidities] = &mut values;
            for (node, (delay, rapidity)) in delays.iter_mut().zip(rapidities).enumerate() {
                let place = (PI * (node as f64 + 0.5) / NODES as f64).cos();
                [*delay, *rapidity] = model(middle + PIECE / 2.0 * place)?;
            }
            pieces.push(values.map(|values| series(&values)));
        }
        Ok(Self { first: from, pieces })
    }

    /// Delay and rapidity at a time.
    pub fn at(&self, t: f64) -> [f64; 2] {
        let place = (t - self.first) / PIECE;
        let piece = (place as usize).min(self.pieces.len() - 1);
        let x = 2.0 * (place - piece as f64) - 1.0;
        self.pieces[piece].map(|series| evaluate(&series, x))
    }

    /// Delay at a time.
    pub fn delay(&self, t: f64) -> f64 {
        self.at(t)[0]
    }

    /// Largest departure of delay and rapidity from `model`, asked directly at `count` instants between `from`
    /// and `to` that are no nodes.
    ///
    /// # Errors
    /// The model's own.
    pub fn largest_departure<E>(
        &self,
        (from, to): (f64, f64),
        count: u32,
        mut model: impl FnMut(f64) -> Result<[f64; 2], E>,
    ) -> Result<[f64; 2], E> {
        let mut worst = [0.0_f64; 2];
        for look in 0..count {
            let t = from + (to - from) * (f64::from(look) + 0.3) / f64::from(count);
            let (held, direct) = (self.at(t), model(t)?);
            for ((worst, held), direct) in worst.iter_mut().zip(held).zip(direct) {
                *worst = worst.max((held - direct).abs());
            }
        }
        Ok(worst)
    }
}

/// Chebyshev coefficients through values at the nodes.
fn series(values: &[f64; NODES]) -> [f64; NODES] {
    std::array::from_fn(|order| {
        let sum: f64 = values
            .iter()
            .enumerate()
            .map(|(node, value)| value * (PI * order as f64 * (node as f64 + 0.5) / NODES as f64).cos())
            .sum();
        sum * if order == 0 { 1.0 } else { 2.0 } / NODES as f64
    })
}

/// Clenshaw's recurrence.
fn evaluate(series: &[f64; NODES], x: f64) -> f64 {
    let (mut next, mut after) = (0.0, 0.0);
    for coefficient in series[1..].iter().rev() {
        (next, after) = (2.0 * x * next - after + coefficient, next);
    }
    x * next - after + series[0]
}
