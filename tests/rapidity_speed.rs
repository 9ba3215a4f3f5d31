//! Rapidities from speeds against atanh in 200 bits, and the speeds that must be refused.

#[path = "reference/multiprecision.rs"]
mod reference;

use fixed::types::{I1F31, I1F63, I16F16, I32F32};
use reference::{Big, Random, assert_tight, big, count, error_in_units, light, worst};
use shiftkeel::rapidity::{Rapidity, RapidityError, bounds};

const LIGHT: i64 = 299_792_458;

/// -atanh(v/c) of a receding speed.
fn receding(speed: Big) -> Big {
    -(speed / light()).atanh()
}

fn error(rapidity: Rapidity, exact: &Big) -> f64 {
    error_in_units(rapidity.to_bits(), 60, exact)
}

/// Both ends, the surroundings of zero and random numbers of every size.
fn words(seed: u64, quick: u64, full: u64) -> impl Iterator<Item = i32> {
    let mut random = Random::new(seed);
    let ends = [i32::MIN, i32::MIN + 1, -65_536, -2, -1, 0, 1, 2, 65_535, i32::MAX - 1, i32::MAX];
    let random = (0..count(quick, full)).map(move |number| {
        if number % 2 == 0 { random.bits() as i32 } else { (random.spread() >> 31) as i32 }
    });
    ends.into_iter().chain(random)
}

/// Numbers below `limit` in size: ends, zero, random ones of every size, and ones close to the limit.
fn below(limit: i64, seed: u64, quick: u64, full: u64) -> impl Iterator<Item = i64> {
    let mut random = Random::new(seed);
    let ends = [1 - limit, -limit / 2, -1, 0, 1, limit / 2, limit - 1];
    let random = (0..count(quick, full)).map(move |number| match number % 3 {
        0 => (random.bits() as i64) % limit,
        1 => random.spread() % limit,
        _ => limit - 1 - (random.spread().unsigned_abs() as i64 % limit),
    });
    ends.into_iter().chain(random)
}

/// Error of a constructor that refuses what lies beyond +-8 and only that.
fn error_or_refused(result: Result<Rapidity, RapidityError>, exact: &Big) -> f64 {
    match result {
        Ok(rapidity) => error(rapidity, exact),
        Err(RapidityError::OutOfRange) if exact.to_f64().value().abs() > 7.999_999_999 => 0.0,
        Err(_) => f64::INFINITY,
    }
}

#[test]
fn range_rate_in_metres_per_second() {
    let worst = worst("I16F16", words(1, 20_000, 200_000), |bits| {
        error(Rapidity::from_range_rate(I16F16::from_bits(bits)), &receding(big(bits, 16)))
    });
    assert_tight("range rate, I16F16", worst, bounds::RANGE_RATE);
}

#[test]
fn range_rate_in_millimetres_per_second() {
    let worst = worst("mm/s", words(2, 20_000, 200_000), |bits| {
        error(Rapidity::from_range_rate_mm_per_s(bits), &receding(big(bits, 0) / big(1000, 0)))
    });
    assert_tight("range rate, mm/s", worst, bounds::RANGE_RATE_MM_PER_S);
}

#[test]
fn range_rate_in_any_speed_below_light() {
    let worst = worst("I32F32", below(LIGHT << 32, 3, 20_000, 200_000), |bits| {
        error_or_refused(Rapidity::from_range_rate_wide(I32F32::from_bits(bits)), &receding(big(bits, 32)))
    });
    assert_tight("range rate, I32F32", worst, bounds::RANGE_RATE_WIDE);
}

#[test]
fn range_rate_as_a_float() {
    let mut random = Random::new(4);
    let floats = (0..count(20_000, 200_000)).map(|number| {
        let bits = random.bits() as u32;
        // Every other one between 1 m/s and the speed of light, where the work is.
        let exponent = if number % 2 == 0 { 127 + bits % 29 } else { (bits >> 8) % 156 };
        f32::from_bits(bits & 0x807f_ffff | exponent << 23)
    });
    let ends = [0.0, -0.0, f32::MIN_POSITIVE, f32::from_bits(1), 1e-9, -1e-9, 299_792_448.0, -299_792_416.0];
    let worst = worst("f32", ends.into_iter().chain(floats).filter(|v| v.abs() < 299_792_458.0), |v| {
        let exact = receding(Big::try_from(v).expect("finite").with_precision(200).value());
        error_or_refused(Rapidity::from_range_rate_f32(v), &exact)
    });
    assert_tight("range rate, f32", worst, bounds::RANGE_RATE_F32);
}

#[test]
fn velocity_ratio() {
    let worst = worst("I1F63", below(i64::MAX, 5, 20_000, 200_000), |bits| {
        error_or_refused(Rapidity::from_beta(I1F63::from_bits(bits)), &big(bits, 63).atanh())
    });
    assert_tight("beta, I1F63", worst, bounds::BETA);
}

#[test]
fn short_velocity_ratio_is_the_long_one() {
    for bits in words(6, 1_000, 1_000) {
        let long = Rapidity::from_beta(I1F63::from_bits(i64::from(bits) << 32));
        assert_eq!(Rapidity::from_beta_32(I1F31::from_bits(bits)), long);
    }
}

#[test]
fn time_dilation() {
    let worst = worst("transverse", below(LIGHT << 32, 7, 20_000, 200_000), |bits| {
        let beta = big(bits, 32) / light();
        let exact = (big(1, 0) - beta.sqr()).ln() / big(2, 0);
        error_or_refused(Rapidity::from_transverse_speed(I32F32::from_bits(bits)), &exact)
    });
    assert_tight("transverse", worst, bounds::TRANSVERSE_SPEED);
}

#[test]
fn receding_is_negative_and_the_other_way_is_its_mirror() {
    for bits in words(8, 1_000, 100_000) {
        let receding = Rapidity::from_range_rate(I16F16::from_bits(bits));
        assert_eq!(receding.to_bits().signum(), -i64::from(bits.signum()));
        if bits != i32::MIN {
            let approaching = Rapidity::from_range_rate(I16F16::from_bits(-bits));
            assert!((receding + approaching).to_bits().abs() <= 1);
        }
    }
}

#[test]
fn speeds_that_are_refused() {
    use RapidityError::{Infinite, NotANumber, NotBelowLight, OutOfRange};
    let float = Rapidity::from_range_rate_f32;
    assert_eq!(float(f32::NAN), Err(NotANumber));
    assert_eq!(float(-f32::NAN), Err(NotANumber));
    assert_eq!(float(f32::from_bits(0x7f80_0001)), Err(NotANumber));
    assert_eq!(float(f32::INFINITY), Err(Infinite));
    assert_eq!(float(f32::NEG_INFINITY), Err(Infinite));
    assert_eq!(float(f32::MAX), Err(NotBelowLight));
    // 299,792,458 lies between the floats 299,792,448 and 299,792,480.
    assert_eq!(float(299_792_480.0), Err(NotBelowLight));
    assert_eq!(float(-299_792_480.0), Err(NotBelowLight));
    assert_eq!(float(299_792_448.0), Err(OutOfRange));
    assert!(float(299_792_352.0).is_ok());
    assert_eq!(float(0.0), Ok(Rapidity::ZERO));
    assert_eq!(float(-0.0), Ok(Rapidity::ZERO));
    assert_eq!(float(f32::from_bits(1)), Ok(Rapidity::ZERO));

    let wide = |bits: i64| Rapidity::from_range_rate_wide(I32F32::from_bits(bits));
    assert_eq!(wide(LIGHT << 32), Err(NotBelowLight));
    assert_eq!(wide(-(LIGHT << 32)), Err(NotBelowLight));
    assert_eq!(wide(i64::MIN), Err(NotBelowLight));
    assert_eq!(wide(i64::MAX), Err(NotBelowLight));
    assert_eq!(wide((LIGHT << 32) - 1), Err(OutOfRange));
    assert_eq!(wide(1 - (LIGHT << 32)), Err(OutOfRange));
    assert_eq!(wide((LIGHT - 67) << 32), Err(OutOfRange));
    assert!(wide((LIGHT - 68) << 32).is_ok());

    let beta = |bits: i64| Rapidity::from_beta(I1F63::from_bits(bits));
    assert_eq!(beta(i64::MIN), Err(NotBelowLight));
    assert_eq!(beta(i64::MAX), Err(OutOfRange));
    assert_eq!(beta(-i64::MAX), Err(OutOfRange));
    assert_eq!(Rapidity::from_beta_32(I1F31::MIN), Err(NotBelowLight));
    assert_eq!(Rapidity::from_beta_32(I1F31::MAX), Err(OutOfRange));

    let transverse = |bits: i64| Rapidity::from_transverse_speed(I32F32::from_bits(bits));
    assert_eq!(transverse(LIGHT << 32), Err(NotBelowLight));
    assert_eq!(transverse(i64::MIN), Err(NotBelowLight));
    assert_eq!(transverse(0), Ok(Rapidity::ZERO));
}

#[test]
fn every_refusal_says_what_to_do() {
    for error in [
        RapidityError::NotANumber,
        RapidityError::Infinite,
        RapidityError::NotBelowLight,
        RapidityError::Zero,
        RapidityError::OffsetBelowMinusOne,
        RapidityError::OutOfRange,
    ] {
        let text = error.to_string();
        assert!(["pass ", "check ", "must "].iter().any(|advice| text.contains(advice)), "{text}");
    }
}
