//! The 64-bit routines on ten million random and hard inputs each with `SHIFTKEEL_EXHAUSTIVE=1`, else on 100,000,
//! against a fixed-point reference of 120 bits, which is itself held against 200 bits of a library.

#[path = "reference/multiprecision.rs"]
mod multiprecision;
#[path = "reference/series.rs"]
mod series;

use fixed::types::I1F63;
use multiprecision::{Big, Random, big, count};
use series::{BITS, Series};
use shiftkeel::rapidity::{Rapidity, RapidityError, ShiftFactor, bounds};

/// Worst error over the inputs that `input` makes from a generator, on all cores.
fn worst<T: Copy + core::fmt::Debug + Send>(
    name: &str,
    seed: u64,
    input: impl Fn(u64, &mut Random) -> T + Sync,
    error: impl Fn(&Series, T) -> f64 + Sync,
) -> f64 {
    let threads = std::thread::available_parallelism().map_or(1, |count| count.get()) as u64;
    let each = count(100_000, 10_000_000) / threads;
    let (input, error) = (&input, &error);
    let parts: Vec<_> = std::thread::scope(|scope| {
        let parts: Vec<_> = (0..threads)
            .map(|thread| {
                scope.spawn(move || {
                    let (series, mut random) = (Series::new(), Random::new(seed + thread));
                    let mut worst = (0.0, None);
                    for number in 0..each {
                        let x = input(number, &mut random);
                        let seen = error(&series, x);
                        if seen > worst.0 {
                            worst = (seen, Some(x));
                        }
                    }
                    worst
                })
            })
            .collect();
        parts.into_iter().map(|part| part.join().expect("a part failed")).collect()
    });
    let worst = parts.into_iter().fold((0.0, None), |a, b| if b.0 > a.0 { b } else { a });
    println!("{name}: worst {:.6} at {:?}", worst.0, worst.1);
    worst.0
}

/// A rapidity: any bits, any size, or next to a place where the kernels change rows or powers.
fn rapidity(number: u64, random: &mut Random) -> i64 {
    match number % 4 {
        0 => random.bits() as i64,
        1 => random.spread(),
        2 => {
            let half_step = (random.bits() % 5_909) as i64 - 2_954;
            let near = (half_step as f64 * (core::f64::consts::LN_2 / 256.0) * 2_f64.powi(60)) as i64;
            near + (random.bits() % 2_001) as i64 - 1_000
        }
        _ => (1_i64 << (random.bits() % 63)) + (random.bits() % 2_001) as i64 - 1_000,
    }
}

/// A velocity ratio: any bits, any size, or close to +-1.
fn beta(number: u64, random: &mut Random) -> i64 {
    let size = match number % 3 {
        0 => (random.bits() >> 1) as i64,
        1 => random.spread().saturating_abs(),
        _ => i64::MAX - (random.spread().saturating_abs() >> 21),
    };
    if random.bits() & 1 == 0 { size } else { -size }
}

/// Distance of `bits` with `fraction_bits` from a value with 120, in units of the former.
fn distance(bits: i128, fraction_bits: u32, exact: i128) -> f64 {
    let shift = BITS - fraction_bits;
    ((bits << shift) - exact).unsigned_abs() as f64 / (1_u128 << shift) as f64
}

/// Error of a mantissa with 60 fraction bits of `exact` 2^`k`.
fn mantissa_error(mantissa: u64, exponent: i32, exact: i128, k: i32) -> f64 {
    assert!(mantissa >> 60 == 1, "mantissa {mantissa:#x}");
    // exact 2^(k - exponent), where the two powers differ by one at most, or by more where ones were subtracted.
    let exact = if k >= exponent { exact << (k - exponent) } else { exact >> (exponent - k) };
    distance(i128::from(mantissa), 60, exact)
}

fn offset_error(series: &Series, x: i64) -> f64 {
    let offset = Rapidity::from_bits(x).to_offset();
    if x == 0 {
        return if (offset.mantissa(), offset.exponent()) == (0, 0) { 0.0 } else { f64::INFINITY };
    }
    let mantissa = offset.mantissa();
    assert!(mantissa.unsigned_abs() >> 60 == 1, "mantissa {mantissa:#x}");
    if x.unsigned_abs() < 1 << 57 {
        // x (exp(x) - 1)/x with 60 + 69 fraction bits against the mantissa with as many.
        let exact = i128::from(x) * (series.offset_over_argument(x) >> (BITS - 69));
        let places = offset.exponent() + 69;
        let difference = (i128::from(mantissa) << places) - exact;
        return difference.unsigned_abs() as f64 / 2_f64.powi(places);
    }
    let (power, k) = series.exponential(i128::from(x));
    // exp(x) - 1 in units of 2^(scale - 120).
    let scale = k.max(0);
    let exact = (power >> (scale - k)) - ((1_i128 << BITS) >> scale);
    mantissa_error(mantissa.unsigned_abs(), offset.exponent(), exact.abs(), scale)
}

/// A constructor refuses what lies beyond +-8, and nothing else.
fn refusable(result: Result<Rapidity, RapidityError>, exact: i128) -> f64 {
    let eight = 8_i128 << BITS;
    match result {
        Ok(rapidity) => distance(i128::from(rapidity.to_bits()), 60, exact),
        Err(RapidityError::OutOfRange) if exact.abs() > eight - (1 << (BITS - 59)) => 0.0,
        Err(_) => f64::INFINITY,
    }
}

fn parts_of_one(beta: i64) -> (u64, u64) {
    let one = 1_u64 << 63;
    (one.wrapping_add(beta as u64), one.wrapping_sub(beta as u64))
}

#[test]
fn factor() {
    let worst = worst("factor", 41, rapidity, |series, x| {
        let factor = Rapidity::from_bits(x).to_factor();
        let (exact, k) = series.exponential(i128::from(x));
        mantissa_error(factor.mantissa(), factor.exponent(), exact, k)
    });
    assert!(worst <= bounds::TO_FACTOR);
}

#[test]
fn offset() {
    let worst = worst("offset", 42, rapidity, offset_error);
    assert!(worst <= bounds::TO_OFFSET);
}

#[test]
fn velocity_ratio() {
    let worst = worst("velocity ratio", 43, rapidity, |series, x| {
        let beta = Rapidity::from_bits(x).to_beta().to_bits();
        distance(i128::from(beta).abs(), 63, series.tangent(x))
    });
    assert!(worst <= bounds::TO_BETA);
}

#[test]
fn rapidity_of_velocity_ratio() {
    let worst = worst("rapidity", 44, beta, |series, bits| {
        let (above, below) = parts_of_one(bits);
        let exact = series.logarithm_of_ratio(above, below) / 2;
        refusable(Rapidity::from_beta(I1F63::from_bits(bits)), exact)
    });
    assert!(worst <= bounds::BETA);
}

#[test]
fn factor_of_velocity_ratio() {
    let worst = worst("factor of beta", 45, beta, |series, bits| {
        let factor = ShiftFactor::from_beta(I1F63::from_bits(bits)).expect("below light");
        let (above, below) = parts_of_one(bits);
        let logarithm = series.logarithm_of_ratio(above, below) / 2;
        let (exact, k) = series.exponential_of_series(logarithm);
        mantissa_error(factor.mantissa(), factor.exponent(), exact, k)
    });
    assert!(worst <= bounds::FACTOR_OF_BETA);
}

#[test]
fn rapidity_of_ratio() {
    let pair = |number: u64, random: &mut Random| {
        let first = random.bits().max(1);
        let second = match number % 3 {
            0 => random.bits(),
            1 => first.wrapping_add_signed(random.spread() >> 20),
            _ => random.bits() >> (random.bits() % 60),
        };
        (first, second.max(1))
    };
    let worst = worst("ratio", 46, pair, |series, (numerator, denominator)| {
        let exact = series.logarithm_of_ratio(numerator, denominator);
        refusable(Rapidity::from_ratio(numerator, denominator), exact)
    });
    assert!(worst <= bounds::RATIO);
}

#[test]
fn the_reference_itself_is_good_to_a_hundredth_of_a_unit() {
    let (series, mut random) = (Series::new(), Random::new(47));
    let close = |seen: i128, exact: &Big, tolerance: i32| {
        let difference = ((big(seen, BITS as isize) - exact) << BITS as isize).to_f64().value();
        assert!(difference.abs() < 2_f64.powi(tolerance), "{seen}: {difference:e} units of 2^-120");
    };
    for number in 0..count(1_000, 20_000) {
        let x = rapidity(number, &mut random);
        let (exact, k) = series.exponential(i128::from(x));
        close(exact, &(big(x, 60).exp() >> k as isize), 20);
        close(series.tangent(x), &big(i128::from(x).abs(), 60).tanh(), 20);
        if x != 0 && x.unsigned_abs() < 1 << 57 {
            close(series.offset_over_argument(x), &(big(x, 60).exp_m1() / big(x, 60)), 20);
        }
        let (numerator, denominator) = (random.bits().max(1), random.bits().max(1));
        let exact = (big(numerator, 0) / big(denominator, 0)).ln();
        close(series.logarithm_of_ratio(numerator, denominator), &exact, 20);
    }
}
