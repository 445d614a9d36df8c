//! Vectors, constants, unit names, findings and ordered sums that every room shares.
//!
//! In: nothing.  Out: plain types and numbers.
//! Not here: any shape (`geom`), any permittivity but the one of vacuum.
//! Symbols: as in the crate's table.

pub mod finding;
pub mod si;
#[cfg_attr(feature = "parallel", path = "threads_parallel.rs")]
#[cfg_attr(not(feature = "parallel"), path = "threads_serial.rs")]
pub mod threads;
pub mod units;

pub use finding::Finding;
pub use finding::Severity;

/// A point or a vector in space; lengths in metres once a shape is read.
pub type Vec3 = nalgebra::Vector3<f64>;

/// `1 round`, `2 rounds`.
pub fn counted(count: usize, thing: &str) -> String {
    format!("{count} {thing}{}", if count == 1 { "" } else { "s" })
}

/// An infinite plane at 0 V, or a mirror: a point of it and its unit normal.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Plane {
    /// A point of the plane [m].
    pub through: Vec3,
    /// Unit normal, pointing to the side on which the assembly stands.
    pub facing: Vec3,
}

impl Plane {
    /// Signed height of `x` above the plane [m].
    pub fn height(&self, x: &Vec3) -> f64 {
        (x - self.through).dot(&self.facing)
    }

    /// `x` mirrored at the plane [m].
    pub fn mirror(&self, x: &Vec3) -> Vec3 {
        x - self.facing * (2.0 * self.height(x))
    }
}
