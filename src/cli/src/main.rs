//! Part of Teasel.
fn main() {}
