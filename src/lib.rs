//! Capacitance matrices, surface field and circuit hand-over of electrode assemblies from STL
//! surfaces, each number with a figure for how far to trust it.
//!
//! Rooms, lowest first; each imports only from rooms above it in this list, which
//! `tests/it/map.rs` holds against the source: [`base`], [`geom`], [`kernel`], [`mesh`],
//! [`panel`], [`operator`], [`solve`], [`physics`], [`adapt`], [`circuit`], [`case`],
//! [`record`], [`study`], [`report`], [`cli`].
//!
//! Symbols used throughout: `x` observation point, `y` source point, `r = |x − y|`, `n` unit
//! normal pointing out of the conductor, `q` charge, `v` potential, `c` Maxwell matrix, `σ`
//! surface charge density.
//!
//! Feature `parallel` (default): all cores for assembly and factorisation; never changes a digit.

pub mod adapt;
pub mod base;
pub mod case;
pub mod circuit;
pub mod cli;
pub mod geom;
pub mod kernel;
pub mod mesh;
pub mod operator;
pub mod panel;
pub mod physics;
pub mod record;
pub mod report;
pub mod solve;
pub mod study;
