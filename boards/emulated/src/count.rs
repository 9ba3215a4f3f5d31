//! Counts instructions: net of an identical empty harness, mean and maximum over many inputs.
//!
//! The emulator advances time by one nanosecond an instruction. A Cortex-M core sees that time
//! through SysTick, coarsely (40 to 62.5 instructions a tick), so each input is repeated until a tick
//! more or less no longer matters. A RISC-V core counts retired instructions itself.

use crate::digest::Digest;

/// Inputs that each routine is counted over.
pub const INPUTS: u32 = 256;

/// A value that the optimiser cannot see through, without a trip through memory: it stays in the
/// registers in which a function takes and gives it.
pub trait Opaque: Copy {
    /// The same value, unknown to the optimiser.
    fn opaque(self) -> Self;
    /// Uses the value, so that it must have been computed.
    fn consume(self);
    /// Costs what `consume` costs when the value is where a function leaves it.
    fn consume_nothing();
    /// Takes the value into a digest.
    fn digest(self, digest: &mut Digest);
}

macro_rules! opaque_in_register {
    ($type:ty) => {
        impl Opaque for $type {
            #[inline(always)]
            fn opaque(self) -> Self {
                let mut held = self as usize;
                // SAFETY: no instruction is emitted.
                unsafe {
                    core::arch::asm!("/* {0} */", inout(reg) held, options(nomem, nostack, preserves_flags));
                }
                held as Self
            }
            #[inline(always)]
            fn consume(self) {
                // SAFETY: no instruction is emitted.
                unsafe {
                    core::arch::asm!("/* {0} */", in(reg) self as usize, options(nomem, nostack, preserves_flags));
                }
            }
            #[inline(always)]
            fn consume_nothing() {
                (0 as Self).consume();
            }
            fn digest(self, digest: &mut Digest) {
                digest.bytes(&self.to_le_bytes());
            }
        }
    };
}
opaque_in_register!(u32);
opaque_in_register!(i32);

/// A type held as another one's registers.
macro_rules! opaque_as {
    ($type:ty, $held:ty, $to:expr, $from:expr) => {
        impl Opaque for $type {
            #[inline(always)]
            fn opaque(self) -> Self {
                $from($to(self).opaque())
            }
            #[inline(always)]
            fn consume(self) {
                $to(self).consume()
            }
            #[inline(always)]
            fn consume_nothing() {
                <$held>::consume_nothing()
            }
            fn digest(self, digest: &mut Digest) {
                $to(self).digest(digest)
            }
        }
    };
}

const fn halves(value: u64) -> (u32, u32) {
    (value as u32, (value >> 32) as u32)
}
const fn whole((low, high): (u32, u32)) -> u64 {
    (high as u64) << 32 | low as u64
}
opaque_as!(u64, (u32, u32), halves, whole);
opaque_as!(i64, u64, |value| value as u64, (|bits| bits as i64));
opaque_as!(i16, i32, i32::from, (|value| value as i16));
#[cfg(not(target_abi = "eabihf"))]
opaque_as!(f32, u32, f32::to_bits, f32::from_bits);
opaque_as!(f64, u64, f64::to_bits, f64::from_bits);

/// On a core with a floating-point unit a function takes and gives `f32` in its registers, which the
/// assembler block cannot name; calls through an unknown pointer keep to them.
#[cfg(target_abi = "eabihf")]
impl Opaque for f32 {
    #[inline(always)]
    fn opaque(self) -> Self {
        extern "C" fn same(value: f32) -> f32 {
            value
        }
        unknown(same as extern "C" fn(f32) -> f32)(self)
    }
    #[inline(always)]
    fn consume(self) {
        extern "C" fn take(_: f32) {}
        unknown(take as extern "C" fn(f32))(self)
    }
    #[inline(always)]
    fn consume_nothing() {
        extern "C" fn take() {}
        unknown(take as extern "C" fn())()
    }
    fn digest(self, digest: &mut Digest) {
        self.to_bits().digest(digest);
    }
}

/// The same function pointer, unknown to the optimiser.
#[cfg(target_abi = "eabihf")]
#[inline(always)]
fn unknown<F: Copy>(function: F) -> F {
    let mut function = function;
    // SAFETY: no instruction is emitted.
    unsafe {
        core::arch::asm!(
            "/* {0} */",
            inout(reg) * (&raw mut function).cast::<usize>(),
            options(nostack, preserves_flags)
        );
    }
    function
}

impl<A: Opaque, B: Opaque> Opaque for (A, B) {
    #[inline(always)]
    fn opaque(self) -> Self {
        (self.0.opaque(), self.1.opaque())
    }
    #[inline(always)]
    fn consume(self) {
        self.0.consume();
        self.1.consume();
    }
    #[inline(always)]
    fn consume_nothing() {
        A::consume_nothing();
        B::consume_nothing();
    }
    fn digest(self, digest: &mut Digest) {
        self.0.digest(digest);
        self.1.digest(digest);
    }
}

impl Opaque for () {
    #[inline(always)]
    fn opaque(self) {}
    #[inline(always)]
    fn consume(self) {}
    #[inline(always)]
    fn consume_nothing() {}
    fn digest(self, _: &mut Digest) {}
}

/// The same state, at an address that the optimiser cannot see through: it must be in memory before
/// and after, as it is between two interrupts.
#[inline(always)]
pub fn in_memory<T>(state: &mut T) -> &mut T {
    let mut address: *mut T = state;
    // SAFETY: no instruction is emitted; the address comes back unchanged.
    unsafe {
        core::arch::asm!("/* {0} */", inout(reg) address, options(nostack, preserves_flags));
        &mut *address
    }
}

/// What a routine costs, in instructions net of the harness.
#[derive(Clone, Copy, Default)]
pub struct Cost {
    /// Mean over the inputs, in tenths of an instruction.
    pub mean_tenths: u64,
    /// The most that one input took.
    pub maximum: u64,
    /// FNV-1a of the outputs, in the order of the inputs.
    pub digest: u64,
}

/// Counts a routine over `INPUTS` inputs.
#[inline(never)]
pub fn cost<I: Opaque, O: Opaque>(input: impl Fn(u32) -> I, mut routine: impl FnMut(I) -> O) -> Cost {
    let mut digest = Digest::new();
    for index in 0..INPUTS {
        routine(input(index)).digest(&mut digest);
    }
    let mut cost = Cost { digest: digest.value(), ..Cost::default() };
    if !counter::COUNTS {
        return cost;
    }
    counter::start();
    const EMPTY_REPEATS: u32 = 4096;
    let empty = repeat_nothing::<I, O>(input(0), EMPTY_REPEATS) * 1000 / u64::from(EMPTY_REPEATS);
    let mut total_thousandths = 0;
    for index in 0..INPUTS {
        let input = input(index);
        let roughly = repeat(input, 8, &mut routine) / 8;
        let repeats = match roughly / 10 {
            0..500 => 512,
            500..4000 => 128,
            4000..100_000 => 64,
            _ => 1,
        };
        let thousandths = repeat(input, repeats, &mut routine) * 1000 / u64::from(repeats);
        // Tenths of an instruction times 1000; a routine may be cheaper than its empty stand-in.
        let net = thousandths.saturating_sub(empty);
        total_thousandths += net;
        cost.maximum = cost.maximum.max((net + 5000) / 10_000);
    }
    cost.mean_tenths = (total_thousandths / u64::from(INPUTS) + 500) / 1000;
    cost
}

/// Counts one call of a routine too long to repeat: in thousands of instructions.
#[inline(never)]
pub fn once<T>(routine: impl FnOnce() -> T, digest: impl FnOnce(&T) -> u64) -> (Cost, T) {
    counter::start();
    let from = counter::tenths();
    let output = routine();
    let mean_tenths = (counter::tenths() - from) / 1000;
    (Cost { mean_tenths, maximum: (mean_tenths + 5) / 10, digest: digest(&output) }, output)
}

/// Tenths of an instruction that so many calls took, harness included.
#[inline(never)]
fn repeat<I: Opaque, O: Opaque>(input: I, repeats: u32, routine: &mut impl FnMut(I) -> O) -> u64 {
    timed(repeats, || routine(input.opaque()).consume())
}

/// Tenths of an instruction that the same harness takes round nothing.
#[inline(never)]
fn repeat_nothing<I: Opaque, O: Opaque>(input: I, repeats: u32) -> u64 {
    timed(repeats, || {
        input.opaque();
        O::consume_nothing();
    })
}

#[inline(always)]
fn timed(repeats: u32, mut body: impl FnMut()) -> u64 {
    let from = counter::tenths();
    let mut left = repeats;
    while left != 0 {
        body();
        // Opaque, so that the loop is not unrolled: with and without a routine it is the same loop.
        left = (left - 1).opaque();
    }
    counter::tenths() - from
}

#[cfg(target_arch = "arm")]
pub mod counter {
    //! SysTick: 24 bits, counting down; its exception counts the wraps.

    use core::sync::atomic::{AtomicU32, Ordering};
    use cortex_m::peripheral::{SYST, syst::SystClkSource};

    /// Whether this target counts.
    pub const COUNTS: bool = true;
    const TOP: u32 = 0x00ff_ffff;
    static WRAPS: AtomicU32 = AtomicU32::new(0);

    const fn number(text: &str) -> u64 {
        let mut value = 0;
        let mut at = 0;
        while at < text.len() {
            value = value * 10 + (text.as_bytes()[at] - b'0') as u64;
            at += 1;
        }
        value
    }
    const TENTHS_PER_TICK: u64 = number(env!("TENTHS_OF_INSTRUCTION_PER_TICK"));

    #[cortex_m_rt::exception]
    fn SysTick() {
        // One context writes: no read-modify-write instruction is needed, and M0 has none.
        WRAPS.store(WRAPS.load(Ordering::Relaxed).wrapping_add(1), Ordering::Relaxed);
    }

    /// Starts the counter.
    pub fn start() {
        // SAFETY: nothing else uses SysTick.
        let mut systick = unsafe { cortex_m::Peripherals::steal() }.SYST;
        systick.set_clock_source(SystClkSource::Core);
        systick.set_reload(TOP);
        systick.clear_current();
        systick.enable_interrupt();
        systick.enable_counter();
        // It reads zero until its first tick loads it.
        while SYST::get_current() == 0 {}
    }

    /// Instructions since the start, in tenths.
    pub fn tenths() -> u64 {
        loop {
            let wraps = WRAPS.load(Ordering::Relaxed);
            let ticks = TOP - SYST::get_current();
            if wraps == WRAPS.load(Ordering::Relaxed) {
                return ((u64::from(wraps) << 24) + u64::from(ticks)) * TENTHS_PER_TICK;
            }
        }
    }
}

#[cfg(target_arch = "riscv32")]
pub mod counter {
    //! The core's own count of retired instructions.

    /// Whether this target counts.
    pub const COUNTS: bool = true;

    /// The counter always runs.
    pub fn start() {}

    /// Instructions since reset, in tenths.
    pub fn tenths() -> u64 {
        loop {
            let (high, low, again): (u32, u32, u32);
            // SAFETY: reads counters only.
            unsafe {
                core::arch::asm!("csrr {0}, minstreth", "csrr {1}, minstret", "csrr {2}, minstreth",
                    out(reg) high, out(reg) low, out(reg) again, options(nomem, nostack));
            }
            if high == again {
                return (u64::from(high) << 32 | u64::from(low)) * 10;
            }
        }
    }
}

#[cfg(not(target_os = "none"))]
pub mod counter {
    //! The host counts nothing.

    /// Whether this target counts.
    pub const COUNTS: bool = false;

    /// Nothing to start.
    pub fn start() {}

    /// Always zero.
    pub fn tenths() -> u64 {
        0
    }
}
