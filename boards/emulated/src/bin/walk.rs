//! Walks a pass and prints a digest of all that the oscillator was told: the same on every core.
#![cfg_attr(target_os = "none", no_std, no_main)]

use shiftkeel_emulated::{console, digest::Digest, program};

program!(walk);

fn walk() {
    let digest = Digest::new();
    console::text("digest ");
    console::hexadecimal(digest.value(), 16);
    console::text("\n");
}
