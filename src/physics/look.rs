//! Potential and field at points in space.

use crate::base::Plane;
use crate::base::Vec3;
use crate::base::threads;
use crate::geom::Triangle;
use crate::geom::distance;
use crate::geom::winding;
use crate::geom::winding::Winding;
use crate::operator::Sources;
use crate::panel::Panels;
use crate::physics::field;
use crate::physics::solved::Solved;
use std::f64::consts::PI;

/// Where a point lies.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Medium {
    /// In the surroundings.
    Surroundings,
    /// In the metal of a body.
    Metal(usize),
    /// Behind the earth plane.
    BehindEarth,
}

/// Potential and field at one point.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Seen {
    /// Potential [V].
    pub potential: f64,
    /// Field [V/m].
    pub field: Vec3,
}

/// Tells for any point where it lies.
pub struct Map {
    solids: Vec<(usize, Winding)>,
    plane: Option<Plane>,
}

impl Map {
    /// From the drawn surfaces.
    pub fn new(panels: &Panels) -> Self {
        let solid = |(k, body): (usize, &crate::mesh::Body)| {
            let welded = &body.surface.welded;
            let tri = |f: &[u32; 3]| Triangle::new(f.map(|k| welded.points[k as usize]));
            (!body.surface.sheet).then(|| (k, winding::prepare(welded.facets.iter().map(tri).collect())))
        };
        Map {
            solids: panels.assembly.bodies.iter().enumerate().filter_map(solid).collect(),
            plane: panels.plane,
        }
    }

    /// Where `x` lies.
    pub fn medium(&self, x: &Vec3) -> Medium {
        if self.plane.is_some_and(|plane| plane.height(x) < 0.0) {
            return Medium::BehindEarth;
        }
        let holder = self.solids.iter().find(|(_, winding)| winding.holds(x));
        holder.map_or(Medium::Surroundings, |(body, _)| Medium::Metal(*body))
    }
}

/// Potential and field at `points` with row potentials `v`; in metal its own potential and no field,
/// behind the earth plane nothing.
///
/// Exact to the charges: their error shows within about one panel length of a surface.  A point closer
/// to a panel of a solid than the rebuilt surface is to its facet, and not above the panel by more than a
/// part of that, counts as on the surface: it has the potential of the body and the normal field of the panel.
pub fn look(solved: &Solved, sources: &Sources, map: &Map, v: &[f64], points: &[Vec3]) -> Vec<Seen> {
    let density = field::normal_field(solved, v);
    let none = Seen { potential: 0.0, field: Vec3::zeros() };
    let potentials = sources.potentials(points, std::slice::from_ref(&density));
    threads::map(points.len(), |k| match map.medium(&points[k]) {
        Medium::BehindEarth => none,
        _ if let Some(p) = surface_panel(&solved.panels, &points[k]) => Seen {
            potential: body_potential(&solved.panels, solved.panels.body[p] as usize, v),
            field: solved.panels.triangles[p].normal() * density[p],
        },
        Medium::Metal(body) => Seen { potential: body_potential(&solved.panels, body, v), ..none },
        Medium::Surroundings => {
            let gradient = sources.gradient(&points[k], &density);
            // On an edge or rim the field has no value: zero stands for it, and the medium says where it is.
            let finite = gradient.iter().all(|g| g.is_finite());
            let field = if finite { -gradient / (4.0 * PI) } else { Vec3::zeros() };
            Seen { potential: potentials[0][k] / (4.0 * PI), field }
        }
    })
}

/// Depth under a panel within which a point counts as on the surface, in offsets of the panel [1]: the
/// facet itself is one offset down, and its corners three (a cubic over a regular facet).
const UNDER: f64 = 3.0;

/// The same above it [1]: what the surface rises over its mean height.
const ABOVE: f64 = 0.5;

/// The panel of a solid on whose rebuilt surface `x` lies.
fn surface_panel(panels: &Panels, x: &Vec3) -> Option<usize> {
    let distance = |p: usize| (distance::point_of_triangle(&panels.triangles[p], x) - x).norm();
    let solid = |p: &usize| !panels.assembly.bodies[panels.body[*p] as usize].surface.sheet;
    let near = (0..panels.len()).filter(solid).filter(|p| {
        let tri = &panels.triangles[*p];
        let side = if 0.0 < tri.normal().dot(&(x - tri.centroid())) { ABOVE } else { UNDER };
        distance(*p) <= side * panels.offset[*p].abs() + ROUNDING * tri.longest_edge()
    });
    near.min_by(|a, b| distance(*a).total_cmp(&distance(*b)))
}

/// Distance from a panel that is only rounding, in longest edges [1].
const ROUNDING: f64 = 1e-6;

fn body_potential(panels: &Panels, body: usize, v: &[f64]) -> f64 {
    let row = panels.assembly.rows.iter().position(|row| row.bodies.contains(&(body as u32)));
    row.map_or(0.0, |row| v[row])
}
