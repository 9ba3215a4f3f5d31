//! Sweeps over all words of 32 bits, on all cores.

#![allow(dead_code, reason = "each test program uses a part")]

/// Words where formats end and signs change.
pub const ENDS: [i32; 17] = [
    i32::MIN,
    i32::MIN + 1,
    i32::MIN + 131_072,
    -65_537,
    -65_536,
    -65_535,
    -2,
    -1,
    0,
    1,
    2,
    65_535,
    65_536,
    65_537,
    i32::MAX - 131_072,
    i32::MAX - 1,
    i32::MAX,
];

/// 1 with `SHIFTKEEL_EXHAUSTIVE=1`, else a prime.
fn stride() -> u64 {
    if std::env::var_os("SHIFTKEEL_EXHAUSTIVE").is_some_and(|value| value == "1") { 1 } else { 4_093 }
}

/// Worst value of `error` over the words of the sweep and the ends; the word is printed.
pub fn worst(error: impl Fn(i32) -> f64 + Sync) -> f64 {
    let stride = stride();
    let threads = std::thread::available_parallelism().map_or(1, |count| count.get()) as u64;
    let error = &error;
    let larger = |a: (f64, i32), b: (f64, i32)| if b.0 > a.0 || b.0.is_nan() { b } else { a };
    let strided = std::thread::scope(|scope| {
        let parts: Vec<_> = (0..threads)
            .map(|part| {
                scope.spawn(move || {
                    ((part * stride)..1 << 32)
                        .step_by((threads * stride) as usize)
                        .map(|bits| (error(bits as u32 as i32), bits as u32 as i32))
                        .fold((0.0, 0), larger)
                })
            })
            .collect();
        parts.into_iter().map(|part| part.join().expect("a part failed")).fold((0.0, 0), larger)
    });
    let (worst, at) = ENDS.iter().map(|&x| (error(x), x)).fold(strided, larger);
    println!("worst {worst:.6} at {at:#010x}");
    worst
}

/// The measured worst case keeps the bound, and the bound is no looser than 1.25 times it.
pub fn assert_tight(name: &str, worst: f64, bound: f64) {
    println!("{name}: worst {worst:.6}, bound {bound}");
    assert!(worst <= bound, "{name}: worst {worst} exceeds the bound {bound}");
    assert!(bound <= 1.25 * worst, "{name}: the bound {bound} is looser than 1.25 times {worst}");
}
