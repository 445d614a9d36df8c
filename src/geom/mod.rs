//! Shapes: triangles, boxes, distances, intersections, spatial tree, winding number.
//!
//! In: corners [m].  Out: lengths, areas, yes or no.
//! Not here: what a triangle stands for; charge and permittivity.
//! Symbols: as in the crate's table.

pub mod bounds;
pub mod distance;
pub mod intersect;
pub mod tree;
pub mod triangle;
pub mod winding;

pub use bounds::Bounds;
pub use triangle::Triangle;
