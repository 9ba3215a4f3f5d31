//! The host tool of Shiftkeel.

use clap::Parser;
use shiftkeel_desk::commands::Arguments;
use std::process::ExitCode;

fn main() -> ExitCode {
    match Arguments::parse().run() {
        Ok(()) => ExitCode::SUCCESS,
        Err(error) => {
            eprintln!("error: {error:#}");
            ExitCode::FAILURE
        }
    }
}
