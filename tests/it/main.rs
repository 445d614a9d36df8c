//! All integration tests, one module a subject.
#![allow(clippy::unwrap_used, reason = "a test fails by panicking")]

mod bodies;
mod assembly;
mod bodies;
mod geometry;
mod map;
mod reference;
mod repair;
mod shapes;
mod stl;
