//! Potential and field at points in space.

use crate::base::Images;
use crate::base::PlaneKind;
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
    /// In the metal of a body, or of a copy of it at its potential.
    Metal(usize),
    /// In the metal of a copy of a body at the opposite potential.
    Opposite(usize),
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
    images: Images,
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
            images: panels.images.clone(),
        }
    }

    /// Where `x` lies.
    pub fn medium(&self, x: &Vec3) -> Medium {
        let behind =
            |earth: &&crate::base::ImagePlane| earth.kind == PlaneKind::Earth && earth.plane.height(x) < 0.0;
        if self.images.planes().iter().any(|plane| behind(&plane)) {
            return Medium::BehindEarth;
        }
        let front = self.images.to_front(x);
        let x = front.point(x);
        let metal = |body| if front.sign < 0.0 { Medium::Opposite(body) } else { Medium::Metal(body) };
        let holder = self.solids.iter().find(|(_, winding)| winding.holds(&x));
        holder.map_or(Medium::Surroundings, |(body, _)| metal(*body))
    }
}

/// Potential and field at `points` with row potentials `v`; in metal its own potential and no field,
/// behind the earth plane nothing.  Places behind a mirror are answered by symmetry.
///
/// Exact to the charges: their error shows within about one panel length of a surface.  A point closer
/// to a panel of a solid than the rebuilt surface is to its facet, and not above the panel by more than a
/// part of that, counts as on the surface: it has the potential of the body and the normal field of the panel.
pub fn look(solved: &Solved, sources: &Sources, map: &Map, v: &[f64], points: &[Vec3]) -> Vec<Seen> {
    let density = field::normal_field(solved, v);
    let none = Seen { potential: 0.0, field: Vec3::zeros() };
    let potentials = sources.potentials(points, std::slice::from_ref(&density));
    threads::map(points.len(), |k| {
        let front = map.images.to_front(&points[k]);
        let x = front.point(&points[k]);
        let seen = match map.medium(&x) {
            Medium::BehindEarth => none,
            _ if let Some(p) = surface_panel(&solved.panels, &x) => Seen {
                potential: body_potential(&solved.panels, solved.panels.body[p] as usize, v),
                field: solved.panels.triangles[p].normal() * density[p],
            },
            // In front of all mirrors nothing is a copy.
            Medium::Metal(body) | Medium::Opposite(body) => {
                Seen { potential: body_potential(&solved.panels, body, v), ..none }
            }
            Medium::Surroundings => {
                let gradient = sources.gradient(&x, &density);
                // On an edge or rim the field has no value: zero stands for it, and the medium says where it is.
                let finite = gradient.iter().all(|g| g.is_finite());
                let field = if finite { -gradient / (4.0 * PI) } else { Vec3::zeros() };
                // The potential sum is the same at a place and, but for the sign, at its images.
                return Seen {
                    potential: potentials[0][k] / (4.0 * PI),
                    field: front.direction(&field) * front.sign,
                };
            }
        };
        Seen { potential: seen.potential * front.sign, field: front.direction(&seen.field) * front.sign }
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
        distance(*p)
            <= side * panels.offset[*p].abs().max(panels.drawn[*p].abs()) + ROUNDING * tri.longest_edge()
    });
    near.min_by(|a, b| distance(*a).total_cmp(&distance(*b)))
}

/// Distance from a panel that is only rounding, in longest edges [1].
const ROUNDING: f64 = 1e-6;

fn body_potential(panels: &Panels, body: usize, v: &[f64]) -> f64 {
    let row = panels.assembly.rows.iter().position(|row| row.bodies.contains(&(body as u32)));
    row.map_or(0.0, |row| v[row])
}
