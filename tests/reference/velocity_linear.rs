//! The best linear filter, found by a search, in f64 and independent of the crate.
//!
//! A filter of `N` states (level and N - 1 derivatives) with fixed gains, at even intervals: the
//! alpha-beta, alpha-beta-gamma and one order more. It is helped by what no receiver has: it starts
//! from the true level and rate, is told which estimates are outliers (it coasts over them), and
//! its gains are the ones that do best on the very runs it is judged on.

/// One run: truth, estimate and whether the estimate may be used, at even intervals.
pub struct Run {
    pub truth: Vec<f64>,
    pub estimate: Vec<f64>,
    pub usable: Vec<bool>,
    /// Whether the error at this tick counts.
    pub counts: Vec<bool>,
}

/// Root mean square error of a filter with `gains` over runs at intervals of one.
pub fn rms<const N: usize>(runs: &[Run], gains: &[f64; N]) -> f64 {
    let (mut sum, mut count) = (0.0f64, 0.0);
    for run in runs {
        let mut state = [0.0; N];
        state[0] = run.truth[0];
        if N > 1 {
            state[1] = run.truth[1] - run.truth[0];
        }
        for tick in 1..run.truth.len() {
            // Taylor step of one interval.
            for low in 0..N {
                let mut factor = 1.0;
                for high in low + 1..N {
                    factor /= (high - low) as f64;
                    state[low] += state[high] * factor;
                }
            }
            if run.usable[tick] {
                let innovation = run.estimate[tick] - state[0];
                for (part, gain) in state.iter_mut().zip(gains) {
                    *part += gain * innovation;
                }
            }
            if run.counts[tick] {
                sum += (state[0] - run.truth[tick]).powi(2);
                count += 1.0;
            }
        }
    }
    let rms = (sum / count).sqrt();
    if rms.is_finite() { rms } else { 1e300 }
}

/// The gains of least rms, by a Nelder-Mead search over their logarithms from `start`.
pub fn best<const N: usize>(runs: &[Run], start: [f64; N]) -> (f64, [f64; N]) {
    let value = |at: &[f64; N]| rms(runs, &at.map(f64::exp));
    let first = start.map(f64::ln);
    let mut corners = vec![(value(&first), first)];
    for axis in 0..N {
        let mut corner = first;
        corner[axis] += 0.5;
        corners.push((value(&corner), corner));
    }
    for _ in 0..120 {
        corners.sort_by(|a, b| a.0.total_cmp(&b.0));
        let worst = corners[N];
        let mut centre = [0.0; N];
        for corner in &corners[..N] {
            for (middle, part) in centre.iter_mut().zip(corner.1) {
                *middle += part / N as f64;
            }
        }
        let along = |factor: f64| {
            let mut point = centre;
            for (part, far) in point.iter_mut().zip(worst.1) {
                *part += factor * (far - *part);
            }
            (value(&point), point)
        };
        let mirrored = along(-1.0);
        let tried = if mirrored.0 < corners[0].0 {
            let far = along(-2.0);
            if far.0 < mirrored.0 { far } else { mirrored }
        } else if mirrored.0 < corners[N - 1].0 {
            mirrored
        } else {
            along(if mirrored.0 < worst.0 { -0.5 } else { 0.5 })
        };
        if tried.0 < worst.0 {
            corners[N] = tried;
        } else {
            let best = corners[0].1;
            for corner in &mut corners[1..] {
                for (part, near) in corner.1.iter_mut().zip(best) {
                    *part = 0.5 * (*part + near);
                }
                corner.0 = value(&corner.1);
            }
        }
    }
    corners.sort_by(|a, b| a.0.total_cmp(&b.0));
    (corners[0].0, corners[0].1.map(f64::exp))
}
