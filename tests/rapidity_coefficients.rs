//! The committed coefficients are what their generator makes, byte for byte.

#[path = "reference/rapidity_coefficients.rs"]
mod generator;
#[path = "reference/multiprecision.rs"]
mod reference;

/// To accept a changed generator, run this test with `SHIFTKEEL_WRITE_TABLES=1` once.
#[test]
fn committed_coefficients_are_regenerated_to_the_byte() {
    let path = concat!(env!("CARGO_MANIFEST_DIR"), "/src/rapidity/coefficients.rs");
    let text = generator::text();
    if std::env::var_os("SHIFTKEEL_WRITE_TABLES").is_some() {
        std::fs::write(path, &text).unwrap();
    }
    assert!(text == std::fs::read_to_string(path).unwrap(), "{path} is not what its generator makes");
}
