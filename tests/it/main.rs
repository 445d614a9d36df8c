//! All integration tests, one module a subject.
#![allow(clippy::unwrap_used, reason = "a test fails by panicking")]

mod bodies;
mod assembly;
mod bodies;
mod geometry;
mod broken_toml;
mod case;
mod map;
mod reference;
mod repair;
mod shapes;
mod stl;
