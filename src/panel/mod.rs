//! Frozen arrays of panels: corners, conductor, parent facet.
//!
//! In: an `Assembly` [m].  Out: `Panels` [m].
//! Not here: where to refine (`adapt`), charges (`physics`).
//! Symbols: as in the crate's table.

mod place;
pub mod ring;

use crate::base::Images;
use crate::geom::Triangle;
use crate::mesh::Assembly;
use crate::mesh::Chart;
use crate::mesh::Net;
use crate::mesh::Piece;
use crate::mesh::Spot;
use std::sync::Arc;

pub use ring::Ring;

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
    /// Earth planes and mirrors.
    pub images: Images,
    /// How the panels repeat around an axis, if they do.
    pub ring: Option<Ring>,
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
pub fn build(assembly: Arc<Assembly>, images: impl Into<Images>) -> Panels {
    let origin =
        |piece: &Piece| Origin { net: piece.net, body: piece.body, facet: piece.facet, bary: piece.bary };
    let origins: Vec<Origin> = assembly.pieces.iter().map(origin).collect();
    from_origins(assembly, images.into(), &origins)
}

/// Panels in the order of their origins, each put at the mean height of the rebuilt surface.
pub fn from_origins(assembly: Arc<Assembly>, images: Images, origins: &[Origin]) -> Panels {
    let placed: Vec<(Triangle, f64)> =
        origins.iter().map(|origin| place::place(&assembly, &images, origin)).collect();
    Panels {
        triangles: placed.iter().map(|(tri, _)| *tri).collect(),
        offset: placed.iter().map(|(_, offset)| *offset).collect(),
        net: origins.iter().map(|origin| origin.net).collect(),
        body: origins.iter().map(|origin| origin.body).collect(),
        facet: origins.iter().map(|origin| origin.facet).collect(),
        bary: origins.iter().map(|origin| origin.bary).collect(),
        n_rows: assembly.rows.len(),
        images,
        ring: None,
        assembly,
    }
}

impl Panels {
    /// The rebuilt surface over panel `p` at barycentric coordinates `w` of the panel.
    pub fn spot(&self, p: usize, w: [f64; 3]) -> Spot {
        self.chart(p).spot(self.in_chart(p, w))
    }

    /// Principal curvatures of the rebuilt surface over panel `p` at barycentric coordinates `w` of the
    /// panel, positive where the metal bulges out [1/m].
    pub fn curvatures(&self, p: usize, w: [f64; 3]) -> [f64; 2] {
        self.chart(p).curvatures(self.in_chart(p, w))
    }

    fn chart(&self, p: usize) -> Chart {
        let surface = &self.assembly.bodies[self.body[p] as usize].surface;
        let facet = self.facet[p];
        let corners = surface.welded.facets[facet as usize].map(|k| surface.welded.points[k as usize]);
        Chart { facet, corners, normals: surface.normals[facet as usize] }
    }

    fn in_chart(&self, p: usize, w: [f64; 3]) -> [f64; 3] {
        [0, 1, 2].map(|k| (0..3).map(|c| w[c] * self.bary[p][c][k]).sum())
    }

    /// Where panel `p` comes from.
    pub fn origin(&self, p: usize) -> Origin {
        Origin { net: self.net[p], body: self.body[p], facet: self.facet[p], bary: self.bary[p] }
    }
}
