//! Prints what each routine costs on this core, in instructions (not cycles).
#![cfg_attr(target_os = "none", no_std, no_main)]

use shiftkeel_emulated::{console, count::Cost, program, routines};

program!(print);

fn print() {
    console::text("instructions (not cycles) a call, net of an empty harness\n");
    console::text("routine                                      mean       max  digest of outputs\n");
    routines::all(report, bytes);
    routines::states(bytes);
}

fn bytes(name: &str, bytes: usize) {
    console::text("RAM ");
    console::left(name, 36);
    console::decimal(bytes as u64, 10);
    console::text("\n");
}

fn report(name: &str, cost: &Cost) {
    console::left(name, 40);
    console::tenths(cost.mean_tenths, 10);
    console::text(" ");
    console::decimal(cost.maximum, 9);
    console::text("  ");
    console::hexadecimal(cost.digest, 16);
    console::text("\n");
}
