//! Element age: when elements count as old, and what that may cost.
//!
//! Figures of common practice, without a published source: about 1 km near the epoch, 0.5 to 3 km more a day; low
//! orbits about three days. The hertz of a kilometre are computed elsewhere for the synthetic pass: 0.132 s and
//! 17.9 Hz at closest approach at 437 MHz, 90.2 at 2.2 GHz, 344 at 8.4 GHz (71.6 degrees; overhead a little more).

use shiftkeel_desk::age::ElementAge;
use shiftkeel_desk::elements::{ElementFile, ElementSet};
use shiftkeel_desk::instant;

fn synthetic() -> ElementSet {
    let file =
        ElementFile::read("synthetic.txt", include_str!("data/synthetic.txt")).expect("valid elements");
    file.sets()[0].clone()
}

fn age(set: &ElementSet, days: f64) -> ElementAge {
    ElementAge::new(set, instant::after(set.epoch, days * 86_400.0).expect("a time"))
}

#[test]
fn a_low_orbit_is_old_after_about_three_days() {
    let set = synthetic();
    let limit = age(&set, 0.0).limit_days;
    assert!((2.5..3.5).contains(&limit), "{limit}");
    for (days, old) in [(0.0, false), (limit - 0.01, false), (limit + 0.01, true), (-limit - 0.01, true)] {
        assert_eq!(age(&set, days).is_old(), old, "{days}");
        assert_eq!(age(&set, days).warning("IT", Some(437e6)).is_some(), old, "{days}");
    }
}

#[test]
fn drag_makes_it_old_sooner_and_height_later() {
    let still = synthetic();
    let limit = age(&still, 0.0).limit_days;
    let mut by_rate = still.clone();
    by_rate.mean.mean_motion_dot = 5e-4;
    assert!(age(&by_rate, 0.0).limit_days < limit / 2.0, "{}", age(&by_rate, 0.0).limit_days);
    let mut by_second_rate = still.clone();
    by_second_rate.mean.mean_motion_ddot = 1e-3;
    assert!(age(&by_second_rate, 0.0).limit_days < limit);
    let mut by_drag = still.clone();
    by_drag.mean.drag_term = 2e-3;
    assert!(age(&by_drag, 0.0).limit_days < limit / 2.0, "{}", age(&by_drag, 0.0).limit_days);
    let mut high = still;
    high.mean.mean_motion = 2.005;
    assert_eq!(age(&high, 0.0).limit_days, 14.0);
}

#[test]
fn what_a_kilometre_costs() {
    let age = age(&synthetic(), 5.0);
    let per_kilometre = 1000.0 / age.along_track;
    assert!((age.lateness * per_kilometre - 0.132).abs() < 0.001, "{}", age.lateness * per_kilometre);
    for (carrier, hertz) in [(437e6, 17.9), (2.2e9, 90.2), (8.4e9, 344.0)] {
        let found = age.cost(carrier) * per_kilometre;
        assert!((1.0..1.12).contains(&(found / hertz)), "{carrier}: {found}");
    }
    assert!((3.5e3..6e3).contains(&age.along_track), "{}", age.along_track);
}
