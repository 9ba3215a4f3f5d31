//! Harness of the emulated boards: start-up, console, instruction counter, digest.
//!
//! The same programs run on the host, where nothing is counted, so that digests can be compared.
#![cfg_attr(target_os = "none", no_std)]

#[cfg(feature = "harness")]
pub mod console;
#[cfg(feature = "harness")]
pub mod count;
#[cfg(feature = "harness")]
pub mod digest;
#[cfg(feature = "harness")]
pub mod pass;
pub mod plans;
#[cfg(feature = "costs")]
pub mod routines;
#[cfg(feature = "harness")]
pub mod stack;
#[cfg(feature = "harness")]
mod start;

/// Makes `$main`, a `fn()`, the program: called once, then the emulator exits with success.
#[macro_export]
macro_rules! program {
    ($main:path) => {
        #[cfg(target_arch = "arm")]
        #[cortex_m_rt::entry]
        fn start() -> ! {
            $main();
            $crate::console::exit(0)
        }
        #[cfg(target_arch = "riscv32")]
        #[riscv_rt::entry]
        fn start() -> ! {
            $main();
            $crate::console::exit(0)
        }
        #[cfg(not(target_os = "none"))]
        fn main() {
            $main();
        }
    };
}
