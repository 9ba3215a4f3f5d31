//! Makes `src/rapidity/coefficients.rs`: tables and polynomial coefficients of the kernels from 200-bit
//! arithmetic. `tests/rapidity_coefficients.rs` compares the file with this text, and writes it anew when
//! `SHIFTKEEL_WRITE_TABLES` is set.

use crate::reference::{Big, big};
use core::fmt::Write;

/// Rows of the logarithm and exponential tables.
const ROWS: i64 = 128;

/// The nearest integer to `value` 2^`fraction_bits`.
fn nearest(value: &Big, fraction_bits: isize) -> i128 {
    (value.clone() << fraction_bits).to_int().value().try_into().expect("at most 127 bits")
}

/// `value` 2^`fraction_bits`, cut off.
fn floor(value: &Big, fraction_bits: isize) -> i128 {
    (value.clone() << fraction_bits).floor().to_int().value().try_into().expect("at most 127 bits")
}

fn table(text: &mut String, comment: &str, name: &str, kind: &str, per_line: usize, values: &[i128]) {
    let digits = match kind {
        "u8" => 2,
        "u16" => 4,
        "u32" => 8,
        _ => 16,
    };
    let length = values.len();
    write!(text, "\n/// {comment}\n#[rustfmt::skip]\npub(crate) const {name}: [{kind}; {length}] = [\n")
        .unwrap();
    for line in values.chunks(per_line) {
        let line: Vec<_> = line.iter().map(|value| format!("0x{value:0digits$x},")).collect();
        writeln!(text, "    {}", line.join(" ")).unwrap();
    }
    text.push_str("];\n");
}

/// Reciprocals with 16 fraction bits: for each interval [1 + i/128, 1 + (i+1)/128) the r with the smallest
/// |m r - 1| at the worse end; the largest of all, of the first row, is 2^-8 less a part in 250.
fn reciprocals() -> Vec<i128> {
    let row = |index: i64| nearest(&(big(1, 0) / big(2 * (ROWS + index) + 1, 8)), 16);
    (0..ROWS).map(row).collect()
}

/// The text of the file.
pub fn text() -> String {
    let mut text = String::from(
        "//! Tables of the kernels, made by `tests/reference/rapidity_coefficients.rs`; do not edit.\n",
    );
    let reciprocals = reciprocals();
    let logarithm = |r: &i128| -big(*r, 16).ln();
    let wide: Vec<_> = reciprocals.iter().map(|r| nearest(&logarithm(r), 63)).collect();
    let comment = "r, about 1 / (1 + (i + 1/2)/128), with 16 fraction bits.";
    table(&mut text, comment, "RECIPROCALS", "u16", 12, &reciprocals);
    table(&mut text, "-ln(r) with 63 fraction bits.", "LOGARITHMS", "u64", 4, &wide);

    let power = |index: i64| (big(index, 7) * big(2, 0).ln()).exp();
    let high: Vec<_> = (0..ROWS).map(|index| floor(&power(index), 63)).collect();
    let rest: Vec<_> = (0..ROWS).map(|index| floor(&power(index), 71) & 0xff).collect();
    table(&mut text, "2^(i/128) with 63 fraction bits, cut off.", "EXPONENTIALS", "u64", 4, &high);
    table(&mut text, "The next 8 bits of 2^(i/128).", "EXPONENTIAL_RESTS", "u8", 16, &rest);
    text
}
