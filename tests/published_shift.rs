//! Doppler factors, rapidities, clock rates and coherent transponders against values from outside.
//!
//! Marks: [S] seen in the source, [M] source recalled and not seen, [V] recomputed with 25 to 40 digits or
//! exact fractions. Range rate positive = receding; a receding motion is a negative rapidity.
#![allow(clippy::excessive_precision, clippy::approx_constant, reason = "digits as published")]

use fixed::types::{I1F31, I1F63, I16F16, I32F32, I48F16};
use shiftkeel::frequency::Frequency;
use shiftkeel::rapidity::narrow::{self, NarrowRapidity};
use shiftkeel::rapidity::{Rapidity, ShiftFactor, compose_beta_32};

const LIGHT: f64 = 299_792_458.0;
/// One step of a rapidity.
const STEP: f64 = 1.0 / (1_u64 << 60) as f64;

fn value(rapidity: Rapidity) -> f64 {
    rapidity.to_bits() as f64 * STEP
}

fn ratio(numerator: u64, denominator: u64) -> Rapidity {
    Rapidity::from_ratio(numerator, denominator).expect("a ratio")
}

fn factor_value(factor: ShiftFactor) -> f64 {
    factor.mantissa() as f64 * STEP * 2_f64.powi(factor.exponent())
}

fn offset_value(rapidity: Rapidity) -> f64 {
    rapidity.to_offset().mantissa() as f64 * STEP * 2_f64.powi(rapidity.to_offset().exponent())
}

#[track_caller]
fn assert_near(seen: f64, expected: f64, tolerance: f64) {
    let difference = (seen - expected).abs();
    assert!(difference <= tolerance, "seen {seen:e}, expected {expected:e}, difference {difference:e}");
}

/// Millihertz and a remainder to a frequency, to 2^-24 Hz.
fn hertz(whole: u64, millionths: u64) -> Frequency {
    Frequency::from_bits((whole << 24) + ((millionths << 24) + 500_000) / 1_000_000)
}

fn hertz_value(frequency: Frequency) -> f64 {
    frequency.to_bits() as f64 / (1_u64 << 24) as f64
}

/// [V] k-calculus: k, beta = (k^2-1)/(k^2+1), ln k. sqrt 3 is the ratio of its squares, halved.
#[test]
fn exact_vectors_of_k_calculus() {
    let rows: [(u64, u64, i64, i64, f64); 5] = [
        (3, 2, 5, 13, 0.405465108108164382),
        (2, 1, 3, 5, 0.693147180559945309),
        (3, 1, 4, 5, 1.09861228866810969),
        (4, 1, 15, 17, 1.38629436111989062),
        (6, 1, 35, 37, 1.791759469228055001),
    ];
    for (k_over, k_under, beta_over, beta_under, rapidity) in rows {
        let beta = I1F63::from_bits(((i128::from(beta_over) << 63) / i128::from(beta_under)) as i64);
        let from_beta = Rapidity::from_beta(beta).expect("below light");
        assert_near(value(ratio(k_over, k_under)), rapidity, 4e-16);
        assert!((from_beta - ratio(k_over, k_under)).to_bits().abs() <= 16, "beta is cut at 2^-63 and steep");
        let back = ratio(k_over, k_under).to_beta();
        assert!((back - beta).to_bits().abs() <= 8, "half a step of the rapidity is four of beta");
        let short = Rapidity::from_beta_32(I1F31::from_num(beta)).expect("below light");
        assert_near(value(short), rapidity, 2_f64.powi(-31) * 10.0);
        assert_near(factor_value(from_beta.to_factor()), k_over as f64 / k_under as f64, 1e-15);
        assert_near(offset_value(from_beta), k_over as f64 / k_under as f64 - 1.0, 1e-15);
    }
    let root_three = Rapidity::from_beta(I1F63::from_num(0.5)).expect("below light");
    assert_near(value(root_three), 0.549306144334054846, 2e-16);
    assert!((root_three + root_three - ratio(3, 1)).to_bits().abs() <= 2);
}

/// [V] Composition of velocities: 0.5+0.5, 0.6+0.8, 0.75+0.75, 0.9+0.9, by sum and by formula.
#[test]
fn composition() {
    let rows =
        [(0.5, 0.5, 0.8), (0.6, 0.8, 35.0 / 37.0), (0.75, 0.75, 0.96), (0.9, 0.9, 0.994475138121546961)];
    for (first, second, sum) in rows {
        let beta = |beta: f64| I1F31::from_num(beta);
        let composed = compose_beta_32(beta(first), beta(second)).expect("below light");
        assert_near(composed.to_num::<f64>(), sum, 1.5 * 2_f64.powi(-31));
        let rapidity = |beta: f64| Rapidity::from_beta(I1F63::from_num(beta)).expect("below light");
        assert_near((rapidity(first) + rapidity(second)).to_beta().to_num(), sum, 2e-16);
    }
}

/// [V] Redshift z = 1/k - 1, receding: 0.1, 1, 2, 6, 10.
#[test]
fn redshifts() {
    let rows: [(u64, u64, f64); 5] =
        [(10, 11, 0.0950226244343891), (1, 2, 0.6), (1, 3, 0.8), (1, 7, 0.96), (1, 11, 0.983606557377049)];
    for (k_over, k_under, receding) in rows {
        assert_near(ratio(k_over, k_under).to_beta().to_num(), -receding, 5e-16);
    }
}

/// [V] Operating range: v, z = atanh(v/c), expm1(-z).
const OPERATING_RANGE: [(i64, f64, f64); 6] = [
    (1, 3.3356409519815205081e-9, -3.335640946418270234e-9),
    (7_000, 2.3349486668114012054e-5, -2.3349214070971851744e-5),
    (7_500, 2.5017307145080561506e-5, -2.501699421486172843e-5),
    (11_200, 3.7359178679573867279e-5, -3.7358480834148398818e-5),
    (17_000, 5.6705896244466227098e-5, -5.6704288495521541567e-5),
    (30_000_000, 0.10040527605800708624, -0.095529216606819701888),
];

#[test]
fn operating_range() {
    for (speed, z, offset) in OPERATING_RANGE {
        let mut forms = vec![
            Rapidity::from_range_rate_wide(I32F32::from_num(speed)).expect("below light"),
            Rapidity::from_range_rate_f32(speed as f32).expect("below light"),
        ];
        if speed <= 17_000 {
            forms.push(Rapidity::from_range_rate(I16F16::from_num(speed)));
            forms.push(Rapidity::from_range_rate_mm_per_s(speed as i32 * 1_000));
        }
        for receding in forms {
            // A step of the rapidity, and the last digit of an f64.
            assert_near(value(receding), -z, STEP + z * 2e-16);
            assert_near(offset_value(receding), offset, STEP + z * 4e-16);
        }
        let approaching = Rapidity::from_range_rate_wide(I32F32::from_num(-speed)).expect("below light");
        assert_near(value(approaching), z, STEP + z * 2e-16);
    }
}

/// [V] The same rows that fit the narrow format, to half a step of 2^-44.
#[test]
fn operating_range_of_the_narrow_kernels() {
    let step = 2_f64.powi(-44);
    for (speed, z, offset) in &OPERATING_RANGE[..5] {
        let receding = Rapidity::from_range_rate(I16F16::from_num(*speed));
        let narrow = NarrowRapidity::from_rapidity_nearest(receding).expect("below 2^-13");
        assert_near(f64::from(narrow.to_bits()) * step, -z, 0.501 * step);
        // Half a step of the argument, half a step of the result.
        assert_near(f64::from(narrow.to_offset_bits()) * step, *offset, 1.01 * step);
        assert_near(f64::from(narrow.to_slope_bits()) * step, -offset, 1.01 * step);
        assert_near(f64::from(narrow.to_beta_bits()) * step, -(*speed as f64) / LIGHT, 1.01 * step);
        let exact = narrow::first_order_range_rate((*speed as i32) << 16);
        let unit = 1.0 / 65_536.0;
        assert_near(f64::from(exact) * unit, -offset * LIGHT, 1.2 * unit);
    }
}

/// [V] 437 MHz, receding at 7 km/s: 436989796.393450985 Hz; f0(1-b) and f0/(1+b) lie 0.1191 Hz (b^2 f0 / 2)
/// to either side; at 8.4 GHz 2.290 Hz.
#[test]
fn three_conventions() {
    let receding = Rapidity::from_range_rate(I16F16::from_num(7_000));
    let received = receding.to_factor().of(hertz(437_000_000, 0)).expect("in range");
    assert_near(hertz_value(received), 436_989_796.393450985, 1.2e-7);
    let beta = 7_000.0 / LIGHT;
    assert_near(hertz_value(received) - 437e6 * (1.0 - beta), 0.1191, 5e-5);
    assert_near(437e6 / (1.0 + beta) - hertz_value(received), 0.1191, 5e-5);
    let received = receding.to_factor().of(hertz(8_400_000_000, 0)).expect("in range");
    assert_near(hertz_value(received) - 8.4e9 * (1.0 - beta), 2.290, 5e-4);
}

/// astropy 8.0.2, docstring of `doppler_relativistic` [S V]: rest 115.2712 GHz, observed 115.2832 GHz is
/// -31.207467619351537 km/s; `doppler_radio`, same docstring [S]: -31.209092088877583 km/s.
#[test]
fn carbon_monoxide_line() {
    let rest = hertz(115_271_200_000, 0);
    let observed = hertz(115_283_200_000, 0);
    let approaching = Rapidity::from_frequencies(observed, rest).expect("a ratio");
    let speed = approaching.to_beta().to_num::<f64>() * LIGHT / 1e3;
    assert_near(-speed, -31.207467619351537, 1e-10);
    // The radio convention is first order: (rest - observed) / rest.
    assert_near(-offset_value(approaching) * LIGHT / 1e3, -31.209092088877583, 1e-10);
    // Same source [S]: +1250 km/s is 114.79156866993588 GHz.
    let receding = Rapidity::from_range_rate_mm_per_s(1_250_000_000);
    let received = receding.to_factor().of(rest).expect("in range");
    assert_near(hertz_value(received), 114.79156866993588e9, 1e-5 + 1.2e-7);
}

/// OpenStax University Physics 3, section 5.7 [M V]: 0.825c, 0.525 m -> 1.70 m (exact 1.6953982); 0.350c,
/// 1.50 GHz -> 1.04 GHz (1.040833).
#[test]
fn textbook_examples() {
    let receding = |beta: f64| -Rapidity::from_beta(I1F63::from_num(beta)).expect("below light");
    assert_near(0.525 / factor_value(receding(0.825).to_factor()), 1.6953982, 5e-8);
    let received = receding(0.350).to_factor().of(hertz(1_500_000_000, 0)).expect("in range");
    assert_near(hertz_value(received), 1.040833e9, 500.0);
}

/// Ives-Stilwell, Botermann et al. 2014 type [M V]: f+ f- = f0^2; beta 0.338, 548.5 nm -> 385.81363 and
/// 779.78647 nm, gamma 1.06253427558.
#[test]
fn two_way_spectroscopy() {
    let with = Rapidity::from_beta(I1F63::from_num(0.338)).expect("below light");
    assert_near(548.5 / factor_value(with.to_factor()), 385.81363, 5e-6);
    assert_near(548.5 / factor_value((-with).to_factor()), 779.78647, 5e-6);
    assert_eq!(with + -with, Rapidity::ZERO);
    let speed = I32F32::from_num(0.338 * LIGHT);
    let dilation = Rapidity::from_transverse_speed(speed).expect("below light");
    assert_near(1.0 / factor_value(dilation.to_factor()), 1.06253427558, 5e-12);
}

/// [V] Transverse motion at beta 0.005: gamma - 1 = 1.25002343799e-5.
#[test]
fn transverse_motion() {
    let speed = I32F32::from_num(0.005 * LIGHT);
    let dilation = Rapidity::from_transverse_speed(speed).expect("below light");
    assert_near(offset_value(-dilation), 1.25002343799e-5, 5e-17);
}

/// Geocentric gravitational constant of check values, m^3/s^2.
const MU: f64 = 3.986004418e14;

/// IS-GPS-200E [S V]: relative offset of the satellite clock -4.4647e-10; 10.23 MHz less 4.5674e-3 Hz is
/// 10.2299999954326 MHz. [V] second-order Doppler at 3873.83 m/s is -8.3485238e-11, and the whole from
/// L_G - 3GM/(2ac^2), a = 26561.75 km, L_G = 6.969290134e-10, is 4.464732995e-10.
#[test]
fn navigation_satellite_clock() {
    let semi_major_axis = 26_561_750.0_f64;
    let speed = I32F32::from_num((MU / semi_major_axis).sqrt());
    assert_near(speed.to_num(), 3_873.83, 5e-3);
    let dilation = Rapidity::from_transverse_speed(speed).expect("below light");
    assert_near(offset_value(dilation), -8.3485238e-11, 5e-19);
    // Potential of the satellite less that of the geoid, whose own clock rate L_G holds gravity and rotation.
    let difference = 6.969290134e-10 * LIGHT * LIGHT - MU / semi_major_axis;
    let gravity = Rapidity::from_potential(I48F16::from_num(difference));
    let clock = gravity + dilation;
    assert_near(offset_value(clock), 4.464732995e-10, 5e-19);
    // Set low by as much on the ground, the clock is right in orbit: 10.2299999954326 MHz. IS-GPS rounds the
    // offset to four places, which is 1.3e-7 Hz of this line.
    let set = (-clock).to_factor().of(hertz(10_230_000, 0)).expect("in range");
    assert_near(hertz_value(set), 10_229_999.9954326, 1e-6);
    let published = Rapidity::from_parts_per_billion(I32F32::from_num(-0.44647)).expect("an offset");
    let shift = published.to_offset().of(hertz(10_230_000, 0)).expect("in range");
    assert_near(shift.to_num(), -4.5674e-3, 5e-8);
}

/// [V] Net clock rates of circular orbits over the geoid: 400 / 550 / 800 / 1200 km, and geostationary; zero
/// at a radius of 9545.51 km. The heights are over 6371 km or over 6378.137 km: not said, both are near.
#[test]
fn orbiting_clocks() {
    let clock = |radius: f64| {
        let difference = 6.969290134e-10 * LIGHT * LIGHT - MU / radius;
        let speed = I32F32::from_num((MU / radius).sqrt());
        let dilation = Rapidity::from_transverse_speed(speed).expect("below light");
        offset_value(Rapidity::from_potential(I48F16::from_num(difference)) + dilation)
    };
    let rows = [(400e3, -2.8454e-10), (550e3, -2.6329e-10), (800e3, -2.2985e-10), (1_200e3, -1.8093e-10)];
    for (height, rate) in rows {
        assert_near(clock(6_378_137.0 + height), rate, 6e-15);
    }
    assert_near(clock(42_164_170.0), 5.3915e-10, 6e-15);
    assert_near(clock(9_545_510.0), 0.0, 1e-15);
}

/// Down/up ratios of coherent transponders: 240/221 and 880/749 [S]; 880/221, 240/749, 3344/749, 3344/221
/// [M]. Base 9.5625 MHz, exact [M V]: x221 = 2113.3125, x240 = 2295.0, x749 = 7162.3125, x880 = 8415.0,
/// x3344 = 31977.0 MHz.
#[test]
fn turnaround_ratios() {
    let channel = |number: u64| match number {
        221 => hertz(2_113_312_500, 0),
        240 => hertz(2_295_000_000, 0),
        749 => hertz(7_162_312_500, 0),
        880 => hertz(8_415_000_000, 0),
        _ => hertz(31_977_000_000, 0),
    };
    for (down, up) in [(240, 221), (880, 749), (880, 221), (240, 749), (3344, 749), (3344, 221)] {
        let turnaround = ratio(down, up);
        let seen = turnaround.to_factor().of(channel(up)).expect("in range");
        // A step of the rapidity at 32 GHz is 2.8e-8 Hz, less than the 6e-8 Hz of the format.
        assert!(seen.to_bits().abs_diff(channel(down).to_bits()) <= 2, "{down}/{up}");
        let measured = Rapidity::from_frequencies(channel(down), channel(up)).expect("a ratio");
        assert!((measured - turnaround).to_bits().abs() <= 1);
    }
}

/// [V] Two-way f_r = f_u G exp(-2z), 7162.3125 MHz up, 880/749: +7000, +30000, -17000 m/s.
#[test]
fn two_way_carrier() {
    let up = hertz(7_162_312_500, 0);
    let rows = [
        (7_000, 8_414_607_037.31492403),
        (30_000, 8_413_316_003.39958523),
        (-17_000, 8_415_954_414.35369269),
    ];
    for (speed, received) in rows {
        let one_way = Rapidity::from_range_rate(I16F16::from_num(speed));
        let seen = (one_way + one_way + ratio(880, 749)).to_factor().of(up).expect("in range");
        // Half a step of the format, four steps of rapidity, and the last digit of an f64 (1e-6 Hz).
        assert_near(hertz_value(seen), received, 1.1e-6);
    }
    // The first-order form -2 beta is 168 Hz off at 30 km/s.
    let first_order = 8.415e9 * (1.0 - 2.0 * 30_000.0 / LIGHT);
    assert_near(8_413_316_003.39958523 - first_order, 168.0, 1.0);
}
