//! The least firmware that steers, for measuring flash: at every tick it reads the time, asks the table,
//! and writes the oscillator's word. Without the feature `library` it writes a word of the table instead.
#![cfg_attr(target_os = "none", no_std, no_main)]

#[cfg(not(target_os = "none"))]
fn main() {
    println!("this program is built for its size on a microcontroller: see ./run");
}

#[cfg(target_os = "none")]
mod firmware {
    use core::ptr::{addr_of, addr_of_mut};

    /// Stands for a table that was uploaded.
    #[unsafe(no_mangle)]
    static mut TABLE: [u32; 64] = [0; 64];
    /// Stands for a timer's register.
    #[unsafe(no_mangle)]
    static mut TIMER: u32 = 0;
    /// Stands for an oscillator's register.
    #[unsafe(no_mangle)]
    static mut WORD: u64 = 0;

    fn steer() -> ! {
        loop {
            // SAFETY: single reads and writes of what stands for registers.
            let timer = unsafe { addr_of!(TIMER).read_volatile() };
            let word = word(timer);
            unsafe { addr_of_mut!(WORD).write_volatile(word) };
        }
    }

    fn word(timer: u32) -> u64 {
        let entry = timer as usize % 64;
        // SAFETY: the entry is inside the table.
        unsafe { addr_of!(TABLE).cast::<u32>().add(entry).read_volatile().into() }
    }

    #[cfg(target_arch = "arm")]
    #[cortex_m_rt::entry]
    fn start() -> ! {
        steer()
    }

    #[cfg(target_arch = "riscv32")]
    #[riscv_rt::entry]
    fn start() -> ! {
        steer()
    }

    #[panic_handler]
    fn panic(_: &core::panic::PanicInfo) -> ! {
        loop {}
    }
}
