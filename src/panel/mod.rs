//! Frozen arrays of panels: corners, conductor, parent facet.
//!
//! In: an `Assembly` [m].  Out: `Panels` [m].
//! Not here: where to refine (`adapt`), charges (`physics`).
//! Symbols: as in the crate's table.

mod place;

use crate::base::Plane;
use crate::geom::Triangle;
use crate::mesh::Assembly;
use crate::mesh::Net;
use crate::mesh::Piece;
use std::sync::Arc;

/// Panels of one round; panel `p` stands at index `p` of every array.
#[derive(Clone, Debug)]
pub struct Panels {
    /// Flat panels at the mean height of the rebuilt surface, normals out of the metal [m].
    pub triangles: Vec<Triangle>,
    /// Mean height of the rebuilt surface over the drawn facet under each panel, outward positive [m].
    pub offset: Vec<f64>,
    /// Conductor of each panel.
    pub net: Vec<Net>,
    /// Index of the body of each panel.
    pub body: Vec<u32>,
    /// Index of the parent facet in the surface of the body.
    pub facet: Vec<u32>,
    /// Barycentric coordinates of the corners in the parent facet [1].
    pub bary: Vec<[[f64; 3]; 3]>,
    /// Rows of the matrix.
    pub n_rows: usize,
    /// The plane at 0 V, if any.
    pub plane: Option<Plane>,
    /// What was drawn.
    pub assembly: Arc<Assembly>,
}

impl Panels {
    /// Count of panels.
    pub fn len(&self) -> usize {
        self.triangles.len()
    }

    /// Whether there are none.
    pub fn is_empty(&self) -> bool {
        self.triangles.is_empty()
    }

    /// Potential of panel `p` when row `j` is at 1 V and the rest at 0 V [V].
    pub fn unit_potential(&self, p: usize, j: usize) -> f64 {
        if self.net[p] == Net::Row(j as u32) { 1.0 } else { 0.0 }
    }

    /// Row of panel `p`; none for the 0 V reference.
    pub fn row(&self, p: usize) -> Option<usize> {
        match self.net[p] {
            Net::Row(row) => Some(row as usize),
            Net::Earth => None,
        }
    }
}

/// Where a panel comes from: conductor, body, facet, and its corners in that facet.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Origin {
    /// Conductor.
    pub net: Net,
    /// Index of the body.
    pub body: u32,
    /// Index of the facet in the surface of the body.
    pub facet: u32,
    /// Barycentric coordinates of the corners in the facet [1].
    pub bary: [[f64; 3]; 3],
}

/// One panel for each exposed piece.
pub fn build(assembly: Arc<Assembly>, plane: Option<Plane>) -> Panels {
    let origin =
        |piece: &Piece| Origin { net: piece.net, body: piece.body, facet: piece.facet, bary: piece.bary };
    let origins: Vec<Origin> = assembly.pieces.iter().map(origin).collect();
    from_origins(assembly, plane, &origins)
}

/// Panels in the order of their origins, each put at the mean height of the rebuilt surface.
pub fn from_origins(assembly: Arc<Assembly>, plane: Option<Plane>, origins: &[Origin]) -> Panels {
    let placed: Vec<(Triangle, f64)> =
        origins.iter().map(|origin| place::place(&assembly, plane.as_ref(), origin)).collect();
    Panels {
        triangles: placed.iter().map(|(tri, _)| *tri).collect(),
        offset: placed.iter().map(|(_, offset)| *offset).collect(),
        net: origins.iter().map(|origin| origin.net).collect(),
        body: origins.iter().map(|origin| origin.body).collect(),
        facet: origins.iter().map(|origin| origin.facet).collect(),
        bary: origins.iter().map(|origin| origin.bary).collect(),
        n_rows: assembly.rows.len(),
        plane,
        assembly,
    }
}

impl Panels {
    /// Where panel `p` comes from.
    pub fn origin(&self, p: usize) -> Origin {
        Origin { net: self.net[p], body: self.body[p], facet: self.facet[p], bary: self.bary[p] }
    }
}
