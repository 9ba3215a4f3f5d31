//! The least firmware that steers, for measuring flash: it checks an uploaded table, makes its channel, and at
//! every tick asks the table for the motion and gives the oscillator its step and ramp. Without the feature
//! `library` the same firmware hands the oscillator words of the upload instead.
#![cfg_attr(target_os = "none", no_std, no_main)]

#[cfg(not(target_os = "none"))]
fn main() {
    println!("this program is built for its size on a microcontroller: see ./run");
}

#[cfg(target_os = "none")]
mod firmware {
    use core::ptr::{addr_of, addr_of_mut};

    const TABLE_WORDS: usize = 256;

    /// Stands for what the outside world writes: where a table was uploaded, a crystal's offset, the time.
    #[repr(C)]
    struct Inputs {
        table: Option<&'static [u32; TABLE_WORDS]>,
        crystal: i64,
        time: i64,
    }

    /// Stands for the registers of an oscillator.
    #[repr(C)]
    struct Outputs {
        step: u64,
        ramp: i64,
        stopped: u32,
    }

    #[unsafe(no_mangle)]
    static mut INPUTS: Inputs = Inputs { table: None, crystal: 0, time: 0 };
    #[unsafe(no_mangle)]
    static mut OUTPUTS: Outputs = Outputs { step: 0, ramp: 0, stopped: 0 };

    fn crystal() -> i64 {
        // SAFETY: a single read of what stands for a register.
        unsafe { addr_of!(INPUTS.crystal).read_volatile() }
    }

    fn time() -> i64 {
        // SAFETY: a single read of what stands for a register.
        unsafe { addr_of!(INPUTS.time).read_volatile() }
    }

    fn table() -> Option<&'static [u32; TABLE_WORDS]> {
        // SAFETY: a single read of what stands for a register; an upload stays where it is.
        unsafe { addr_of!(INPUTS.table).read_volatile() }
    }

    fn tune(step: u64, ramp: i64) {
        // SAFETY: single writes of what stands for registers.
        unsafe {
            addr_of_mut!(OUTPUTS.step).write_volatile(step);
            addr_of_mut!(OUTPUTS.ramp).write_volatile(ramp);
        }
    }

    fn stop(reason: u32) {
        // SAFETY: a single write of what stands for a register.
        unsafe { addr_of_mut!(OUTPUTS.stopped).write_volatile(reason) };
    }

    #[cfg(feature = "library")]
    fn steer() {
        use shiftkeel::pass::PassTable;
        use shiftkeel::rapidity::Rapidity;
        use shiftkeel::time::GpsTime;
        use shiftkeel::tuning::Sweep;
        use shiftkeel_emulated::plans;

        let Some(words) = table() else { return stop(1) };
        let Ok(table) = PassTable::new(words) else { return stop(1) };
        let Ok(channel) = plans::receiver(Rapidity::from_bits(crystal())) else { return stop(2) };
        let Ok(first) = table.at(GpsTime::from_bits(time())) else { return stop(3) };
        let Ok(mut sweep) = Sweep::begin(&channel, &first) else { return stop(4) };
        loop {
            let Ok(motion) = table.at(GpsTime::from_bits(time())) else { return stop(3) };
            let Ok(swept) = sweep.step(&channel, &motion) else { return stop(4) };
            tune(swept.first.to_bits(), swept.ramp.to_bits());
        }
    }

    #[cfg(not(feature = "library"))]
    fn steer() {
        let Some(words) = table() else { return stop(1) };
        let offset = crystal();
        loop {
            let now = time();
            let Some(word) = words.get(now as usize) else { return stop(3) };
            tune((*word).into(), offset);
        }
    }

    #[cfg(target_arch = "arm")]
    #[cortex_m_rt::entry]
    fn start() -> ! {
        loop {
            steer();
        }
    }

    #[cfg(target_arch = "riscv32")]
    #[riscv_rt::entry]
    fn start() -> ! {
        loop {
            steer();
        }
    }

    #[panic_handler]
    fn panic(_: &core::panic::PanicInfo) -> ! {
        loop {}
    }
}
