//! Host tool.

fn main() {}
