//! Rapidities from ratios, crystal offsets and potentials against 200 bits, and sums that saturate.

#[path = "reference/multiprecision.rs"]
mod reference;

use fixed::types::{I4F60, I32F32, I48F16};
use reference::{Big, Random, assert_tight, big, count, error_in_units, light, worst};
use shiftkeel::frequency::Frequency;
use shiftkeel::rapidity::{Rapidity, RapidityError, bounds};

fn error(rapidity: Rapidity, exact: &Big) -> f64 {
    error_in_units(rapidity.to_bits(), 60, exact)
}

/// Pairs of integers: of every size, nearly equal, and the ends of the format.
fn pairs(seed: u64, quick: u64, full: u64) -> impl Iterator<Item = (u64, u64)> {
    let mut random = Random::new(seed);
    let ends = [
        (1, 1),
        (u64::MAX, u64::MAX),
        (u64::MAX, u64::MAX - 1),
        (u64::MAX - 1, u64::MAX),
        (1 << 63, u64::MAX),
    ];
    let random = (0..count(quick, full)).map(move |number| {
        let first = random.bits().max(1);
        match number % 3 {
            0 => (first, random.bits().max(1)),
            1 => (first, first.wrapping_add_signed(random.spread() >> 20).max(1)),
            _ => {
                let shift = random.bits() % 60;
                ((first >> shift).max(1), (random.bits() >> shift).max(1))
            }
        }
    });
    ends.into_iter().chain(random)
}

#[test]
fn ratio_of_two_counts() {
    let worst = worst("ratio", pairs(11, 20_000, 200_000), |(numerator, denominator)| {
        let exact = (big(numerator, 0) / big(denominator, 0)).ln();
        match Rapidity::from_ratio(numerator, denominator) {
            Ok(rapidity) => error(rapidity, &exact),
            Err(RapidityError::OutOfRange) if exact.to_f64().value().abs() >= 8.0 => 0.0,
            Err(_) => f64::INFINITY,
        }
    });
    assert_tight("ratio", worst, bounds::RATIO);
}

#[test]
fn ratio_of_one_is_no_shift_and_the_inverse_ratio_is_the_opposite() {
    for (numerator, denominator) in pairs(12, 2_000, 100_000) {
        assert!(Rapidity::from_ratio(numerator, numerator) == Ok(Rapidity::ZERO));
        if let Ok(forth) = Rapidity::from_ratio(numerator, denominator) {
            let back = Rapidity::from_ratio(denominator, numerator).expect("the inverse is in range, too");
            assert!((forth + back).to_bits().abs() <= 1);
        }
    }
}

#[test]
fn range_of_ratios_ends_at_eight() {
    // exp(8) = 2980.957987
    assert!(Rapidity::from_ratio(2_980_957_987, 1_000_000).is_ok());
    assert!(Rapidity::from_ratio(1_000_000, 2_980_957_987).is_ok());
    assert_eq!(Rapidity::from_ratio(2_980_957_988, 1_000_000), Err(RapidityError::OutOfRange));
    assert_eq!(Rapidity::from_ratio(1_000_000, 2_980_957_988), Err(RapidityError::OutOfRange));
    assert_eq!(Rapidity::from_ratio(u64::MAX, 1), Err(RapidityError::OutOfRange));
    assert_eq!(Rapidity::from_ratio(1, u64::MAX), Err(RapidityError::OutOfRange));
    assert_eq!(Rapidity::from_ratio(0, 1), Err(RapidityError::Zero));
    assert_eq!(Rapidity::from_ratio(1, 0), Err(RapidityError::Zero));
    assert_eq!(Rapidity::from_ratio(0, 0), Err(RapidityError::Zero));
}

#[test]
fn frequencies_are_a_ratio() {
    let received = Frequency::from_bits(7_331_461_900_000_001);
    let transmitted = Frequency::from_bits(7_331_642_000_000_003);
    let expected = Rapidity::from_ratio(received.to_bits(), transmitted.to_bits());
    assert_eq!(Rapidity::from_frequencies(received, transmitted), expected);
    assert_eq!(Rapidity::from_frequencies(Frequency::from_bits(0), transmitted), Err(RapidityError::Zero));
}

#[test]
fn crystal_offset() {
    let mut random = Random::new(13);
    let ends = [0, 1, -1, i64::MAX, -(1_000_000_000 << 32) + (1 << 22), 20_000 << 32, -20_000 << 32];
    let offsets = (0..count(20_000, 200_000)).map(|_| random.spread());
    let worst = worst("parts per billion", ends.into_iter().chain(offsets), |bits| {
        let one = big(1_000_000_000, 0);
        match Rapidity::from_parts_per_billion(I32F32::from_bits(bits)) {
            Ok(rapidity) => error(rapidity, &((big(bits, 32) + &one) / one).ln()),
            Err(RapidityError::OffsetBelowMinusOne) if bits <= -(1_000_000_000 << 32) => 0.0,
            // exp(-8) = 3.3546e-4
            Err(RapidityError::OutOfRange) if bits < -(999_664_537 << 32) => 0.0,
            Err(_) => f64::INFINITY,
        }
    });
    assert_tight("parts per billion", worst, bounds::PARTS_PER_BILLION);
    let offset = |bits: i64| Rapidity::from_parts_per_billion(I32F32::from_bits(bits));
    assert_eq!(offset(-(1_000_000_000 << 32)), Err(RapidityError::OffsetBelowMinusOne));
    assert_eq!(offset(i64::MIN), Err(RapidityError::OffsetBelowMinusOne));
    assert_eq!(offset(-(1_000_000_000 << 32) + 1), Err(RapidityError::OutOfRange));
}

#[test]
fn gravity() {
    let mut random = Random::new(14);
    let ends = [0, 1, -1, i64::MAX, i64::MIN];
    let differences = (0..count(20_000, 200_000)).map(|_| random.spread());
    let worst = worst("potential", ends.into_iter().chain(differences), |bits| {
        error(Rapidity::from_potential(I48F16::from_bits(bits)), &(big(bits, 16) / light().sqr()))
    });
    assert_tight("potential", worst, bounds::POTENTIAL);
}

#[test]
fn sums_are_exact_in_any_order() {
    let mut random = Random::new(15);
    for _ in 0..count(1_000, 100_000) {
        let terms: [Rapidity; 8] = core::array::from_fn(|_| Rapidity::from_bits(random.spread() >> 3));
        let exact: i128 = terms.iter().map(|term| i128::from(term.to_bits())).sum();
        assert_eq!(i128::from(terms.iter().sum::<Rapidity>().to_bits()), exact);
        assert_eq!(i128::from(terms.into_iter().rev().sum::<Rapidity>().to_bits()), exact);
        let mut sum = Rapidity::ZERO;
        for term in terms {
            sum += term;
        }
        for term in terms {
            sum -= term;
        }
        assert_eq!(sum, Rapidity::ZERO);
        assert_eq!(terms[0] - terms[1], -(terms[1] - terms[0]));
    }
}

#[test]
fn saturated_sums_stay_saturated() {
    let seven = Rapidity::from_bits(7 << 60);
    let over = seven + seven;
    assert_eq!(over, Rapidity::MAX);
    assert!(over.is_saturated() && (over - seven).is_saturated() && (over + -seven - seven).is_saturated());
    assert_eq!(over - seven, Rapidity::MAX);
    let under = -seven - seven;
    assert_eq!(under, Rapidity::MIN);
    assert_eq!(under + seven, Rapidity::MIN);
    assert!((-under).is_saturated() && (-over).is_saturated());
    assert!((over + under).is_saturated() && (under + over).is_saturated() && (over - over).is_saturated());
    assert!((Rapidity::ZERO + over).is_saturated() && (Rapidity::ZERO - over).is_saturated());
    assert!(!seven.is_saturated() && !(-seven).is_saturated() && !Rapidity::ZERO.is_saturated());
    assert_eq!(seven + Rapidity::from_bits((1 << 60) - 1), Rapidity::MAX);
    assert!(!(seven + Rapidity::from_bits((1 << 60) - 2)).is_saturated());
}

#[test]
fn conversion_to_and_from_the_fixed_type_is_exact() {
    for bits in [i64::MIN, -1, 0, 1, i64::MAX] {
        assert_eq!(Rapidity::from(I4F60::from_bits(bits)).to_bits(), bits);
        assert_eq!(I4F60::from(Rapidity::from_bits(bits)).to_bits(), bits);
    }
}
