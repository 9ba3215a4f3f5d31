//! How a level, its rate and their covariance move on between estimates.
//!
//! Level: receding speed v (held as rapidity in [`Track`], in m/s here). Rate: acceleration a. Third:
//! jerk for alpha-beta-gamma, inverse range k = 1/r (per megametre) for a pass, unused for alpha-beta.
//!
//! # Source
//! Pass: for a circle of angular rate n past a fixed site, s = r^2 obeys s''' = -n^2 s'. Hence, with
//! S = sin(n t)/n, C = (1 - cos(n t))/n^2, all from this instant's v, a, r:
//! R^2 = s(t)/s = 1 + 2 v k S + 2 (v^2 k^2 + a k) C, and a r^3 + n^2 r^4 / 4 stays constant.

use super::settings::{Dynamics, PassDynamics, VelocitySettings};
use super::units::{rapidity_from_speed, seconds};
use crate::rapidity::Rapidity;
use crate::time::GpsTime;
use libm::sqrtf;

/// Inverse metres per inverse megametre.
const MEGA: f32 = 1e-6;
/// Smallest ratio of squared ranges, and divisor, that is worked with: keeps every path finite.
const LEAST: f32 = 1e-6;

/// Level and rates at an instant.
#[derive(Clone, Copy, Debug, PartialEq, Default)]
pub(super) struct Track {
    pub time: GpsTime,
    /// I4F60, positive = approaching.
    pub level: i64,
    pub acceleration: f32,
    pub third: f32,
}

/// Upper triangle of a symmetric covariance, by rows: level, acceleration, third.
#[derive(Clone, Copy, Debug, PartialEq, Default)]
pub(super) struct Covariance {
    pub vv: f32,
    pub va: f32,
    pub vx: f32,
    pub aa: f32,
    pub ax: f32,
    pub xx: f32,
}

/// What an advance changes.
pub(super) struct Advance {
    /// Growth of the speed, m/s.
    pub speed: f32,
    /// Distance gone beyond speed times time, m.
    pub distance: f32,
    pub acceleration: f32,
    pub third: f32,
}

/// Larger of two; the first must not be NaN.
fn at_least(value: f32, least: f32) -> f32 {
    if value > least { value } else { least }
}

fn clamp(value: f32, least: f32, most: f32) -> f32 {
    if value < most { at_least(value, least) } else { most }
}

impl Track {
    pub(super) fn speed(&self) -> f32 {
        super::units::speed_from_rapidity(self.level)
    }

    /// Changes over `t` seconds.
    pub(super) fn advance(&self, dynamics: &Dynamics, t: f32) -> Advance {
        let (a, x) = (self.acceleration, self.third);
        match dynamics {
            Dynamics::AlphaBeta => {
                Advance { speed: a * t, distance: 0.5 * a * t * t, acceleration: a, third: x }
            }
            Dynamics::AlphaBetaGamma => Advance {
                speed: t * (a + 0.5 * x * t),
                distance: t * t * (0.5 * a + x * t * (1.0 / 6.0)),
                acceleration: a + x * t,
                third: x,
            },
            Dynamics::Pass(pass) => self.pass(pass, t),
        }
    }

    fn pass(&self, pass: &PassDynamics, t: f32) -> Advance {
        let (v, a, k) = (self.speed(), self.acceleration, self.third * MEGA);
        let nn = pass.orbit_rate * pass.orbit_rate;
        let ntt = nn * t * t;
        let short = t * ntt * (1.0 / 6.0 - ntt * (1.0 / 120.0));
        let sine = t - short;
        let turn = t * t * (0.5 - ntt * (1.0 / 24.0 - ntt * (1.0 / 720.0)));
        let cosine = 1.0 - nn * turn;
        let along = v * k * sine;
        let bend = v * v * k + a;
        let square = at_least(1.0 + 2.0 * along + 2.0 * bend * k * turn, LEAST);
        let ratio = sqrtf(square);
        let shrink = 1.0 / ratio;
        let wide = sine + v * k * turn;
        let fall = (nn * wide * wide + 2.0 * a * k * turn) / at_least(cosine + along + ratio, LEAST);
        let half = 2.0 / (ratio + 1.0);
        let gone = half * (v * sine + bend * turn);
        let beyond = half * (bend * turn - v * short - 0.5 * v * t * (k * gone));
        // n^2 (r^4 - s^2) / (4 r^3), with r^4 - s^2 = -(s - r^2) (s + r^2) and s - r^2 = gone (s^1/2 + r).
        let bent = a - 0.25 * nn * gone * (ratio + 1.0) * (1.0 + square);
        Advance {
            speed: (a * sine - v * fall) * shrink,
            distance: beyond,
            acceleration: bent * shrink * (shrink * shrink),
            third: self.third * shrink,
        }
    }

    /// The same track at another instant.
    pub(super) fn at(&self, dynamics: &Dynamics, time: GpsTime) -> Self {
        if time == self.time {
            return *self;
        }
        self.after(dynamics, time, &self.advance(dynamics, seconds(self.time, time)))
    }

    fn after(&self, dynamics: &Dynamics, time: GpsTime, advance: &Advance) -> Self {
        let moved = Self {
            time,
            level: self.level.saturating_add(rapidity_from_speed(advance.speed)),
            acceleration: advance.acceleration,
            third: advance.third,
        };
        moved.limited(dynamics)
    }

    /// Adds a correction.
    pub(super) fn corrected(&self, dynamics: &Dynamics, by: [f32; 3]) -> Self {
        let [speed, acceleration, third] = by;
        let moved = Self {
            time: self.time,
            level: self.level.saturating_add(rapidity_from_speed(speed)),
            acceleration: self.acceleration + acceleration,
            third: self.third + third,
        };
        moved.limited(dynamics)
    }

    /// Holds a pass inside what its geometry allows: range in its limits, acceleration not negative.
    fn limited(self, dynamics: &Dynamics) -> Self {
        let Dynamics::Pass(pass) = dynamics else { return self };
        let third = clamp(self.third, 0.5 / (MEGA * pass.farthest_range), 2.0 / (MEGA * pass.nearest_range));
        Self { acceleration: at_least(self.acceleration, 0.0), third, ..self }
    }

    /// A start from one estimate: its level, and rates as they are before anything is measured.
    pub(super) fn start(settings: &VelocitySettings, time: GpsTime, level: Rapidity) -> (Self, Covariance) {
        let limit = settings.acceleration_limit;
        let (third, spread) = match settings.dynamics {
            Dynamics::AlphaBeta => (0.0, 0.0),
            // Jerk that could build the limit up in ten intervals.
            Dynamics::AlphaBetaGamma => (0.0, 0.1 * limit / settings.interval),
            Dynamics::Pass(pass) => {
                let near = 1.0 / (MEGA * pass.nearest_range);
                let far = 1.0 / (MEGA * pass.farthest_range);
                (2.0 * far, 0.5 * (near - far))
            }
        };
        let track = Self { time, level: level.to_bits(), acceleration: 0.0, third };
        (
            track,
            Covariance {
                vv: settings.variance,
                aa: limit * limit,
                xx: spread * spread,
                ..Covariance::default()
            },
        )
    }
}

impl Covariance {
    /// A track and its covariance at another instant.
    pub(super) fn advanced(
        &self,
        settings: &VelocitySettings,
        track: &Track,
        time: GpsTime,
    ) -> (Track, Self) {
        let t = seconds(track.time, time);
        let advance = track.advance(&settings.dynamics, t);
        let moved = match &settings.dynamics {
            Dynamics::AlphaBeta => self.carried_line(t),
            Dynamics::AlphaBetaGamma => self.carried_bend(t),
            Dynamics::Pass(_) => self.carried(&pass_transition(track, &advance, t)),
        };
        let later = track.after(&settings.dynamics, time, &advance);
        (later, moved.with_noise(settings, track, t))
    }

    /// Carried by level' = level + a t.
    fn carried_line(&self, t: f32) -> Self {
        let va = self.va + t * self.aa;
        Self { vv: self.vv + t * (self.va + va), va, ..*self }
    }

    /// Carried by level' = level + a t + x t^2 / 2 and so on.
    fn carried_bend(&self, t: f32) -> Self {
        let h = 0.5 * t * t;
        // Product of the transition with the covariance, then with its transpose.
        let va = self.va + t * self.aa + h * self.ax;
        let vx = self.vx + t * self.ax + h * self.xx;
        let ax = self.ax + t * self.xx;
        let aa = self.aa + t * self.ax;
        let vv = self.vv + t * self.va + h * self.vx;
        Self { vv: vv + t * va + h * vx, va: va + t * vx, vx, aa: aa + t * ax, ax, xx: self.xx }
    }

    fn carried(&self, f: &[[f32; 3]; 3]) -> Self {
        let rows = f.map(|[p, q, r]| {
            [
                p * self.vv + q * self.va + r * self.vx,
                p * self.va + q * self.aa + r * self.ax,
                p * self.vx + q * self.ax + r * self.xx,
            ]
        });
        let dot = |m: [f32; 3], n: [f32; 3]| {
            let ([a, b, c], [d, e, f]) = (m, n);
            a * d + b * e + c * f
        };
        let ([m, n, o], [p, q, r]) = (rows, *f);
        Self { vv: dot(m, p), va: dot(m, q), vx: dot(m, r), aa: dot(n, q), ax: dot(n, r), xx: dot(o, r) }
    }

    fn with_noise(&self, settings: &VelocitySettings, track: &Track, t: f32) -> Self {
        let mut sum = *self;
        match &settings.dynamics {
            Dynamics::AlphaBetaGamma => sum.add_increments(settings, t),
            Dynamics::AlphaBeta => sum.add_jerks(settings, t),
            Dynamics::Pass(pass) => {
                sum.add_jerks(settings, t);
                let wander = pass.range_wander * track.third;
                let jerk = -3.0 * track.acceleration * track.speed() * MEGA;
                sum.add_wander(wander * wander * t, jerk, t);
            }
        }
        sum.vv = at_least(sum.vv, 0.0);
        sum
    }

    /// Keeps what rounding may spoil when a very uncertain state is measured well: variances are not
    /// negative, and no covariance is larger than its two variances allow.
    fn sound(mut self) -> Self {
        (self.aa, self.xx) = (at_least(self.aa, 0.0), at_least(self.xx, 0.0));
        let kept = |cross: f32, one: f32, two: f32| if cross * cross <= one * two { cross } else { 0.0 };
        self.va = kept(self.va, self.vv, self.aa);
        self.vx = kept(self.vx, self.vv, self.xx);
        self.ax = kept(self.ax, self.aa, self.xx);
        self
    }

    /// Jerks, each constant over one interval T: over n intervals the sum of g g^T, g = ((m - 1/2) T^2, T)
    /// for age m = 1..n, which is Kalata's model at n = 1. A step shorter than T is one jerk of as much
    /// more variance as keeps the acceleration's growing with time.
    fn add_jerks(&mut self, settings: &VelocitySettings, t: f32) {
        let growth = settings.manoeuvre * settings.interval * t;
        let (square, unit) = (t * t, settings.interval * settings.interval);
        self.vv += growth * at_least(square * (1.0 / 3.0) - unit * (1.0 / 12.0), square * 0.25);
        self.va += growth * t * 0.5;
        self.aa += growth;
    }

    /// Increments of jerk, one an interval: the sum of g g^T, g = (m^2 T^2 / 2, m T, 1) for age m.
    fn add_increments(&mut self, settings: &VelocitySettings, t: f32) {
        let (w, n) = (settings.manoeuvre, t / settings.interval);
        let (sums, step) = if n > 1.0 {
            let first = 0.5 * n * (n + 1.0);
            let second = first * (2.0 * n + 1.0) * (1.0 / 3.0);
            let fourth = second * (3.0 * n * (n + 1.0) - 1.0) * 0.2;
            ([n, first, second, first * first, fourth], settings.interval)
        } else {
            ([n; 5], t)
        };
        let [s0, s1, s2, s3, s4] = sums;
        let square = step * step;
        self.vv += 0.25 * w * square * square * s4;
        self.va += 0.5 * w * square * step * s3;
        self.vx += 0.5 * w * square * s2;
        self.aa += w * square * s2;
        self.ax += w * step * s1;
        self.xx += w * s0;
    }

    /// A random walk of the third state, of variance `walk` over the step, felt as jerk `jerk` times it.
    fn add_wander(&mut self, walk: f32, jerk: f32, t: f32) {
        let pull = jerk * t;
        self.vv += walk * pull * pull * t * t * (1.0 / 20.0);
        self.va += walk * pull * pull * t * (1.0 / 8.0);
        self.vx += walk * pull * t * (1.0 / 6.0);
        self.aa += walk * pull * pull * (1.0 / 3.0);
        self.ax += walk * pull * 0.5;
        self.xx += walk;
    }

    /// After an estimate of variance `noise` was used with the best gain, vv, va and vx over vv + noise.
    pub(super) fn updated(&self, gain: [f32; 3], noise: f32) -> Self {
        let [p, q, r] = gain;
        let left = 1.0 - p;
        Self {
            vv: p * noise,
            va: left * self.va,
            vx: left * self.vx,
            aa: self.aa - q * self.va,
            ax: self.ax - q * self.vx,
            xx: self.xx - r * self.vx,
        }
        .sound()
    }

    /// After an estimate of variance `noise` was used with any gain (Joseph's form).
    pub(super) fn updated_by_any(&self, gain: [f32; 3], noise: f32) -> Self {
        let [p, q, r] = gain;
        let sum = self.vv + noise;
        let left = 1.0 - p;
        Self {
            vv: left * left * self.vv + p * p * noise,
            va: left * self.va - q * self.vv + p * q * sum,
            vx: left * self.vx - r * self.vv + p * r * sum,
            aa: self.aa - 2.0 * q * self.va + q * q * sum,
            ax: self.ax - q * self.vx - r * self.va + q * r * sum,
            xx: self.xx - 2.0 * r * self.vx + r * r * sum,
        }
        .sound()
    }
}

/// Partials of speed, acceleration and inverse range after `t` by the same before. The turning of
/// the path (n) is left out: its part is below 1e-3 over a minute.
fn pass_transition(track: &Track, moved: &Advance, t: f32) -> [[f32; 3]; 3] {
    let (v, a, k) = (track.speed(), track.acceleration, track.third * MEGA);
    let along = v * k * t;
    let square = at_least(1.0 + 2.0 * along + k * t * t * (v * v * k + a), LEAST);
    let ratio = sqrtf(square);
    // Partials of R^2 / 2 over R^2; the third by megametres.
    let inverse = 1.0 / square;
    let by_speed = k * t * (1.0 + along) * inverse;
    let by_rate = 0.5 * k * t * t * inverse;
    let by_range = MEGA * t * (v * (1.0 + along) + 0.5 * a * t) * inverse;
    let speed = v + moved.speed;
    let shrink = 1.0 / ratio;
    let pull = 3.0 * moved.acceleration;
    [
        [
            (1.0 + 2.0 * along) * shrink - speed * by_speed,
            t * shrink - speed * by_rate,
            v * v * t * MEGA * shrink - speed * by_range,
        ],
        [-pull * by_speed, shrink * inverse - pull * by_rate, -pull * by_range],
        [-moved.third * by_speed, -moved.third * by_rate, shrink - moved.third * by_range],
    ]
}
