//! Turns this target's line of `cores.txt` into a memory map and the length of a tick.

use std::{env, fs, path::PathBuf};

fn main() {
    println!("cargo:rerun-if-changed=cores.txt");
    println!("cargo:rerun-if-changed=build.rs");
    let target = env::var("TARGET").expect("cargo sets TARGET");
    let out = PathBuf::from(env::var("OUT_DIR").expect("cargo sets OUT_DIR"));
    let cores = fs::read_to_string("cores.txt").expect("cores.txt stands beside build.rs");
    let Some(core) = cores
        .lines()
        .filter(|line| !line.trim_start().starts_with('#'))
        .map(|line| line.split_whitespace().collect::<Vec<_>>())
        .find(|fields| fields.get(1) == Some(&target.as_str()))
    else {
        if env::var("CARGO_CFG_TARGET_OS").as_deref() == Ok("none") {
            panic!("no line of cores.txt has the target {target}: add one");
        }
        // The host: no memory map, and nothing is counted.
        println!("cargo:rustc-env=TENTHS_OF_INSTRUCTION_PER_TICK=0");
        return;
    };
    let [_, _, _, per_tick, flash, flash_length, ram, ram_length] = core[..] else {
        panic!("cores.txt: the line of {target} needs 8 columns");
    };
    let tenths = (per_tick.parse::<f64>().expect("instructions a tick is a number") * 10.0).round();
    println!("cargo:rustc-env=TENTHS_OF_INSTRUCTION_PER_TICK={tenths}");
    let mut memory = format!(
        "MEMORY\n{{\n  FLASH : ORIGIN = {flash}, LENGTH = {flash_length}\n  \
         RAM : ORIGIN = {ram}, LENGTH = {ram_length}\n}}\n"
    );
    if target.starts_with("riscv") {
        for (region, place) in [
            ("TEXT", "FLASH"),
            ("RODATA", "FLASH"),
            ("DATA", "RAM"),
            ("BSS", "RAM"),
            ("HEAP", "RAM"),
            ("STACK", "RAM"),
        ] {
            memory += &format!("REGION_ALIAS(\"REGION_{region}\", {place});\n");
        }
    }
    fs::write(out.join("memory.x"), memory).expect("OUT_DIR can be written");
    println!("cargo:rustc-link-search={}", out.display());
}
