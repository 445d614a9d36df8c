//! Bodies made for tests: boxes, spheres, tori, sheets.

use amberskin::base::Vec3;
use amberskin::geom::Triangle;
use amberskin::mesh::Body;
use amberskin::mesh::Surface;
use amberskin::mesh::Welded;
use std::collections::BTreeMap;
use std::f64::consts::TAU;

/// Facets as triangles.
pub(crate) type Facets = Vec<[Vec3; 3]>;

pub(crate) fn vec3(x: f64, y: f64, z: f64) -> Vec3 {
    Vec3::new(x, y, z)
}

/// A grid of `n × m` cells over the square spanned by two sides, each cell two facets.
pub(crate) fn patch(origin: Vec3, u: Vec3, v: Vec3, n: usize, m: usize) -> Facets {
    let at = |i: usize, j: usize| origin + u * (i as f64 / n as f64) + v * (j as f64 / m as f64);
    let cell = |i, j| {
        let [a, b, c, d] = [at(i, j), at(i + 1, j), at(i + 1, j + 1), at(i, j + 1)];
        [[a, b, c], [a, c, d]]
    };
    (0..n).flat_map(|i| (0..m).flat_map(move |j| cell(i, j))).collect()
}

/// A box between two corners, each face a grid of `n × n` cells.
pub(crate) fn cuboid(lo: Vec3, hi: Vec3, n: usize) -> Facets {
    let s = hi - lo;
    let (x, y, z) = (vec3(s.x, 0.0, 0.0), vec3(0.0, s.y, 0.0), vec3(0.0, 0.0, s.z));
    [
        patch(lo, y, x, n, n),
        patch(lo + z, x, y, n, n),
        patch(lo, x, z, n, n),
        patch(lo + y, z, x, n, n),
        patch(lo, z, y, n, n),
        patch(lo + x, y, z, n, n),
    ]
    .concat()
}

/// A sphere of `2 n (m − 1)` facets, corners on the sphere.
pub(crate) fn sphere(centre: Vec3, radius: f64, n: usize, m: usize) -> Facets {
    let at = |i: usize, j: usize| {
        let (phi, theta) = (TAU * (i % n) as f64 / n as f64, 0.5 * TAU * j as f64 / m as f64);
        let rim = if j == 0 || j == m { 0.0 } else { theta.sin() };
        centre + vec3(rim * phi.cos(), rim * phi.sin(), theta.cos()) * radius
    };
    let mut out = Facets::new();
    for (i, j) in (0..n).flat_map(|i| (0..m).map(move |j| (i, j))) {
        let [a, b, c, d] = [at(i, j), at(i, j + 1), at(i + 1, j + 1), at(i + 1, j)];
        if j + 1 < m {
            out.push([a, b, c]);
        }
        if 0 < j {
            out.push([a, c, d]);
        }
    }
    out
}

/// A torus about the z axis of `2 n m` facets.
pub(crate) fn torus(ring: f64, tube: f64, n: usize, m: usize) -> Facets {
    let at = |i: usize, j: usize| {
        let (phi, psi) = (TAU * (i % n) as f64 / n as f64, TAU * (j % m) as f64 / m as f64);
        let r = ring + tube * psi.cos();
        vec3(r * phi.cos(), r * phi.sin(), tube * psi.sin())
    };
    let cell = |i, j| {
        let [a, b, c, d] = [at(i, j), at(i + 1, j), at(i + 1, j + 1), at(i, j + 1)];
        [[a, b, c], [a, c, d]]
    };
    (0..n).flat_map(|i| (0..m).flat_map(move |j| cell(i, j))).collect()
}

/// The same facets seen from the other side.
pub(crate) fn flipped(facets: &Facets) -> Facets {
    facets.iter().map(|[a, b, c]| [*a, *c, *b]).collect()
}

/// Facets moved by `f`.
pub(crate) fn moved(facets: &Facets, f: impl Fn(&Vec3) -> Vec3) -> Facets {
    facets.iter().map(|t| t.map(|p| f(&p))).collect()
}

pub(crate) fn triangles(facets: &Facets) -> Vec<Triangle> {
    facets.iter().map(|t| Triangle::new(*t)).collect()
}

pub(crate) fn area(facets: &Facets) -> f64 {
    triangles(facets).iter().map(Triangle::area).sum()
}

/// A surface whose equal corners are shared.
pub(crate) fn surface(facets: &Facets, sheet: bool) -> Surface {
    let mut index: BTreeMap<[u64; 3], u32> = BTreeMap::new();
    let mut welded = Welded::default();
    for facet in facets {
        welded.facets.push(facet.map(|p| {
            *index.entry([p.x, p.y, p.z].map(|c| (c + 0.0).to_bits())).or_insert_with(|| {
                welded.points.push(p);
                welded.points.len() as u32 - 1
            })
        }));
    }
    let normals = triangles(facets).iter().map(|t| [t.normal(); 3]).collect();
    Surface { welded, sheet, normals, creases: Vec::new(), rims_as_drawn: true }
}

pub(crate) fn solid(name: &str, facets: &Facets) -> Body {
    Body { name: name.to_owned(), surface: surface(facets, false) }
}

pub(crate) fn sheet(name: &str, facets: &Facets) -> Body {
    Body { name: name.to_owned(), surface: surface(facets, true) }
}
