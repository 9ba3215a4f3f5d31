//! How deep a call goes: the stack below is painted, and what lost its paint was used.

/// Bytes of stack that a call uses, and what it returns. Zero on the host, where nothing is painted.
#[inline(never)]
pub fn depth<T>(routine: impl FnOnce() -> T) -> (usize, T) {
    let here = 0u32;
    let top = &raw const here as usize;
    paint(top);
    let output = routine();
    (used_below(top), output)
}

#[cfg(target_os = "none")]
const PAINT: u32 = 0xa5c3_965a;
/// Bytes just below the caller that painting itself needs.
#[cfg(target_os = "none")]
const OWN: usize = 256;

/// From the lowest free word, at most 64 KiB below the top.
#[cfg(target_os = "none")]
fn bottom(top: usize) -> usize {
    unsafe extern "C" {
        static __sheap: u32;
    }
    (&raw const __sheap as usize).max(top.saturating_sub(1 << 16)) & !3
}

#[cfg(target_os = "none")]
#[inline(never)]
fn paint(top: usize) {
    for address in (bottom(top)..top - OWN).step_by(4) {
        // SAFETY: between the end of the program's data and the stack's present end.
        unsafe { (address as *mut u32).write_volatile(PAINT) };
    }
}

#[cfg(target_os = "none")]
#[inline(never)]
fn used_below(top: usize) -> usize {
    let lowest = (bottom(top)..top)
        .step_by(4)
        // SAFETY: as above; reads only.
        .find(|address| unsafe { (*address as *const u32).read_volatile() } != PAINT);
    lowest.map_or(0, |lowest| top - lowest)
}

#[cfg(not(target_os = "none"))]
fn paint(_: usize) {}

#[cfg(not(target_os = "none"))]
fn used_below(_: usize) -> usize {
    0
}
