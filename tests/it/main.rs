//! All integration tests, one module a subject.
#![allow(clippy::unwrap_used, reason = "a test fails by panicking")]

mod accuracy;
mod assembly;
mod bodies;
mod broken_stl;
mod broken_toml;
mod case;
mod circuit;
mod cli;
mod fixtures;
mod geometry;
mod golden;
mod kernels;
mod laws;
mod map;
mod outputs;
mod rates;
mod reference;
mod repair;
mod shapes;
mod solving;
mod stl;
mod stl_bodies;
