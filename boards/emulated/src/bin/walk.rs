#![cfg_attr(target_os = "none", no_std, no_main)]
use shiftkeel_emulated::{console, count::counter, program};
program!(walk);
fn walk() { counter::start(); for _ in 0..5 { console::decimal(counter::tenths(), 12); console::text("\n"); }
#[cfg(target_arch="arm")] for _ in 0..5 {console::decimal(cortex_m::peripheral::SYST::get_current().into(), 12);} }
