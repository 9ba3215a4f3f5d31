//! One run of the velocity filter in all its dynamics, folded into a hash: the same on every target.
//! No allocation, no clock, no floating-point function but the square root.

use shiftkeel::follow::velocity::{
    Dynamics, Estimate, Gains, PassDynamics, Tick, VelocityFilter, VelocitySettings,
};
use shiftkeel::rapidity::Rapidity;
use shiftkeel::time::GpsTime;

/// FNV-1a over the bytes of a number.
fn fold(hash: u64, value: i64) -> u64 {
    value
        .to_le_bytes()
        .iter()
        .fold(hash, |hash, byte| (hash ^ u64::from(*byte)).wrapping_mul(0x100_0000_01b3))
}

/// A flyby at 7400 m/s, closest at 60 s, with noise, outliers, a gap and uneven, late estimates.
fn run(settings: &VelocitySettings, ahead: Rapidity, mut hash: u64) -> u64 {
    let mut filter = VelocityFilter::new();
    let mut random = 1u32;
    for tick in 1..1200i64 {
        let now = GpsTime::from_bits(tick << 27);
        let mut input = Tick { ahead, ..Tick::without_estimate(now) };
        random = random.wrapping_mul(1_664_525).wrapping_add(1_013_904_223);
        let gap = tick > 500 && tick < 650;
        if random >> 30 != 0 && !gap {
            let late = i64::from(random >> 24 & 15) << 20;
            let time = GpsTime::from_bits((tick << 27) - late);
            let along = ((tick << 27) - late) as f32 * (1.0 / 1_073_741_824.0) - 75.0;
            let x = along * (1.0 / 79.0);
            let noise = (random >> 8 & 0xffff) as f32 * (1.0 / 200_000.0) - 0.16;
            let outlier = if random >> 20 & 31 == 0 { 100.0 } else { 0.0 };
            let rate = 7400.0 * x / libm::sqrtf(1.0 + x * x) + noise + outlier;
            input.estimate = Estimate::from_metres_per_second(time, rate).ok().map(|e| e.beyond(ahead));
        }
        hash = fold(hash, filter.step(settings, input).is_ok().into());
        let soon = GpsTime::from_bits((tick << 27) + (1 << 25));
        if let (Some(motion), Some(off)) =
            (filter.predict(settings, soon), filter.uncertainty(settings, soon))
        {
            hash = fold(hash, motion.delay.to_bits());
            hash = fold(hash, motion.rapidity.to_bits());
            hash = fold(hash, motion.rate.to_bits());
            hash = fold(hash, off.metres_per_second.to_bits().into());
        }
    }
    hash
}

/// The hash of all runs.
pub fn hash() -> u64 {
    let mut hash = 0xcbf2_9ce4_8422_2325;
    let fixed = Gains::Fixed { alpha: 0.3, beta: 0.05, gamma: 0.0 };
    for (dynamics, gains) in [
        (Dynamics::AlphaBeta, Gains::TrackingIndex(0.1)),
        (Dynamics::AlphaBeta, fixed),
        (Dynamics::AlphaBetaGamma, Gains::TrackingIndex(3e-3)),
        (Dynamics::Pass(PassDynamics::LOW_ORBIT), Gains::TrackingIndex(1e-3)),
    ] {
        let settings = VelocitySettings::new(0.1, 0.125, dynamics, gains);
        if let Ok(settings) = settings.and_then(|settings| settings.with_latency(0.1)) {
            hash = run(&settings, Rapidity::ZERO, hash);
            hash = run(&settings, Rapidity::from_bits(1 << 42), hash);
        }
    }
    hash
}
