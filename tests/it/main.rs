//! All integration tests, one module a subject.
#![allow(clippy::unwrap_used, reason = "a test fails by panicking")]

mod bodies;
mod broken_stl;
mod map;
mod reference;
mod repair;
mod shapes;
mod stl;
