//! What happens when a program goes wrong: it says so and the emulator exits non-zero.

#[cfg(target_os = "none")]
#[panic_handler]
fn panic(info: &core::panic::PanicInfo) -> ! {
    semihosting::eprintln!("panic: {info}");
    crate::console::exit(1)
}

#[cfg(target_arch = "arm")]
#[cortex_m_rt::exception]
unsafe fn HardFault(frame: &cortex_m_rt::ExceptionFrame) -> ! {
    crate::console::fail_at("hard fault", frame.pc())
}

#[cfg(target_arch = "riscv32")]
#[unsafe(export_name = "ExceptionHandler")]
fn exception(frame: &riscv_rt::TrapFrame) -> ! {
    crate::console::fail_at("exception, return address", frame.ra as u32)
}
