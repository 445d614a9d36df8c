//! Field on the surface: panel values, local fits, the highest place of each electrode.

use crate::base::Vec3;
use crate::base::threads;
use crate::geom::distance;
use crate::kernel::triangle;
use crate::operator::Sources;
use crate::physics::gap;
use crate::physics::solved::Solved;
use nalgebra::DMatrix;
use nalgebra::DVector;
use nalgebra::Matrix2;
use nalgebra::Vector2;
use std::f64::consts::PI;

/// Panels of the two fits whose difference enters the bar.
///
/// Two spheres of 1,280 irregular facets, error of the pole field: 1.2 % with 24 panels and 2.7 % with
/// 48 at a gap of 0.2 radii, 0.6 % and 0.35 % at 1 radius (DESIGN 3.6): a compromise between noise and
/// variation.
const PATCHES: [usize; 2] = [24, 48];

/// Share of the body's area above which the level of the candidates is set [1], and the share of that
/// level from which a panel is a candidate [1].
///
/// Raw values on irregular facets scatter by up to 22 %, on needles of a flat cap by 70 %; needles hold
/// a thousandth of the area, so the level does not follow them, while every higher panel is kept.
const LEVEL_AREA: f64 = 0.005;
const CANDIDATE: f64 = 0.75;

/// Most candidates that are fitted: the highest.
const MOST_CANDIDATES: usize = 4000;

/// Cosine of the largest angle between normals of panels of one patch [1]: 50°.
const SAME_SIDE: f64 = 0.64;

/// What kind of place a maximum is.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Kind {
    /// Smooth surface.
    Smooth,
    /// Unbounded at an edge or rim.
    Edge,
}

/// The highest field of one body at given row potentials.
#[derive(Clone, Debug, PartialEq)]
pub struct Peak {
    /// Index of the body.
    pub body: usize,
    /// Kind of place.
    pub kind: Kind,
    /// Highest fitted value [V/m].
    pub field: f64,
    /// Its bar [V/m].
    pub bar: f64,
    /// Highest panel value [V/m].
    pub raw: f64,
    /// Place of the fitted value; of the panel value for [`Kind::Edge`] [m].
    pub at: Vec3,
    /// Principal curvatures of the drawn surface there, positive where it bulges out [1/m].
    pub curvature: Option<[f64; 2]>,
}

/// Normal field of each panel at row potentials `v`, outward positive; on a sheet the sum of both
/// sides [V/m].
pub fn normal_field(solved: &Solved, v: &[f64]) -> Vec<f64> {
    let n = solved.panels.len();
    let mut field = vec![0.0; n];
    for (volt, density) in v.iter().zip(&solved.charges.density) {
        field.iter_mut().zip(density).for_each(|(field, s)| *field += volt * s);
    }
    field
}

/// Magnitude of the field on the stronger side of each panel at row potentials `v` [V/m].
///
/// A solid has one side.  On a sheet the sum `s` of both sides is shared as `s/2 ± E_n`, with `E_n` the
/// normal field of all other charge, which costs one evaluation a panel.
fn magnitude(solved: &Solved, sources: &Sources, v: &[f64]) -> Vec<f64> {
    let field = normal_field(solved, v);
    let bodies = &solved.panels.assembly.bodies;
    threads::map(field.len(), |p| {
        if !bodies[solved.panels.body[p] as usize].surface.sheet {
            return field[p].abs();
        }
        let tri = &solved.panels.triangles[p];
        // The panel's own normal field is ±s/2, in the first term; the height of its centroid over its
        // own plane is only rounding.
        let own = triangle::gradient(tri, &tri.centroid()) * field[p];
        let gradient = sources.gradient(&tri.centroid(), &field) - own;
        0.5 * field[p].abs() + (gradient.dot(&tri.normal()) / (4.0 * PI)).abs()
    })
}

/// The highest field of every body that has panels, at row potentials `v`.
///
/// On smooth bodies the value is the highest of quadratic fits over the nearest panels, weighted by
/// area and distance; its bar holds the difference of two patch sizes, the scatter about the fit,
/// the relative bar of the charges (`charge_bar[row]` [1]) and the first-order change that the facets'
/// offset from the drawn surface makes to charge and area.  A body with a convex crease or a rim has no highest value:
/// kind [`Kind::Edge`]; the fitted value then speaks of places off the edges and is a lower bound.
pub fn peaks(solved: &Solved, sources: &Sources, v: &[f64], charge_bar: &[f64]) -> Vec<Peak> {
    let strength = magnitude(solved, sources, v);
    let panels = &solved.panels;
    let mut by_body: Vec<Vec<usize>> = vec![Vec::new(); panels.assembly.bodies.len()];
    (0..panels.len()).for_each(|p| by_body[panels.body[p] as usize].push(p));
    let bodies = by_body.iter().enumerate().filter(|(_, held)| !held.is_empty());
    bodies
        .map(|(body, held)| {
            let row = panels.row(held[0]);
            let charge_bar =
                row.map_or(charge_bar.iter().fold(0.0, |m: f64, b| m.max(*b)), |row| charge_bar[row]);
            peak(solved, body, held, &strength, charge_bar)
        })
        .collect()
}

fn peak(solved: &Solved, body: usize, held: &[usize], strength: &[f64], charge_bar: f64) -> Peak {
    let panels = &solved.panels;
    let top = held.iter().fold(held[0], |best, p| if strength[best] < strength[*p] { *p } else { best });
    let raw = strength[top];
    let sharp = has_unbounded_edge(solved, body);
    let candidates = candidates(solved, held, strength);
    let fits = threads::map(candidates.len(), |k| {
        let [small, wide] = PATCHES.map(|count| fit(solved, held, strength, candidates[k], count));
        let doubt = (small.value - wide.value).abs() + 2.0 * small.scatter;
        (small, doubt)
    });
    // The place is where the value is highest beyond doubt; a higher but doubtful one widens the bar.
    let sure = |k: usize| fits[k].0.value - fits[k].1;
    let best = (0..fits.len()).fold(0, |best, k| if sure(best) < sure(k) { k } else { best });
    let (small, doubt) = &fits[best];
    let highest = fits.iter().fold(small.value, |high, (fit, _)| high.max(fit.value));
    let [k1, k2] = small.curvature;
    let lift = OFFSET_SHARE * panels.offset[candidates[best]].abs() * (k1.abs() + k2.abs());
    let gap = gap::gap_of(panels, candidates[best]);
    let narrow = small.reach * small.reach * k1.abs().max(k2.abs()) / gap.max(f64::MIN_POSITIVE);
    let coarse = BEND_SHARE * small.bend * small.bend + NARROW_SHARE * narrow.min(MOST_NARROW);
    let bar = doubt.max(highest - small.value) + small.value * (charge_bar + lift + coarse);
    Peak {
        body,
        kind: if sharp { Kind::Edge } else { Kind::Smooth },
        field: small.value,
        bar,
        raw,
        at: if sharp { panels.triangles[top].centroid() } else { small.at },
        curvature: if sharp { None } else { Some(small.curvature) },
    }
}

/// Share of the offset times curvature that enters the bar of a maximum [1].
const OFFSET_SHARE: f64 = 0.5;

/// Share of the squared turn of the normal over the patch [rad²] that enters the bar of a maximum [1].
///
/// Tips of spheroids 2:1, 5:1, 10:1 drawn with 700 to 1,900 facets in meridians were low by 4.6, 11.5 and 15 %;
/// the other parts of the bar gave 2.5, 4.3 and 3.2 %.  With this share the bars cover.
const BEND_SHARE: f64 = 0.25;

/// Share of (patch radius)² × curvature over the gap that enters the bar of a maximum [1], and the largest
/// ratio that counts.
///
/// The field in a gap `d` between round bodies falls off within √(d/curvature).  Spheres 0.002 to 0.1 radii apart
/// with patches too wide for it were low by a factor of 1.3 to 4.4; this share covers them.
const NARROW_SHARE: f64 = 0.25;
const MOST_NARROW: f64 = 1e3;

/// Panels at which the maximum may be, highest first.
fn candidates(solved: &Solved, held: &[usize], strength: &[f64]) -> Vec<usize> {
    let area = |p: &usize| solved.panels.triangles[*p].area();
    let mut order = held.to_vec();
    order.sort_by(|a, b| strength[*b].total_cmp(&strength[*a]).then(a.cmp(b)));
    let enough = LEVEL_AREA * order.iter().map(area).sum::<f64>();
    let mut covered = 0.0;
    let above = order.iter().position(|p| {
        covered += area(p);
        enough <= covered
    });
    let level = above.map_or(0.0, |k| strength[order[k]]);
    order.retain(|p| CANDIDATE * level <= strength[*p]);
    order.truncate(MOST_CANDIDATES);
    order
}

/// Whether the body has an exposed convex crease or a rim.
fn has_unbounded_edge(solved: &Solved, body: usize) -> bool {
    let assembly = &solved.panels.assembly;
    let exposed = crate::physics::edges::exposed_facets(assembly, body);
    assembly.bodies[body].surface.creases.iter().any(|crease| {
        crate::physics::edges::sharp_angle(&assembly.bodies[body].surface, crease)
            < crate::physics::edges::SEAM
            && crease.facets.iter().any(|f| exposed[*f as usize])
    })
}

/// A quadratic over a patch.
#[derive(Clone, Debug)]
struct Fit {
    /// Highest value within the patch's inner part [V/m].
    value: f64,
    at: Vec3,
    /// Standard error of the fitted value [V/m].
    scatter: f64,
    curvature: [f64; 2],
    /// Radius of the patch [m].
    reach: f64,
    /// Largest angle between the normals of the patch and that of its middle [rad].
    bend: f64,
}

/// Fits the `count` panels of the body nearest to `centre`, distances measured in the mean shape of
/// the panels there: stretched meshes give patches that hold as many panels along as across.
fn fit(solved: &Solved, held: &[usize], strength: &[f64], centre: usize, count: usize) -> Fit {
    let panels = &solved.panels;
    let x0 = panels.triangles[centre].centroid();
    let frame = PatchFrame::new(solved, held, centre);
    let beside = held.iter().filter(|p| SAME_SIDE < panels.triangles[**p].normal().dot(&frame.n));
    let scaled = |p: usize| frame.scaled(&(panels.triangles[p].centroid() - x0));
    // The height over the plane counts as well: the other side of a wall is near only in the plane.
    let key =
        |p: usize| scaled(p).norm_squared() + frame.height(&(panels.triangles[p].centroid() - x0)).powi(2);
    let near = nearest(beside.map(|p| (key(*p), *p)).collect(), count);
    let radius = near.last().map_or(0.0, |(d, _)| d.sqrt());
    let far = |(_, p): &(f64, usize)| (panels.triangles[*p].centroid() - x0).norm();
    let reach = near.iter().map(far).fold(0.0, f64::max);
    let turn = |(_, p): &(f64, usize)| panels.triangles[*p].normal().dot(&frame.n).clamp(-1.0, 1.0).acos();
    let bend = near.iter().map(turn).fold(0.0, f64::max);
    let top = near.iter().fold(strength[centre], |top, (_, p)| top.max(strength[*p]));
    let alone = Fit { value: top, at: x0, scatter: 0.0, curvature: [0.0; 2], reach, bend };
    if near.len() < 8 || radius <= 0.0 {
        return Fit { scatter: spread(near.iter().map(|(_, p)| strength[*p])), ..alone };
    }
    let unit = panels.triangles[centre].area();
    let weight = |d_sq: f64, p: usize| {
        (panels.triangles[p].area() / unit * (-2.0 * d_sq / (radius * radius)).exp()).sqrt()
    };
    let weights: Vec<f64> = near.iter().map(|(d, p)| weight(*d, *p)).collect();
    let basis = |(x, y): (f64, f64)| [1.0, x, y, x * x, x * y, y * y];
    let place = |p: usize| (scaled(p).x / radius, scaled(p).y / radius);
    let rows: Vec<[f64; 6]> = near.iter().map(|(_, p)| basis(place(*p))).collect();
    let a = DMatrix::from_fn(near.len(), 6, |r, c| weights[r] * rows[r][c]);
    let values = DVector::from_fn(near.len(), |r, _| weights[r] * strength[near[r].1]);
    let Ok(c) = a.svd(true, true).solve(&values, 1e-9) else { return alone };
    let model = |xy: (f64, f64)| basis(xy).iter().zip(c.iter()).map(|(b, c)| b * c).sum::<f64>();
    let misfit = |r: usize| (strength[near[r].1] - model((rows[r][1], rows[r][2]))) * weights[r];
    let weight_sq: f64 = weights.iter().map(|w| w * w).sum();
    let variance = (0..near.len()).map(|r| misfit(r).powi(2)).sum::<f64>() / weight_sq;
    let (x, y) = highest([c[0], c[1], c[2], c[3], c[4], c[5]]);
    let value = model((x, y));
    // A fit above all its panels extrapolates: held to the highest panel, the excess counts as error.
    let scatter = (variance * 6.0 / (near.len() - 6) as f64).sqrt() + (value - top).max(0.0);
    let curvature = curvature(solved, &near, [x0, frame.e, frame.f]);
    let place = x0 + frame.unscaled(x * radius, y * radius);
    // Back onto the surface: the nearest point of the panels of the patch.
    let onto = |(_, p): &(f64, usize)| distance::point_of_triangle(&panels.triangles[*p], &place);
    let off = |y: &Vec3| (y - place).norm_squared();
    let at = near.iter().map(onto).min_by(|a, b| off(a).total_cmp(&off(b))).unwrap_or(place);
    Fit { value: value.min(top), at, scatter, curvature, reach, bend }
}

/// The `count` entries of least distance, in order.
fn nearest(mut all: Vec<(f64, usize)>, count: usize) -> Vec<(f64, usize)> {
    let order = |a: &(f64, usize), b: &(f64, usize)| a.0.total_cmp(&b.0).then(a.1.cmp(&b.1));
    if count < all.len() {
        all.select_nth_unstable_by(count, order);
        all.truncate(count);
    }
    all.sort_by(order);
    all
}

/// Plane of a patch with the mean shape of its panels as the measure of length.
struct PatchFrame {
    e: Vec3,
    f: Vec3,
    n: Vec3,
    /// Inverse root of the mean second moment [1/m], and its inverse.
    scale: Matrix2<f64>,
    unscale: Matrix2<f64>,
}

/// Panels whose shapes make the measure of a patch.
const SHAPES: usize = 8;

impl PatchFrame {
    fn new(solved: &Solved, held: &[usize], centre: usize) -> Self {
        let triangles = &solved.panels.triangles;
        let (x0, n) = (triangles[centre].centroid(), triangles[centre].normal());
        let e = (triangles[centre].corners[1] - triangles[centre].corners[0]).normalize();
        let f = n.cross(&e);
        let flat = |d: &Vec3| Vector2::new(d.dot(&e), d.dot(&f));
        let beside = held.iter().filter(|p| SAME_SIDE < triangles[**p].normal().dot(&n));
        let close =
            nearest(beside.map(|p| ((triangles[*p].centroid() - x0).norm_squared(), *p)).collect(), SHAPES);
        let mut second = Matrix2::zeros();
        for (_, p) in &close {
            let c = triangles[*p].centroid();
            for corner in &triangles[*p].corners {
                let d = flat(&(corner - c));
                second += d * d.transpose();
            }
        }
        // Over its trace, so that lengths times a power of two change no bit of the rest.
        let size = (second.trace() / (12.0 * close.len().max(1) as f64)).sqrt().max(f64::MIN_POSITIVE);
        let eigen = (second / second.trace().max(f64::MIN_POSITIVE)).symmetric_eigen();
        let root = |power: f64| {
            let values = eigen.eigenvalues.map(|value| value.max(f64::EPSILON).powf(power));
            eigen.eigenvectors * Matrix2::from_diagonal(&values) * eigen.eigenvectors.transpose()
        };
        PatchFrame { e, f, n, scale: root(-0.5) / size, unscale: root(0.5) * size }
    }

    /// Height over the plane in mean panel sizes [1].
    fn height(&self, d: &Vec3) -> f64 {
        d.dot(&self.n) * self.scale.determinant().abs().sqrt()
    }

    fn scaled(&self, d: &Vec3) -> Vector2<f64> {
        self.scale * Vector2::new(d.dot(&self.e), d.dot(&self.f))
    }

    fn unscaled(&self, x: f64, y: f64) -> Vec3 {
        let d = self.unscale * Vector2::new(x, y);
        self.e * d.x + self.f * d.y
    }
}

fn spread(values: impl Iterator<Item = f64> + Clone) -> f64 {
    let (lo, hi) = values.fold((f64::INFINITY, f64::NEG_INFINITY), |(lo, hi), v| (lo.min(v), hi.max(v)));
    if lo <= hi { hi - lo } else { 0.0 }
}

/// Reach of the search about the centre of a patch, in patch radii [1].
const REACH: f64 = 0.4;

/// Where the quadratic is highest within [`REACH`].
fn highest(c: [f64; 6]) -> (f64, f64) {
    let model = |x: f64, y: f64| c[0] + c[1] * x + c[2] * y + c[3] * x * x + c[4] * x * y + c[5] * y * y;
    let det = 4.0 * c[3] * c[5] - c[4] * c[4];
    if 0.0 < det && c[3] < 0.0 {
        let (x, y) = ((-2.0 * c[5] * c[1] + c[4] * c[2]) / det, (-2.0 * c[3] * c[2] + c[4] * c[1]) / det);
        if x.hypot(y) <= REACH {
            return (x, y);
        }
    }
    let rim = (0..64).map(|k| (f64::from(k) * PI / 32.0).sin_cos()).map(|(s, c)| (REACH * c, REACH * s));
    rim.fold((0.0, 0.0), |best, at| if model(best.0, best.1) < model(at.0, at.1) { at } else { best })
}

/// Principal curvatures from a linear fit of the recovered normals over a patch, `n ≈ n₀ + S x` [1/m].
fn curvature(solved: &Solved, near: &[(f64, usize)], [x0, e, f]: [Vec3; 3]) -> [f64; 2] {
    let panels = &solved.panels;
    let normal = |p: usize| {
        let surface = &panels.assembly.bodies[panels.body[p] as usize].surface;
        let [a, b, c] = surface.normals[panels.facet[p] as usize];
        let mean = |k: usize| panels.bary[p].iter().map(|w| w[k]).sum::<f64>() / 3.0;
        (a * mean(0) + b * mean(1) + c * mean(2)).normalize()
    };
    let far = |(_, p): &(f64, usize)| (panels.triangles[*p].centroid() - x0).norm();
    let reach = near.iter().map(far).fold(f64::MIN_POSITIVE, f64::max);
    let a = DMatrix::from_fn(near.len(), 3, |r, c| {
        let d = (panels.triangles[near[r].1].centroid() - x0) / reach;
        [1.0, d.dot(&e), d.dot(&f)][c]
    });
    let b = DMatrix::from_fn(near.len(), 2, |r, c| normal(near[r].1).dot(&[e, f][c]));
    let Ok(s) = a.svd(true, true).solve(&b, 1e-12) else { return [0.0; 2] };
    let (p, q, r) = (s[(1, 0)] / reach, 0.5 * (s[(1, 1)] + s[(2, 0)]) / reach, s[(2, 1)] / reach);
    let (mean, half) = (0.5 * (p + r), (0.25 * (p - r) * (p - r) + q * q).sqrt());
    [mean + half, mean - half]
}
