//! The routines in the table of costs: ours, and what a user would otherwise write.

mod channel;
mod follow;
mod general;
mod oscillator;
mod pass;
mod rapidity;
mod sample;

use crate::count::{Cost, Opaque, cost};

/// Takes each routine's name and cost.
pub type Report = fn(&str, &Cost);

/// Takes a name and bytes of RAM.
pub type Bytes = fn(&str, usize);

/// Counts every routine.
pub fn all(report: Report, bytes: Bytes) {
    pass::table(report, bytes);
    channel::channel(report);
    follow::velocity(report);
    rapidity::from_speeds(report);
    rapidity::conversions(report);
    general::range_rate(report);
    rapidity::narrow_conversions(report);
    rapidity::fixed_32_conversions(report);
    rapidity::float_32_conversions(report);
    general::functions(report);
    oscillator::cosine_and_sine(report);
    general::cosine_and_sine(report);
    oscillator::oscillator(report);
}

fn line<I: Opaque, O: Opaque>(
    report: Report,
    name: &str,
    input: impl Fn(u32) -> I,
    routine: impl FnMut(I) -> O,
) {
    report(name, &cost(input, routine));
}

/// Bytes of RAM that each state takes.
pub fn states(report: Bytes) {
    use core::mem::size_of;
    report("PassTable", size_of::<shiftkeel::pass::PassTable<'_>>());
    report("Channel", size_of::<shiftkeel::tuning::Channel<false>>());
    report("Sweep", size_of::<shiftkeel::tuning::Sweep>());
    report("Stretch", size_of::<shiftkeel::tuning::Stretch<false>>());
    report("Hold", size_of::<shiftkeel::tuning::Hold<32>>());
    report("VelocityFilter", size_of::<shiftkeel::follow::velocity::VelocityFilter>());
    report("VelocitySettings", size_of::<shiftkeel::follow::velocity::VelocitySettings>());
    report("Nco", size_of::<shiftkeel::nco::Nco>());
    report("Mixer", size_of::<shiftkeel::nco::Mixer>());
}
