//! Factor, offset and velocity ratio of a rapidity against 200 bits; composition of velocities.

#[path = "reference/multiprecision.rs"]
mod reference;

use fixed::types::{I1F31, I1F63};
use reference::{Big, Random, assert_tight, big, count, error_in_units, worst};
use shiftkeel::frequency::Frequency;
use shiftkeel::rapidity::{Rapidity, RapidityError, ShiftFactor, bounds, compose_beta_32};

/// Rapidities: ends, zero, powers of two and their neighbours, neighbours of multiples of ln 2 / 128 and of
/// their midpoints (where the kernels change tables), and random ones of every size.
fn rapidities(seed: u64, quick: u64, full: u64) -> impl Iterator<Item = i64> {
    let mut random = Random::new(seed);
    let powers =
        (0..63).flat_map(|power| [-1, 0, 1].map(|step| (1_i64 << power) + step)).flat_map(|x| [x, -x]);
    let steps = (-2954..=2954).flat_map(|half_step: i64| {
        let near = (half_step as f64 * (core::f64::consts::LN_2 / 256.0) * 2_f64.powi(60)) as i64;
        [near - 3, near, near + 3]
    });
    let random = (0..count(quick, full))
        .map(move |number| if number % 3 == 0 { random.bits() as i64 } else { random.spread() });
    [i64::MIN, i64::MAX, 0].into_iter().chain(powers).chain(steps).chain(random)
}

#[test]
fn factor() {
    let worst = worst("factor", rapidities(21, 20_000, 200_000), |bits| {
        let factor = Rapidity::from_bits(bits).to_factor();
        assert!(factor.mantissa() >> 60 == 1, "{bits}: mantissa {:#x}", factor.mantissa());
        let exact: Big = big(bits, 60).exp() >> factor.exponent() as isize;
        error_in_units(factor.mantissa(), 60, &exact)
    });
    assert_tight("factor", worst, bounds::TO_FACTOR);
}

#[test]
fn factor_of_velocity_ratio() {
    let mut random = Random::new(27);
    let ends = [1 - i64::MAX, -i64::MAX, -1, 0, 1, i64::MAX - 1, i64::MAX, 1 << 62, -1 << 62];
    let ratios = (0..count(20_000, 200_000)).map(|number| match number % 3 {
        0 => (random.bits() as i64).max(-i64::MAX),
        1 => random.spread(),
        _ => (i64::MAX - random.spread().saturating_abs()) * if random.bits() & 1 == 0 { 1 } else { -1 },
    });
    let worst = worst("factor of beta", ends.into_iter().chain(ratios), |bits| {
        let factor = ShiftFactor::from_beta(I1F63::from_bits(bits)).expect("below light");
        assert!(factor.mantissa() >> 60 == 1, "{bits}: mantissa {:#x}", factor.mantissa());
        let beta = big(bits, 63);
        let exact: Big = ((big(1, 0) + &beta) / (big(1, 0) - beta)).sqrt() >> factor.exponent() as isize;
        error_in_units(factor.mantissa(), 60, &exact)
    });
    assert_tight("factor of beta", worst, bounds::FACTOR_OF_BETA);
    assert_eq!(ShiftFactor::from_beta(I1F63::MIN), Err(RapidityError::NotBelowLight));
}

#[test]
fn offset() {
    let worst = worst("offset", rapidities(22, 20_000, 200_000), |bits| {
        let offset = Rapidity::from_bits(bits).to_offset();
        if bits == 0 {
            assert_eq!((offset.mantissa(), offset.exponent()), (0, 0));
            return 0.0;
        }
        assert!(offset.mantissa().unsigned_abs() >> 60 == 1, "{bits}: mantissa {:#x}", offset.mantissa());
        let exact: Big = big(bits, 60).exp_m1() >> offset.exponent() as isize;
        error_in_units(offset.mantissa(), 60, &exact)
    });
    assert_tight("offset", worst, bounds::TO_OFFSET);
}

#[test]
fn velocity_ratio() {
    let worst = worst("beta", rapidities(23, 20_000, 200_000), |bits| {
        error_in_units(Rapidity::from_bits(bits).to_beta().to_bits(), 63, &big(bits, 60).tanh())
    });
    assert_tight("beta", worst, bounds::TO_BETA);
}

#[test]
fn short_velocity_ratio() {
    let worst = worst("beta, 32 bits", rapidities(24, 20_000, 200_000), |bits| {
        error_in_units(Rapidity::from_bits(bits).to_beta_32().to_bits(), 31, &big(bits, 60).tanh())
    });
    assert_tight("beta, 32 bits", worst, bounds::TO_BETA_SHORT);
}

#[test]
fn the_other_way_is_the_mirror_and_the_way_back_leads_home() {
    for bits in rapidities(25, 2_000, 200_000) {
        let rapidity = Rapidity::from_bits(bits);
        assert_eq!((-rapidity).to_beta(), rapidity.to_beta().wrapping_neg());
        if bits.unsigned_abs() < 1 << 59 {
            let back = Rapidity::from_beta(rapidity.to_beta()).expect("below one half");
            assert!((back - rapidity).to_bits().abs() <= 1, "{bits}");
        }
    }
}

#[test]
fn scaled_frequencies_are_rounded_to_nearest() {
    let carrier = Frequency::from_bits(7_331_642_000_000_003);
    for bits in rapidities(26, 2_000, 200_000).filter(|bits| *bits < 3 << 60) {
        let rapidity = Rapidity::from_bits(bits);
        let exact = big(carrier.to_bits(), 24) * big(bits, 60).exp();
        let scaled = rapidity.to_factor().of(carrier).expect("in range");
        assert!(error_in_units(scaled.to_bits(), 24, &exact) < 0.55, "{bits}");
        let exact = big(carrier.to_bits(), 24) * big(bits, 60).exp_m1();
        let shift = rapidity.to_offset().of(carrier).expect("in range");
        assert!(error_in_units(shift.to_bits(), 24, &exact) < 0.55, "{bits}");
    }
    let terahertz = Frequency::from_bits(u64::MAX);
    let double = Rapidity::from_ratio(2, 1).expect("a ratio");
    assert_eq!(double.to_factor().of(terahertz), None);
    assert_eq!(double.to_offset().of(terahertz), None);
    assert_eq!(Rapidity::ZERO.to_factor().of(terahertz), Some(terahertz));
}

#[test]
fn composition_of_velocities() {
    // A 2^16 by 2^16 grid, or every 251st line and column of it.
    let stride = count(251, 1) as usize;
    let grid = || (-32_768_i64..32_768).step_by(stride).chain([-32_767, -1, 0, 1, 32_767]);
    let mut worst = 0.0_f64;
    for a in grid() {
        for b in grid() {
            // 65,537/65,536 of full scale, so that the low bits take part, and never beyond the format.
            let (a, b) =
                ((a * 65_536 + a).max(-i64::from(i32::MAX)), (b * 65_536 + b).max(-i64::from(i32::MAX)));
            let exact = |bits: i64| {
                // The error is (result (1 + a b) - (a + b)) / (1 + a b) in exact integers over 2^93.
                let denominator = (1_i128 << 62) + i128::from(a) * i128::from(b);
                let error = i128::from(bits) * denominator - (i128::from(a + b) << 62);
                (error as f64 / denominator as f64).abs()
            };
            let result = compose_beta_32(I1F31::from_bits(a as i32), I1F31::from_bits(b as i32));
            worst = worst.max(match result {
                Ok(beta) => exact(i64::from(beta.to_bits())),
                // Only what rounds to one.
                Err(_) => exact((a + b).signum() << 31),
            });
        }
    }
    assert_tight("composition", worst, bounds::COMPOSE_BETA);
    assert_eq!(compose_beta_32(I1F31::MIN, I1F31::ZERO), Err(RapidityError::NotBelowLight));
    assert_eq!(compose_beta_32(I1F31::ZERO, I1F31::MIN), Err(RapidityError::NotBelowLight));
    assert_eq!(compose_beta_32(I1F31::MAX, I1F31::MAX), Err(RapidityError::NotBelowLight));
    assert_eq!(compose_beta_32(I1F31::MAX, -I1F31::MAX), Ok(I1F31::ZERO));
}
