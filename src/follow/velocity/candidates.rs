//! The last estimates, used or waiting, and how many agree with the newest.

use super::dynamics::Covariance;
use super::estimate::Estimate;
use super::settings::VelocitySettings;
use super::units::seconds;
use crate::rapidity::Rapidity;
use crate::time::GpsTime;
use libm::sqrtf;

#[derive(Clone, Copy, Debug, PartialEq, Eq, Default)]
enum Use {
    #[default]
    Empty,
    Waiting,
    Used,
}

/// One of the last estimates.
#[derive(Clone, Copy, Debug, PartialEq, Default)]
pub(super) struct Candidate {
    pub time: GpsTime,
    pub level: Rapidity,
    /// From the prediction when it came, m/s.
    residual: f32,
    state: Use,
}

impl Candidate {
    pub(super) fn new(estimate: Estimate, residual: f32) -> Self {
        Self { time: estimate.time(), level: estimate.rapidity(), residual, state: Use::Waiting }
    }

    pub(super) fn estimate(&self) -> Estimate {
        Estimate::from_rapidity(self.time, self.level)
    }

    fn agrees(&self, newest: &Self, agreement: &Agreement) -> bool {
        let t = seconds(newest.time, self.time);
        let apart = self.apart(newest, agreement.shape) - agreement.rate * t;
        let allowed = agreement.level + t * t * agreement.bend + t.abs() * agreement.spread;
        let counts = match agreement.shape {
            Shape::Predicted => self.state != Use::Empty,
            // What was used agrees with the prediction, so it cannot speak for a new level.
            Shape::Line => self.state == Use::Waiting,
        };
        counts && apart.abs() <= allowed
    }

    /// How far this estimate is above another, m/s.
    fn apart(&self, other: &Self, shape: Shape) -> f32 {
        match shape {
            Shape::Predicted => self.residual - other.residual,
            Shape::Line => self.estimate().residual(other.level),
        }
    }
}

/// What estimates are compared with.
#[derive(Clone, Copy)]
enum Shape {
    /// The predictions that stood when they came.
    Predicted,
    /// A straight line.
    Line,
}

/// A line through the newest estimate, and how far from it others may be.
#[derive(Clone, Copy)]
pub(super) struct Agreement {
    shape: Shape,
    /// Slope of the line, m/s^2.
    rate: f32,
    /// m/s.
    level: f32,
    /// m/s more per second away from the newest.
    spread: f32,
    /// m/s more per second squared away from the newest.
    bend: f32,
}

impl Agreement {
    /// Along the prediction: both estimates are noisy, and the predicted rate may be off.
    pub(super) fn predicted(settings: &VelocitySettings, covariance: &Covariance) -> Self {
        let spread = sqrtf(settings.gate_squared * covariance.aa);
        let limit = settings.acceleration_limit;
        let spread = if spread < limit { spread } else { limit };
        Self { shape: Shape::Predicted, rate: 0.0, level: level(settings), spread, bend: 0.0 }
    }

    /// Along a line of any slope up to the acceleration limit, which may change by a fiftieth of
    /// it per second.
    fn line(settings: &VelocitySettings, rate: f32) -> Option<Self> {
        let limit = settings.acceleration_limit;
        let bend = limit * (1.0 / 100.0);
        let line = Self { shape: Shape::Line, rate, level: level(settings), spread: 0.0, bend };
        (rate.abs() <= limit).then_some(line)
    }
}

/// Difference of two estimates that noise explains.
fn level(settings: &VelocitySettings) -> f32 {
    sqrtf(2.0 * settings.gate_squared * settings.variance)
}

/// The last eight estimates, newest first.
#[derive(Clone, Copy, Debug, PartialEq, Default)]
pub(super) struct Candidates([Candidate; 8]);

impl Candidates {
    pub(super) fn push(&mut self, newest: Candidate) {
        let [a, b, c, d, e, f, g, _] = self.0;
        self.0 = [newest, a, b, c, d, e, f, g];
    }

    fn newest(&self) -> Candidate {
        let [newest, ..] = self.0;
        newest
    }

    /// Whether enough of the last agree with the newest, itself included.
    pub(super) fn confirms(&self, settings: &VelocitySettings, agreement: &Agreement) -> bool {
        let newest = self.newest();
        let last = self.0.iter().take(usize::from(settings.confirm_of));
        let count = last.filter(|one| one.agrees(&newest, agreement)).count();
        count >= usize::from(settings.confirm)
    }

    /// A line through the newest and one of the older half on which enough agree.
    pub(super) fn line(&self, settings: &VelocitySettings) -> Option<Agreement> {
        let newest = self.newest();
        let of = usize::from(settings.confirm_of);
        let older = self.0.iter().take(of).skip(of / 2).filter(|one| one.state == Use::Waiting);
        older
            .filter_map(|one| {
                let t = seconds(newest.time, one.time);
                Agreement::line(settings, one.apart(&newest, Shape::Line) / t)
            })
            .find(|line| self.confirms(settings, line))
    }

    /// Those of the last that agree with the newest and wait, oldest first.
    pub(super) fn waiting(&self, of: u8, agreement: Agreement) -> impl Iterator<Item = Candidate> + use<> {
        let newest = self.newest();
        let mut last = self.0;
        last.reverse();
        let skip = last.len().saturating_sub(usize::from(of));
        last.into_iter()
            .skip(skip)
            .filter(move |one| one.state == Use::Waiting && one.agrees(&newest, &agreement))
    }

    /// Marks the newest as used: it agrees with the prediction from now on.
    pub(super) fn settle_newest(&mut self) {
        let [newest, ..] = &mut self.0;
        *newest = Candidate { residual: 0.0, state: Use::Used, ..*newest };
    }

    /// Marks as used those that agree, drops the others that waited; after a line, which is a new start,
    /// drops those used before as well.
    pub(super) fn settle(&mut self, of: u8, agreement: Agreement) {
        let newest = self.newest();
        for (age, one) in self.0.iter_mut().enumerate() {
            let agreed = age < usize::from(of) && one.agrees(&newest, &agreement);
            let kept = matches!(agreement.shape, Shape::Predicted) && one.state == Use::Used;
            *one = if agreed || kept {
                Candidate { residual: 0.0, state: Use::Used, ..*one }
            } else {
                Candidate::default()
            };
        }
    }

    /// Forgets what came before `time`.
    pub(super) fn forget_before(&mut self, time: GpsTime) {
        self.0 = self.0.map(|one| if one.time < time { Candidate::default() } else { one });
    }

    /// Time of the oldest that waits, or `otherwise`.
    pub(super) fn oldest_waiting(&self, otherwise: GpsTime) -> GpsTime {
        let waiting = self.0.iter().filter(|one| one.state == Use::Waiting);
        waiting.fold(otherwise, |oldest, one| if one.time < oldest { one.time } else { oldest })
    }
}
