//! The committed tables are what their generator makes, byte for byte.

#[path = "reference/nco_tables.rs"]
mod generator;

/// To accept a changed generator, run this test with `SHIFTKEEL_WRITE_TABLES=1` once.
#[test]
fn committed_tables_are_regenerated_to_the_byte() {
    let path = concat!(env!("CARGO_MANIFEST_DIR"), "/src/nco/tables.rs");
    let text = generator::text();
    if std::env::var_os("SHIFTKEEL_WRITE_TABLES").is_some() {
        std::fs::write(path, &text).unwrap();
    }
    assert!(text == std::fs::read_to_string(path).unwrap(), "{path} is not what its generator makes");
}
