//! Makes `src/nco/tables.rs`: the same text each time, from nothing but the formulas below.
//!
//! The only transcendental functions used are those of the `libm` crate, which is plain Rust and gives the
//! same bits on every host, so the text does not depend on the machine that makes it.

use core::f64::consts::PI;
use std::fmt::Write as _;

/// Full scale of every 32-bit output: 32767 * 2^16, so that rounding to 16 bits gives exactly +-32767.
pub const FULL_SCALE: f64 = 2_147_418_112.0;

/// The quick routine's half wave: sines of 256 equal steps from 0 to half a cycle, in units of 2^-31.
pub fn half_wave() -> Vec<u32> {
    (0..256).map(|step| (FULL_SCALE * libm::sin(f64::from(step) / 256.0 * PI)).round() as u32).collect()
}

/// Coefficients of the polynomial of degree `N - 2` that comes nearest to `target` over -1..1 when the error is
/// weighted with `weight`: Remez' exchange on `N` alternating points.
fn nearest_polynomial<const N: usize>(target: impl Fn(f64) -> f64, weight: impl Fn(f64) -> f64) -> Vec<f64> {
    const GRID: usize = 20_000;
    let node = |index: usize, count: usize| -libm::cos(PI * (index as f64 + 0.5) / count as f64);
    let mut points: Vec<f64> = (0..N).map(|k| node(k, N)).collect();
    let mut coefficients = Vec::new();
    for _ in 0..30 {
        // weight * (polynomial - target) = +-level at every point.
        let equation = |(k, &v): (usize, &f64)| {
            let powers = (0..N - 1).scan(1.0, |power, _| Some(std::mem::replace(power, *power * v)));
            let level = if k % 2 == 0 { 1.0 } else { -1.0 };
            powers.chain([level / weight(v), target(v)]).collect()
        };
        coefficients = solve(points.iter().enumerate().map(equation).collect());
        coefficients.pop();
        // The largest error of each run of one sign becomes the next point.
        let mut extremes: Vec<(f64, f64)> = Vec::new();
        for v in (0..GRID).map(|index| node(index, GRID)) {
            let here = weight(v) * (polynomial(&coefficients, v) - target(v));
            match extremes.last_mut() {
                Some(last) if (last.1 < 0.0) == (here < 0.0) => {
                    if here.abs() > last.1.abs() {
                        *last = (v, here);
                    }
                }
                _ => extremes.push((v, here)),
            }
        }
        if extremes.len() != N {
            break;
        }
        points = extremes.iter().map(|&(v, _)| v).collect();
    }
    coefficients
}

fn polynomial(coefficients: &[f64], t: f64) -> f64 {
    coefficients.iter().rev().fold(0.0, |sum, &c| sum * t + c)
}

/// Gauss' elimination with pivots; each row holds its right-hand side at the end.
fn solve(mut rows: Vec<Vec<f64>>) -> Vec<f64> {
    let n = rows.len();
    for column in 0..n {
        let pivot =
            (column..n).max_by(|&a, &b| rows[a][column].abs().total_cmp(&rows[b][column].abs())).unwrap();
        rows.swap(column, pivot);
        for row in column + 1..n {
            let factor = rows[row][column] / rows[column][column];
            let above = rows[column].clone();
            for (term, known) in rows[row].iter_mut().zip(&above).skip(column) {
                *term -= factor * known;
            }
        }
    }
    let mut solution = vec![0.0; n];
    for row in (0..n).rev() {
        let known: f64 = (row + 1..n).map(|k| rows[row][k] * solution[k]).sum();
        solution[row] = (rows[row][n] - known) / rows[row][row];
    }
    solution
}

fn high_product(a: i64, b: i64) -> i64 {
    (a * b) >> 32
}

/// 1 - 2 u^2 in 2^-30, from u in 2^-31, as the firmware evaluates it.
fn centred_square(distance: i64) -> i64 {
    (1 << 30) - 2 * high_product(distance, distance)
}

/// The negative of the fine cosine within an eighth of a cycle of its crest, as the firmware evaluates it.
fn fine_cosine(c: &[i64], square: i64) -> i64 {
    let sum = c[3] + (((square >> 16) * c[4]) >> 14);
    let sum = c[1] + high_product(square, c[2] + high_product(square, sum));
    c[0] + high_product(square, sum)
}

/// The negative of the fine sine within an eighth of a cycle of its rising zero, as the firmware evaluates it.
fn fine_sine(s: &[i64], distance: i64, square: i64) -> i64 {
    let sum = s[2] + (((square >> 16) * s[3]) >> 10);
    let sum = s[0] + high_product(square, s[1] + high_product(square, sum));
    high_product(distance, sum) - (distance >> 1)
}

/// Moves one coefficient at a time, by steps that shrink to one, while `cost` falls.
fn descend(mut coefficients: Vec<i64>, cost: impl Fn(&[i64]) -> f64) -> Vec<i64> {
    let mut best = cost(&coefficients);
    for step in [16, 8, 4, 2, 1, 4, 2, 1] {
        for index in 0..coefficients.len() {
            for change in [-step, step] {
                loop {
                    coefficients[index] += change;
                    let now = cost(&coefficients);
                    if now >= best {
                        coefficients[index] -= change;
                        break;
                    }
                    best = now;
                }
            }
        }
    }
    coefficients
}

/// Distances from the axis at which the search looks, in 2^-31 of an eighth of a cycle: both ends, and a
/// prime stride between.
fn distances() -> impl Iterator<Item = i64> {
    (-(1_i64 << 31)..1 << 31).step_by(1_000_003).chain([(1 << 31) - 4])
}

/// Coefficients of the negative of the fine cosine in v = 1 - 2 u^2, in 2^-31, -33, -35, -37, -37.
pub fn fine_cosine_coefficients() -> Vec<i64> {
    let scale = FULL_SCALE / 2_147_483_648.0;
    let target = |v: f64| -scale * libm::cos(PI / 4.0 * ((1.0 - v) / 2.0).sqrt());
    let c = nearest_polynomial::<6>(target, |_| 1.0);
    let rounded = c.iter().zip([31, 33, 35, 37, 37]).map(|(c, bits)| in_units(*c, bits));
    let grid: Vec<(i64, f64)> = distances()
        .map(|u| (centred_square(u), -FULL_SCALE * libm::cos(PI / 4.0 * u as f64 / 2_147_483_648.0)))
        .collect();
    descend(rounded.collect(), |c| {
        grid.iter().map(|&(square, exact)| (fine_cosine(c, square) as f64 - exact).abs()).fold(0.0, f64::max)
    })
}

/// Coefficients of the negative of the fine sine over u in v = 1 - 2 u^2, one half more in the first, in 2^-32, -34, -36, -32.
pub fn fine_sine_coefficients() -> Vec<i64> {
    let scale = FULL_SCALE / 2_147_483_648.0;
    let distance = |v: f64| ((1.0 - v) / 2.0).sqrt();
    let target = |v: f64| -scale * libm::sin(PI / 4.0 * distance(v)) / distance(v);
    let mut s = nearest_polynomial::<5>(target, distance);
    s[0] += 0.5;
    let rounded = s.iter().zip([32, 34, 36, 32]).map(|(s, bits)| in_units(*s, bits));
    let grid: Vec<(i64, i64, f64)> = distances()
        .map(|u| (u, centred_square(u), -FULL_SCALE * libm::sin(PI / 4.0 * u as f64 / 2_147_483_648.0)))
        .collect();
    descend(rounded.collect(), |s| {
        grid.iter()
            .map(|&(u, square, exact)| (fine_sine(s, u, square) as f64 - exact).abs())
            .fold(0.0, f64::max)
    })
}

/// Rounded to the nearest multiple of 2^-bits.
fn in_units(value: f64, bits: i32) -> i64 {
    (value * libm::exp2(f64::from(bits))).round() as i64
}

/// Amplitude of the mixer's oscillator: sums of two products with 16-bit samples, 2 * 2^15 * sqrt(2) times the
/// longest pair, must fit 32 bits, so that pair may be 23170.4 long; 5 of these are for rounding and the growth
/// of a pair that is turned to first order.
pub const MIXER_AMPLITUDE: f64 = 23165.0;

/// The mixer's circle: for the middle of each of 256 cells the cosine in the lower half, the sine above it.
///
/// Both are raised by half a unit, because the firmware rounds down after turning the pair; the sine is
/// lowered by the cosine's 16 bits below it, which the firmware leaves in place. The angle makes up for the
/// mean of what the firmware leaves off the rest of the angle, (1/2 * 201/8192 + 1/2) * 2^-16 rad.
pub fn mixer_table() -> Vec<u32> {
    (0..256)
        .map(|cell| {
            let angle = (f64::from(cell) + 0.5) / 128.0 * PI + (0.5 * 201.0 / 8192.0 + 0.5) / 65536.0;
            let cosine = (MIXER_AMPLITUDE * libm::cos(angle) + 0.5).round() as i16 as u16;
            let below = f64::from(cosine) / 65536.0;
            let sine = (MIXER_AMPLITUDE * libm::sin(angle) + 0.5 - below).round() as i16 as u16;
            u32::from(sine) << 16 | u32::from(cosine)
        })
        .collect()
}

/// The whole text of `src/nco/tables.rs`.
pub fn text() -> String {
    let mut out = String::from(
        "//! Made by `tests/reference/nco_tables.rs`; `tests/nco_tables.rs` compares. Do not edit.\n",
    );
    for (what, name, entries) in [
        ("Sine of half a cycle in 256 steps", "HALF_WAVE", half_wave()),
        ("The mixer's circle in 256 cells: a 16-bit sine above a 16-bit cosine", "MIXER_WAVE", mixer_table()),
    ] {
        writeln!(out, "\n/// {what}.\n#[rustfmt::skip]\npub(super) static {name}: [u32; 256] = [").unwrap();
        for row in entries.chunks(8) {
            let row: Vec<String> = row.iter().map(|entry| format!("0x{entry:08X},")).collect();
            writeln!(out, "    {}", row.join(" ")).unwrap();
        }
        out.push_str("];\n");
    }
    for (what, name, coefficients) in [
        (
            "cosine, negative, in 1 - 2 u^2: units of 2^-31, -33, -35, -37, -37",
            "FINE_COSINE",
            fine_cosine_coefficients(),
        ),
        (
            "sine over u, negative and 1/2 more, in 1 - 2 u^2: units of 2^-32, -34, -36, -32",
            "FINE_SINE",
            fine_sine_coefficients(),
        ),
    ] {
        writeln!(out, "\n/// Coefficients of the fine {what}.").unwrap();
        let list: Vec<String> = coefficients.iter().map(i64::to_string).collect();
        writeln!(
            out,
            "#[rustfmt::skip]\npub(super) const {name}: [i32; {}] = [{}];",
            list.len(),
            list.join(", ")
        )
        .unwrap();
    }
    out
}
