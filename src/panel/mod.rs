//! Frozen arrays of panels: corners, conductor, parent facet.
//!
//! In: an `Assembly` [m].  Out: `Panels` [m].
//! Not here: where to refine (`adapt`), charges (`physics`).
//! Symbols: as in the crate's table.

use crate::base::Plane;
use crate::geom::Triangle;
use crate::mesh::Assembly;
use crate::mesh::Net;
use std::sync::Arc;

/// Panels of one round; panel `p` stands at index `p` of every array.
#[derive(Clone, Debug)]
pub struct Panels {
    /// Flat panels, normals out of the metal [m].
    pub triangles: Vec<Triangle>,
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

/// One panel for each exposed piece.
pub fn build(assembly: Arc<Assembly>, plane: Option<Plane>) -> Panels {
    let pieces = &assembly.pieces;
    Panels {
        triangles: pieces.iter().map(|piece| Triangle::new(piece.corners)).collect(),
        net: pieces.iter().map(|piece| piece.net).collect(),
        body: pieces.iter().map(|piece| piece.body).collect(),
        facet: pieces.iter().map(|piece| piece.facet).collect(),
        bary: pieces.iter().map(|piece| piece.bary).collect(),
        n_rows: assembly.rows.len(),
        plane,
        assembly,
    }
}
