#![cfg_attr(target_os = "none", no_std, no_main)]
#[cfg(not(target_os = "none"))]
fn main() {}
