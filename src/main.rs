//! The `amberskin` program: everything is in the library.

fn main() {}
