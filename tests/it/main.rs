//! All integration tests, one module a subject.
#![allow(clippy::unwrap_used, reason = "a test fails by panicking")]

mod broken_toml;
mod case;
mod cli;
mod map;
mod reference;
mod shapes;
