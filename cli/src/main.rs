//! The program `plumbtone`.
fn main() {}
