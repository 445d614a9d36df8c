//! Bodies of the exact cases: facets with corners on the true surface, normals out of the metal [m].

use crate::base::Vec3;
use std::f64::consts::PI;

/// A facet.
type Facet = [Vec3; 3];

/// A ball around `centre` from the icosahedron, each face cut into `frequency`²: 20 · frequency² facets.
///
/// Turned by an odd angle, so that no corner stands at a pole.
pub(super) fn ball(centre: Vec3, radius: f64, frequency: usize) -> Vec<Facet> {
    let mut facets = Vec::with_capacity(20 * frequency * frequency);
    for [a, b, c] in icosahedron() {
        let at = |i: usize, j: usize| {
            let p = a * (frequency - i - j) as f64 + b * i as f64 + c * j as f64;
            centre + turned(&p.normalize()) * radius
        };
        for i in 0..frequency {
            for j in 0..frequency - i {
                facets.push([at(i, j), at(i + 1, j), at(i, j + 1)]);
                if i + j + 1 < frequency {
                    facets.push([at(i + 1, j), at(i + 1, j + 1), at(i, j + 1)]);
                }
            }
        }
    }
    facets
}

/// A cube of edge 1 m around the origin, two facets a face.
pub(super) fn cube() -> Vec<Facet> {
    let mut facets = Vec::with_capacity(12);
    for axis in 0..3 {
        for side in [-0.5, 0.5] {
            let at = |s: f64, t: f64| {
                let mut p = Vec3::zeros();
                (p[axis], p[(axis + 1) % 3], p[(axis + 2) % 3]) = (side, s, 2.0 * side * t);
                p
            };
            let [a, b, c, d] = [at(-0.5, -0.5), at(0.5, -0.5), at(0.5, 0.5), at(-0.5, 0.5)];
            facets.extend([[a, b, c], [a, c, d]]);
        }
    }
    facets
}

/// A round sheet of radius 1 m in z = 0 of three rings, corners of the rim on the circle.
pub(super) fn disc() -> Vec<Facet> {
    let at = |(radius, sides): (f64, usize), k: usize| {
        let angle = 2.0 * PI * (k % sides) as f64 / sides as f64;
        Vec3::new(radius * angle.cos(), radius * angle.sin(), 0.0)
    };
    let mut facets: Vec<Facet> =
        (0..RINGS[0].1).map(|k| [Vec3::zeros(), at(RINGS[0], k), at(RINGS[0], k + 1)]).collect();
    for pair in RINGS.windows(2) {
        let (inner, outer) = (pair[0], pair[1]);
        for k in 0..inner.1 {
            let [a, b] = [at(inner, k), at(inner, k + 1)];
            let [p, q, r] = [0, 1, 2].map(|step| at(outer, 2 * k + step));
            facets.extend([[a, p, q], [a, q, b], [b, q, r]]);
        }
    }
    facets
}

/// Radius [m] and corners of each ring of the sheet, each with twice the corners of the one inside: 192
/// at the rim, which leave the area 1.8e-4 and the capacitance half of that too small.
const RINGS: [(f64, usize); 4] = [(0.4, 24), (0.75, 48), (0.92, 96), (1.0, 192)];

/// Turned about the axis (1, 2, 3) by 0.7 rad, by the formula of Rodrigues.
fn turned(p: &Vec3) -> Vec3 {
    let (sin, cos) = 0.7_f64.sin_cos();
    let axis = Vec3::new(1.0, 2.0, 3.0).normalize();
    p * cos + axis.cross(p) * sin + axis * (axis.dot(p) * (1.0 - cos))
}

/// The 20 faces of the icosahedron with edge 2.
fn icosahedron() -> Vec<Facet> {
    let g = 0.5 * (1.0 + 5.0_f64.sqrt());
    let signs = [(1.0, 1.0), (1.0, -1.0), (-1.0, 1.0), (-1.0, -1.0)];
    let corners: Vec<Vec3> = signs
        .iter()
        .flat_map(|(s, t)| [Vec3::new(0.0, *s, t * g), Vec3::new(*s, t * g, 0.0), Vec3::new(t * g, 0.0, *s)])
        .collect();
    let beside = |i: usize, j: usize| (corners[i] - corners[j]).norm() < 2.1;
    let mut faces = Vec::with_capacity(20);
    for i in 0..12 {
        for j in (i + 1..12).filter(|j| beside(i, *j)) {
            for k in (j + 1..12).filter(|k| beside(i, *k) && beside(j, *k)) {
                let [a, b, c] = [corners[i], corners[j], corners[k]];
                faces.push(if 0.0 < a.dot(&b.cross(&c)) { [a, b, c] } else { [a, c, b] });
            }
        }
    }
    faces
}
