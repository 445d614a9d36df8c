//! A body prepared for questions about its place among others: shells, trees, inside or outside.

use crate::base::Vec3;
use crate::geom::Bounds;
use crate::geom::Triangle;
use crate::geom::winding;
use crate::geom::winding::Winding;
use crate::mesh::Surface;

/// Marks an edge without exactly one facet beyond it.
pub(crate) const NOBODY: u32 = u32::MAX;

/// Winding number from which a place certainly is metal [1]; a doubtful place counts as open.
const METAL: f64 = 0.75;

/// One connected shell of a body.
#[derive(Clone, Debug, PartialEq)]
pub(crate) struct Shell {
    /// Its facets, ascending.
    pub(crate) facets: Vec<u32>,
    /// Box around it.
    pub(crate) bounds: Bounds,
    /// Volume it encloses [m³]; negative for the wall of a cavity.
    pub(crate) volume: f64,
}

/// A body with everything derived from its surface alone.
#[derive(Clone, Debug, PartialEq)]
pub(crate) struct Part {
    /// Facets as triangles, with their tree.
    pub(crate) skin: Winding,
    /// Corners of each facet as indices.
    pub(crate) corners: Vec<[u32; 3]>,
    /// Facet beyond each edge of each facet, or [`NOBODY`].
    pub(crate) beyond: Vec<[u32; 3]>,
    /// Shell of each facet.
    pub(crate) shell_of: Vec<u32>,
    /// The shells, in order of their first facet.
    pub(crate) shells: Vec<Shell>,
    /// Whether it is a sheet, which has no inside.
    pub(crate) sheet: bool,
}

/// Prepares `surface`; takes `n log n` steps.
pub(crate) fn prepare(surface: &Surface) -> Part {
    let points = &surface.welded.points;
    let corner = |c: u32| points.get(c as usize).copied().unwrap_or_else(Vec3::zeros);
    let corners = surface.welded.facets.clone();
    let triangles: Vec<Triangle> = corners.iter().map(|f| Triangle::new(f.map(corner))).collect();
    let beyond = beyond(&corners);
    let (shell_of, shells) = shells(&beyond, &triangles);
    Part { skin: winding::prepare(triangles), corners, beyond, shell_of, shells, sheet: surface.sheet }
}

impl Part {
    /// Box around the body.
    pub(crate) fn bounds(&self) -> Bounds {
        self.skin.bounds()
    }

    /// The facet as a triangle.
    pub(crate) fn triangle(&self, facet: usize) -> &Triangle {
        &self.skin.triangles()[facet]
    }

    /// Whether `x` certainly lies in the metal; never for a sheet.
    pub(crate) fn holds(&self, x: &Vec3) -> bool {
        !self.sheet && self.bounds().holds(x) && METAL <= self.skin.at(x)
    }

    /// A corner of a shell [m].
    pub(crate) fn point_of(&self, shell: &Shell) -> Vec3 {
        self.triangle(shell.facets[0] as usize).corners[0]
    }

    /// Whether two facets share a corner.
    pub(crate) fn joined(&self, f: usize, g: usize) -> bool {
        self.corners[f].iter().any(|c| self.corners[g].contains(c))
    }

    /// Whether the wall of a cavity, `shell`, encloses `x`.
    pub(crate) fn encloses(&self, shell: &Shell, x: &Vec3) -> bool {
        let angle = || shell.facets.iter().map(|&f| winding::solid_angle(self.triangle(f as usize), x));
        shell.bounds.holds(x) && angle().sum::<f64>().abs() / (4.0 * std::f64::consts::PI) >= winding::INSIDE
    }

    /// Whether `shell` is the wall of a cavity in the metal of this body.
    pub(crate) fn is_cavity(&self, shell: &Shell, abs_tol: f64) -> bool {
        let behind = |f: u32| {
            let t = self.triangle(f as usize);
            self.holds(&(t.centroid() - t.normal() * abs_tol))
        };
        !self.sheet && shell.volume < 0.0 && shell.facets.first().is_some_and(|&f| behind(f))
    }
}

/// Facet beyond each edge, where exactly two facets share it.
fn beyond(corners: &[[u32; 3]]) -> Vec<[u32; 3]> {
    let mut edges: Vec<(u32, u32, u32, u8)> = Vec::with_capacity(3 * corners.len());
    for (f, c) in corners.iter().enumerate() {
        for k in 0..3 {
            let (p, q) = (c[k], c[(k + 1) % 3]);
            edges.push((p.min(q), p.max(q), f as u32, k as u8));
        }
    }
    edges.sort_unstable();
    let mut beyond = vec![[NOBODY; 3]; corners.len()];
    for run in edges.chunk_by(|a, b| (a.0, a.1) == (b.0, b.1)) {
        if let [a, b] = run {
            beyond[a.2 as usize][a.3 as usize] = b.2;
            beyond[b.2 as usize][b.3 as usize] = a.2;
        }
    }
    beyond
}

/// Shell of each facet, and the shells in order of their first facet.
fn shells(beyond: &[[u32; 3]], triangles: &[Triangle]) -> (Vec<u32>, Vec<Shell>) {
    let mut shell_of = vec![NOBODY; triangles.len()];
    let mut shells = Vec::new();
    for start in 0..triangles.len() {
        if shell_of[start] != NOBODY {
            continue;
        }
        let name = shells.len() as u32;
        shell_of[start] = name;
        let (mut facets, mut at) = (vec![start as u32], 0);
        while at < facets.len() {
            for &g in &beyond[facets[at] as usize] {
                if g != NOBODY && shell_of[g as usize] == NOBODY {
                    shell_of[g as usize] = name;
                    facets.push(g);
                }
            }
            at += 1;
        }
        facets.sort_unstable();
        shells.push(shell(facets, triangles));
    }
    (shell_of, shells)
}

fn shell(facets: Vec<u32>, triangles: &[Triangle]) -> Shell {
    let own = || facets.iter().map(|&f| &triangles[f as usize]);
    let bounds = own().fold(Bounds::empty(), |b, t| b.joined(&Bounds::of(&t.corners)));
    let middle = bounds.centre();
    let volume = own().map(|t| (t.corners[0] - middle).dot(&t.cross())).sum::<f64>() / 6.0;
    Shell { facets, bounds, volume }
}
