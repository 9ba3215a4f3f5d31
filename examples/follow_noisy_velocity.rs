//! Follow a pass from range-rate estimates alone: 10 Hz, 0.1 m/s of noise, one in twenty wildly wrong,
//! 0.3 s late, none at all for 20 s around closest approach.
//!
//! Shaped like firmware: `control` is what a timer interrupt would call; it reads no clock, does not
//! allocate and cannot panic. `World` is what the host plays around it. Run with
//! `cargo run --release --example follow_noisy_velocity`.

use shiftkeel::follow::FollowError;
use shiftkeel::follow::velocity::{Estimate, Outcome, PassDynamics, Tick, VelocityFilter, VelocitySettings};
use shiftkeel::rapidity::{Motion, Rapidity};
use shiftkeel::time::GpsTime;

const CARRIER: f64 = 437e6;
const LIGHT: f64 = 299_792_458.0;
/// Estimates come this much after the instant they hold for, s.
const LATE: f64 = 0.3;

/// What the firmware keeps.
struct Follower {
    settings: VelocitySettings,
    filter: VelocityFilter,
}

impl Follower {
    fn new() -> Result<Self, FollowError> {
        let settings = VelocitySettings::for_pass(0.1, 0.1, PassDynamics::LOW_ORBIT)?.with_latency(0.5)?;
        Ok(Self { settings, filter: VelocityFilter::new() })
    }

    /// One tick: takes in what has arrived, and says where the carrier is until the next one.
    fn control(&mut self, now: GpsTime, arrived: Option<Estimate>) -> (Outcome, Option<Motion>) {
        let tick = Tick { now, estimate: arrived, ahead: Rapidity::ZERO };
        let outcome = self.filter.step(&self.settings, tick).or_else(|_refused| {
            // Whatever is wrong with the estimate, the tick goes on without it.
            self.filter.step(&self.settings, Tick::without_estimate(now))
        });
        (outcome.unwrap_or(Outcome::Coasted), self.filter.predict(&self.settings, now))
    }
}

/// An overhead-ish pass of a circular orbit at 550 km over a site that stands still, and its noise.
struct World {
    random: u64,
}

impl World {
    /// Range rate, m/s, `t` seconds after closest approach.
    fn range_rate(t: f64) -> f64 {
        let (orbit, earth, rate): (f64, f64, f64) = (6_921e3, 6_371e3, 1.0965e-3);
        let across = 0.05f64.cos();
        let range = (orbit * orbit + earth * earth - 2.0 * orbit * earth * across * (rate * t).cos()).sqrt();
        orbit * earth * across * rate * (rate * t).sin() / range
    }

    fn even(&mut self) -> f64 {
        self.random =
            self.random.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
        (self.random >> 11) as f64 / (1u64 << 53) as f64
    }

    /// The sum of twelve even numbers is close to normal.
    fn measured(&mut self, t: f64) -> f64 {
        let noise = 0.1 * ((0..12).map(|_| self.even()).sum::<f64>() - 6.0);
        let outlier = if self.even() < 0.05 { 100.0 } else { 0.0 };
        Self::range_rate(t) + noise + outlier
    }
}

fn gps(t: f64) -> GpsTime {
    GpsTime::from_bits(((1_464_000_000.0 + t) * (1u64 << 30) as f64) as i64)
}

fn main() -> Result<(), FollowError> {
    let mut world = World { random: 7 };
    let mut follower = Follower::new()?;
    let (mut sum, mut count, mut in_gap): (f64, u32, f64) = (0.0, 0, 0.0);
    println!("  time s   shift Hz   error Hz   stated Hz   what the tick did");
    for tick in -3000i32..=3000 {
        let t = f64::from(tick) / 10.0;
        let gap = (-10.0..10.0).contains(&t);
        let arrived = if gap {
            None
        } else {
            let measured = world.measured(t - LATE);
            Some(Estimate::from_metres_per_second(gps(t - LATE), measured as f32)?)
        };
        let (outcome, motion) = follower.control(gps(t), arrived);
        let Some(motion) = motion else { continue };
        let to_hertz = |rapidity: Rapidity| rapidity.to_bits() as f64 / (1u64 << 60) as f64 * CARRIER;
        let shift = to_hertz(motion.rapidity);
        let error = shift + (World::range_rate(t) / LIGHT).atanh() * CARRIER;
        let stated = follower.filter.uncertainty(&follower.settings, gps(t));
        let stated = stated.map_or(0.0, |stated| to_hertz(stated.rapidity()));
        if tick % 300 == 0 || tick == 99 {
            println!("{t:8.1} {shift:10.3} {error:10.3} {stated:11.3}   {outcome:?}");
        }
        if gap {
            in_gap = in_gap.max(error.abs());
        } else if t > -280.0 && !(10.0..12.0).contains(&t) {
            sum += error * error;
            count += 1;
        }
    }
    let rms = (sum / f64::from(count)).sqrt();
    println!(
        "rms error {rms:.3} Hz; largest in the gap of 20 s {in_gap:.3} Hz (noise of one estimate: 0.146 Hz)"
    );
    assert!(rms < 0.06 && in_gap < 5.0, "the filter does worse than it states");
    Ok(())
}
