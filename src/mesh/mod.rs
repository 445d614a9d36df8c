//! From the bytes of STL files to exposed, oriented conductor surfaces.
//!
//! In: bytes, lengths in file units until `place` turns them into metres.  Out: `Assembly` [m].
//! Not here: files (`case` reads them), panels (`panel`), charge (`physics`).
//! Symbols: as in the crate's table.

pub mod accept;
pub mod assembly;
mod contact;
pub mod edges;
mod expose;
mod expose_split;
mod flat;
pub mod holes;
mod joints;
mod listing;
pub mod nesting;
mod orient;
mod parts;
pub mod place;
mod plane_cut;
pub mod repair;
pub mod selfcross;
pub mod shells;
pub mod size;
pub mod smooth;
pub mod stl;
mod stl_ascii;
pub mod stl_error;
pub mod weld;

pub use place::place;

use crate::base::Finding;
use crate::base::Vec3;

/// One `solid` of an STL file, facets as read, in file units.
#[derive(Clone, Debug, PartialEq)]
pub struct Solid {
    /// Name in the file; empty for binary files.
    pub name: String,
    /// Corners of each facet, in file units.
    pub facets: Vec<[Vec3; 3]>,
}

/// All that an STL file holds.
#[derive(Clone, Debug, PartialEq)]
pub struct Soup {
    /// The solids in file order; never empty, none without facets.
    pub solids: Vec<Solid>,
    /// What the reader noticed (missing `endsolid`, bytes behind the end, …).
    pub findings: Vec<Finding>,
}

/// Facets that share corners: the result of welding.
#[derive(Clone, Debug, PartialEq, Default)]
pub struct Welded {
    /// Corners [m].
    pub points: Vec<Vec3>,
    /// Indices of the corners of each facet, right-handed as seen from outside.
    pub facets: Vec<[u32; 3]>,
}

/// An accepted body: repaired, oriented (normals point out of the metal), with recovered normals.
#[derive(Clone, Debug, PartialEq)]
pub struct Surface {
    /// The facets.
    pub welded: Welded,
    /// Open sheet (or thin wall with both sides exposed) rather than the skin of a solid.
    pub sheet: bool,
    /// Recovered unit normal of the drawn surface at each corner of each facet; equals the
    /// facet's own normal where the corner is a crease or the surface is taken as drawn.
    pub normals: Vec<[Vec3; 3]>,
    /// Edges where smooth patches end, and rims of sheets.
    pub creases: Vec<Crease>,
    /// The straight sides of a rim are the shape, not chords of a round one.
    pub rims_as_drawn: bool,
}

/// An edge at which the surface is not smooth.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Crease {
    /// Indices of its two ends in `Welded::points`.
    pub ends: [u32; 2],
    /// The facets beside it; the same one twice at the rim of a sheet.
    pub facets: [u32; 2],
    /// Angle through the metal between the two faces [rad]: π/2 at the edge of a cube, 0 at the
    /// rim of a sheet, above π at an inner edge.
    pub angle: f64,
}

/// One electrode as drawn, before it is known what of it is exposed.
#[derive(Clone, Debug, PartialEq)]
pub struct Body {
    /// Name in the case file.
    pub name: String,
    /// Its accepted surface.
    pub surface: Surface,
}

/// What a facet's potential is: a row of the matrix, or the 0 V reference.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Net {
    /// Row of the capacitance matrix.
    Row(u32),
    /// Part of the 0 V reference (an electrode bonded with earth that meets the earth plane).
    Earth,
}

/// An exposed triangle, a whole facet or a part of one.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Piece {
    /// Index of the body.
    pub body: u32,
    /// Index of the facet in the body's surface.
    pub facet: u32,
    /// Corners [m].
    pub corners: [Vec3; 3],
    /// Barycentric coordinates of the three corners in the facet [1].
    pub bary: [[f64; 3]; 3],
    /// The conductor it belongs to.
    pub net: Net,
}

/// One row of the matrix: an electrode, or bonded electrodes that touch.
#[derive(Clone, Debug, PartialEq)]
pub struct Row {
    /// Electrode name, or the members' names joined by `+`.
    pub name: String,
    /// Indices of its bodies.
    pub bodies: Vec<u32>,
}

/// All conductors with only what is exposed.
#[derive(Clone, Debug, PartialEq)]
pub struct Assembly {
    /// The bodies in case order.
    pub bodies: Vec<Body>,
    /// Rows of the matrix, in order of their first body.
    pub rows: Vec<Row>,
    /// Exposed triangles.
    pub pieces: Vec<Piece>,
    /// What was noticed and what was left out.
    pub findings: Vec<Finding>,
}
