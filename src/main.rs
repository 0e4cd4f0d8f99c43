//! The `etchwise` program.
fn main() {}
