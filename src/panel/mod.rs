//! Frozen arrays of panels: corners, conductor, parent facet.
//!
//! In: an `Assembly` [m].  Out: `Panels` [m].
//! Not here: where to refine (`adapt`), charges (`physics`).
//! Symbols: as in the crate's table.

mod place;
pub mod ring;

use crate::base::Images;
use crate::base::threads;
use crate::geom::Triangle;
use crate::mesh::Assembly;
use crate::mesh::Chart;
use crate::mesh::Net;
use crate::mesh::Spot;
use crate::mesh::coarsen;
use place::Placed;
use std::collections::HashMap;
use std::sync::Arc;

pub use ring::Ring;

/// Panels of one round; panel `p` stands at index `p` of every array.
#[derive(Clone, Debug)]
pub struct Panels {
    /// Flat panels at the mean height of the rebuilt surface, normals out of the metal [m].
    pub triangles: Vec<Triangle>,
    /// Mean height of the rebuilt surface over the flat triangle through its places at the corners of
    /// each panel, outward positive: what the panel itself does not follow [m].
    pub offset: Vec<f64>,
    /// Mean height of the rebuilt surface over each panel itself: not zero where a form ends [m].
    pub left: Vec<f64>,
    /// Mean height of the rebuilt surface over the drawn facets under each panel, outward positive [m].
    pub drawn: Vec<f64>,
    /// Conductor of each panel.
    pub net: Vec<Net>,
    /// Index of the body of each panel.
    pub body: Vec<u32>,
    /// Index of the chart of each panel.
    pub chart: Vec<u32>,
    /// Barycentric coordinates of the corners in the chart [1].
    pub bary: Vec<[[f64; 3]; 3]>,
    /// Rows of the matrix.
    pub n_rows: usize,
    /// Earth planes and mirrors.
    pub images: Images,
    /// How the panels repeat around an axis, if they do.
    pub ring: Option<Ring>,
    /// The triangles over which the surface is told.
    pub charts: Arc<Vec<Chart>>,
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

/// Where a panel comes from: conductor, body, chart, and its corners in that chart.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Origin {
    /// Conductor.
    pub net: Net,
    /// Index of the body.
    pub body: u32,
    /// Index of the chart.
    pub chart: u32,
    /// Barycentric coordinates of the corners in the chart [1].
    pub bary: [[f64; 3]; 3],
}

/// One panel for each chart of what is exposed.
///
/// Whole facets on recognised forms are merged; pieces of facets keep the chart of their facet.
pub fn build(assembly: Arc<Assembly>, images: impl Into<Images>) -> Panels {
    let mut whole: Vec<Vec<bool>> =
        assembly.bodies.iter().map(|b| vec![false; b.surface.welded.facets.len()]).collect();
    let mut nets = vec![None; assembly.bodies.len()];
    for piece in assembly.pieces.iter().filter(|piece| piece.bary == WHOLE) {
        whole[piece.body as usize][piece.facet as usize] = true;
        nets[piece.body as usize] = Some(piece.net);
    }
    let mut charts = Vec::new();
    let mut origins = Vec::new();
    for (body, part) in assembly.bodies.iter().enumerate() {
        let Some(net) = nets[body] else { continue };
        for chart in coarsen::charts(&part.surface, &whole[body]) {
            origins.push(Origin { net, body: body as u32, chart: charts.len() as u32, bary: WHOLE });
            charts.push(chart);
        }
    }
    let mut of_facet: HashMap<(u32, u32), u32> = HashMap::new();
    for piece in assembly.pieces.iter().filter(|piece| piece.bary != WHOLE) {
        let chart = *of_facet.entry((piece.body, piece.facet)).or_insert_with(|| {
            charts.push(Chart::of_facet(&assembly.bodies[piece.body as usize].surface, piece.facet));
            charts.len() as u32 - 1
        });
        origins.push(Origin { net: piece.net, body: piece.body, chart, bary: piece.bary });
    }
    from_origins(assembly, Arc::new(charts), images.into(), &origins)
}

/// Barycentric corners of a whole chart [1].
const WHOLE: [[f64; 3]; 3] = [[1.0, 0.0, 0.0], [0.0, 1.0, 0.0], [0.0, 0.0, 1.0]];

/// Panels in the order of their origins, each put at the mean height of the rebuilt surface.
pub fn from_origins(
    assembly: Arc<Assembly>,
    charts: Arc<Vec<Chart>>,
    images: Images,
    origins: &[Origin],
) -> Panels {
    let placed: Vec<Placed> =
        threads::map(origins.len(), |k| place::place(&assembly, &charts, &images, &origins[k]));
    Panels {
        triangles: placed.iter().map(|placed| placed.triangle).collect(),
        offset: placed.iter().map(|placed| placed.offset).collect(),
        left: placed.iter().map(|placed| placed.left).collect(),
        drawn: placed.iter().map(|placed| placed.drawn).collect(),
        net: origins.iter().map(|origin| origin.net).collect(),
        body: origins.iter().map(|origin| origin.body).collect(),
        chart: origins.iter().map(|origin| origin.chart).collect(),
        bary: origins.iter().map(|origin| origin.bary).collect(),
        n_rows: assembly.rows.len(),
        images,
        ring: None,
        charts,
        assembly,
    }
}

impl Panels {
    /// The rebuilt surface over panel `p` at barycentric coordinates `w` of the panel.
    pub fn spot(&self, p: usize, w: [f64; 3]) -> Spot {
        let surface = &self.assembly.bodies[self.body[p] as usize].surface;
        self.charts[self.chart[p] as usize].spot(surface, self.in_chart(p, w))
    }

    /// Principal curvatures of the rebuilt surface over panel `p` at barycentric coordinates `w` of the
    /// panel, positive where the metal bulges out [1/m].
    pub fn curvatures(&self, p: usize, w: [f64; 3]) -> [f64; 2] {
        let surface = &self.assembly.bodies[self.body[p] as usize].surface;
        self.charts[self.chart[p] as usize].curvatures(surface, self.in_chart(p, w))
    }

    /// Whether the surface over panel `p` is a recognised form, and not told by normals alone.
    pub fn is_exact(&self, p: usize) -> bool {
        let surface = &self.assembly.bodies[self.body[p] as usize].surface;
        self.charts[self.chart[p] as usize].is_exact(surface)
    }

    /// A drawn facet under panel `p`, as index in the surface of its body.
    pub fn facet(&self, p: usize) -> u32 {
        self.charts[self.chart[p] as usize].facet
    }

    fn in_chart(&self, p: usize, w: [f64; 3]) -> [f64; 3] {
        place::in_chart(&self.bary[p], w)
    }

    /// Where panel `p` comes from.
    pub fn origin(&self, p: usize) -> Origin {
        Origin { net: self.net[p], body: self.body[p], chart: self.chart[p], bary: self.bary[p] }
    }
}
