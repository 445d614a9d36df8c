//! Forms grown from a seed as far as the faces hold to them.

use super::faces::Faces;
use super::faces::NONE;
use super::faces::angle;
use super::form::Form;
use super::form::polar;
use super::form_fit::Fit;
use super::form_fit::Kind;
use super::form_fit::Stand;
use super::form_fit::fit;
use super::form_fit::refine;
use crate::base::Vec3;
use nalgebra::Matrix3;
use nalgebra::SMatrix;
use nalgebra::SVector;
use nalgebra::SymmetricEigen;

/// Distance from a form within which a corner lies on it, in roundings [1].
const ON: f64 = 2.0;

/// Angle between a face and the form's normal at its corners, in crease angles: half a turn in regular
/// meshes, up to three quarters across the diagonal of skew ones [1].
const LEANS: f64 = 0.75;

/// Angle at the corners of a face, in the largest of the faces that the form was found on [1]: keeps a flat
/// cut into a ball from counting as one large facet.
const COARSER: f64 = 2.5;

/// Angle at the corners of a face, in turns of the form over the width of the face, under which it lies
/// along a tangent plane instead [1]: half a turn on strips, none on a flat that ends where a fillet begins.
const TURNS: f64 = 0.2;

/// Turns over the width of the faces in roundings under which nothing can be told [1].
const SEEN: f64 = 30.0;

/// Corners that a fit is made on at most.
const SAMPLE: usize = 300;

/// Share of the largest area within which a simpler form is taken [1].
const AS_LARGE: f64 = 0.98;

/// Corners of a seed and of its neighbours that windows are laid around at most.
const CORNERS: usize = 6;

/// Rounding in the least spread of the corners from which they tell nothing about quadrics [1].
const MUDDY: f64 = 0.01;

/// Second smallest over rounding of the general quadric through the corners from which it is the only one
/// [1], and the least it must be.
const UNIQUE: f64 = 10.0;
const UNIQUE_LEAST: f64 = 1e-3;

/// The same for the smallest, from which there is none [1].
const NONE_LEAST: f64 = 1e-6;

/// Seeds that may find nothing before the faces around such seeds are passed over.
const PATIENCE: usize = 1000;

/// A form and the faces that hold to it.
#[derive(Clone, Debug)]
pub(super) struct Region {
    pub(super) form: Form,
    pub(super) faces: Vec<u32>,
    pub(super) area: f64,
    /// Corners so few or so placed that forms of this kind go through them by chance.
    pub(super) weak: bool,
    /// Fewer corners still: three lines are always on a cylinder.
    pub(super) few: bool,
}

/// What the search knows of every face.
pub(super) struct Search<'a> {
    pub(super) faces: &'a Faces<'a>,
    /// Region of each face, or [`NONE`].
    pub(super) owner: Vec<u32>,
    /// Weak regions found so far, each once.
    pub(super) pool: Vec<Region>,
    /// Those of the pool that hold on each face.
    pooled: Vec<Vec<u32>>,
    /// Faces around seeds that found nothing.
    failed: Vec<bool>,
    n_failed: usize,
    stamp: Vec<u32>,
    now: u32,
}

impl<'a> Search<'a> {
    pub(super) fn new(faces: &'a Faces<'a>) -> Self {
        let n = faces.faces.len();
        Search {
            faces,
            owner: vec![NONE; n],
            pool: Vec::new(),
            pooled: vec![Vec::new(); n],
            failed: vec![false; n],
            n_failed: 0,
            stamp: vec![0; n],
            now: 0,
        }
    }

    /// Whether a region of the pool of this kind holds on all these faces.
    fn is_pooled(&self, kind: Kind, window: &[u32]) -> bool {
        let Some(first) = window.first() else { return false };
        self.pooled[*first as usize].iter().any(|k| {
            let region = &self.pool[*k as usize];
            kind_of(&region.form) == Some(kind)
                && window.iter().all(|f| region.faces.binary_search(f).is_ok())
        })
    }

    fn put_in_pool(&mut self, region: Region) {
        let id = self.pool.len() as u32;
        region.faces.iter().for_each(|f| self.pooled[*f as usize].push(id));
        self.pool.push(region);
    }
}

/// The best form around a seed that its corners fix, with all faces that it holds on: the simplest of
/// those nearly as large as the largest.  Weak ones go into the pool.
pub(super) fn seek(search: &mut Search<'_>, seed: u32) -> Option<Region> {
    let faces = search.faces;
    let face = &faces.faces[seed as usize];
    if face.beside.is_empty() || !face.sure {
        return None;
    }
    if PATIENCE < search.n_failed && search.failed[seed as usize] {
        return None;
    }
    let mut found: Vec<Region> = Vec::new();
    for window in windows(search, seed) {
        let points = corners(faces, &window);
        let stands = stands(faces, &window);
        for kind in [Kind::Cylinder, Kind::Cone, Kind::Sphere, Kind::Torus] {
            let known = found.iter().any(|r| {
                kind_of(&r.form) == Some(kind) && window.iter().all(|f| r.faces.binary_search(f).is_ok())
            });
            if known || search.is_pooled(kind, &window) {
                continue;
            }
            if let Some(fit) = fit(kind, &points, &stands, ON * faces.rounding)
                && let Some(region) = grow(search, fit, &window)
            {
                if region.weak {
                    search.put_in_pool(region);
                } else {
                    found.push(region);
                }
            }
        }
    }
    if found.is_empty() {
        search.n_failed += 1;
        if face.facets.len() <= 2 {
            let around = face.corners.iter().flat_map(|k| faces.star(seed, *k));
            around.for_each(|f| search.failed[f as usize] = true);
        }
    }
    let most = found.iter().map(|r| r.area).fold(0.0, f64::max);
    let near = found.into_iter().filter(|r| AS_LARGE * most <= r.area);
    near.min_by(|a, b| a.form.rank().cmp(&b.form.rank()).then(b.area.total_cmp(&a.area)))
}

/// A region of the pool on the faces that are still free, if that is most of it and still says enough.
pub(super) fn still_free(search: &Search<'_>, region: &Region) -> Option<Region> {
    let faces = search.faces;
    let free: Vec<u32> = region.faces.iter().copied().filter(|f| search.owner[*f as usize] == NONE).collect();
    if free.len() == region.faces.len() {
        return Some(region.clone());
    }
    let area: f64 = free.iter().map(|f| faces.faces[*f as usize].area).sum();
    if 2.0 * area < region.area {
        return None;
    }
    enough(faces, Region { faces: free, area, ..region.clone() })
}

fn kind_of(form: &Form) -> Option<Kind> {
    match form {
        Form::Sphere { .. } => Some(Kind::Sphere),
        Form::Cylinder { .. } => Some(Kind::Cylinder),
        Form::Cone { .. } => Some(Kind::Cone),
        Form::Torus { .. } => Some(Kind::Torus),
        Form::Plane { .. } | Form::Free => None,
    }
}

/// Sets of faces around the seed that may lie on one form: the seed with two neighbours, the faces around
/// one of its corners, around all of them, around the corners of those; free faces only.
fn windows(search: &Search<'_>, seed: u32) -> Vec<Vec<u32>> {
    let faces = search.faces;
    let face = &faces.faces[seed as usize];
    let free = |f: &u32| search.owner[*f as usize] == NONE;
    let mut windows: Vec<Vec<u32>> = Vec::new();
    let mut add = |mut window: Vec<u32>| {
        window.retain(free);
        window.sort_unstable();
        window.dedup();
        if 1 < window.len() && !windows.contains(&window) {
            windows.push(window);
        }
    };
    // Where much was tried for nothing, a third of the windows must do.
    let thorough = search.n_failed <= PATIENCE;
    let (n_beside, n_wide) = if thorough { (4, 3) } else { (2, 1) };
    let beside: Vec<u32> = face.beside.iter().map(|(g, _)| *g).filter(free).take(n_beside).collect();
    for (k, g) in beside.iter().enumerate() {
        for h in &beside[k + 1..] {
            add(vec![seed, *g, *h]);
        }
    }
    let step = face.corners.len().div_ceil(CORNERS).max(1);
    let stars: Vec<Vec<u32>> = face.corners.iter().step_by(step).map(|k| faces.star(seed, *k)).collect();
    for star in stars.iter().take(if thorough { CORNERS + 1 } else { n_wide }) {
        add(star.clone());
    }
    add(stars.concat());
    for star in stars.iter().take(n_wide) {
        let mut wide = star.clone();
        for f in star.iter().filter(|f| faces.faces[**f as usize].corners.len() <= 8) {
            for k in &faces.faces[*f as usize].corners {
                wide.extend(faces.star(*f, *k));
            }
        }
        add(wide);
    }
    if thorough {
        beside.iter().for_each(|g| add(vec![seed, *g]));
    }
    windows
}

fn corners(faces: &Faces<'_>, window: &[u32]) -> Vec<Vec3> {
    let mut corners: Vec<u32> =
        window.iter().flat_map(|f| faces.faces[*f as usize].corners.iter().copied()).collect();
    corners.sort_unstable();
    corners.dedup();
    let step = corners.len().div_ceil(SAMPLE).max(1);
    corners.iter().step_by(step).map(|k| faces.point(*k)).collect()
}

fn stands(faces: &Faces<'_>, window: &[u32]) -> Vec<Stand> {
    let stand = |f: &u32| &faces.faces[*f as usize];
    window
        .iter()
        .map(stand)
        .filter(|f| f.sure)
        .map(|f| Stand { centre: f.centre, normal: f.normal })
        .collect()
}

/// Whether a face holds to a form: None, or the largest angle at its corners [rad].
fn holds(faces: &Faces<'_>, fit: &Fit, face: u32, coarsest: f64) -> Option<f64> {
    let this = &faces.faces[face as usize];
    let near = ON * faces.rounding;
    let limit = (LEANS * faces.crease_angle).min(coarsest);
    let noise = 4.0 * faces.rounding / this.width.max(f64::MIN_POSITIVE);
    let (mut leans, mut bends) = (0.0_f64, 0.0_f64);
    for k in &this.corners {
        let x = faces.point(*k);
        let off = fit.form.distance(&x).abs();
        if near < off && (near * 20.0 < off || near * (1.0 + fit.amplification(&x)) < off) {
            return None;
        }
        let Some((_, normal)) = fit.form.nearest(&x).filter(|_| !at_apex(&fit.form, &x, near)) else {
            continue;
        };
        if this.sure {
            leans = leans.max(angle(&normal, &this.normal));
            if limit + noise < leans {
                return None;
            }
        }
        bends = bends.max(fit.form.curvatures(&x).iter().fold(0.0, |m, c| m.max(c.abs())));
    }
    if ends_on_axis(faces, &fit.form, face) {
        return None;
    }
    let bends = if matches!(fit.form, Form::Cone { .. }) { 0.0 } else { bends };
    (!this.sure || TURNS * bends * this.width <= leans + noise).then_some(leans)
}

/// Whether a small face between others of a region was left out only for its odd shape.
pub(super) fn is_left_out(faces: &Faces<'_>, region: &Region, face: u32) -> bool {
    let this = &faces.faces[face as usize];
    let noise = 4.0 * faces.rounding / this.width.max(f64::MIN_POSITIVE);
    let mean = region.area / region.faces.len().max(1) as f64;
    let leans = |k: &u32| {
        let x = faces.point(*k);
        region.form.nearest(&x).map_or(0.0, |(_, n)| angle(&n, &this.normal))
    };
    let most = this.corners.iter().map(leans).fold(0.0, f64::max);
    this.area <= mean && lies_on(faces, &region.form, face) && most <= LEANS * faces.crease_angle + noise
}

/// Whether all corners of a face are within rounding of a form.
pub(super) fn lies_on(faces: &Faces<'_>, form: &Form, face: u32) -> bool {
    let near = ON * faces.rounding;
    faces.faces[face as usize].corners.iter().all(|k| form.distance(&faces.point(*k)).abs() <= near)
}

/// Whether the axis of a form goes through a face: then it is a flat end, not a facet of the round.
fn ends_on_axis(faces: &Faces<'_>, form: &Form, face: u32) -> bool {
    let (origin, axis) = match *form {
        Form::Cylinder { through, axis, .. } => (through, axis),
        Form::Cone { apex, axis, .. } => (apex, axis),
        Form::Torus { centre, axis, .. } => (centre, axis),
        _ => return false,
    };
    faces.faces[face as usize].facets.iter().any(|f| {
        let [a, b, c] = faces.welded.facets[*f as usize].map(|k| faces.point(k) - origin);
        let [u, v, w] = [a.cross(&b), b.cross(&c), c.cross(&a)].map(|x| x.dot(&axis));
        let least = 1e-6 * (b - a).cross(&(c - a)).norm();
        (least < u && least < v && least < w) || (u < -least && v < -least && w < -least)
    })
}

fn at_apex(form: &Form, x: &Vec3, near: f64) -> bool {
    matches!(form, Form::Cone { apex, .. } if (apex - x).norm() <= 10.0 * near)
}

/// The form on all faces that are reached from the window and hold to it.
fn grow(search: &mut Search<'_>, fit: Fit, window: &[u32]) -> Option<Region> {
    let faces = search.faces;
    let mut fit = signed(faces, fit, window);
    let mut coarsest = 0.0_f64;
    for f in window {
        coarsest = coarsest.max(holds(faces, &fit, *f, f64::INFINITY)?);
    }
    let width = window.iter().map(|f| faces.faces[*f as usize].width).fold(0.0, f64::max);
    if coarsest * width < SEEN * faces.rounding {
        return None;
    }
    let coarsest = COARSER * coarsest;
    search.now += 1;
    let now = search.now;
    let mut members: Vec<u32> = window.to_vec();
    members.iter().for_each(|f| search.stamp[*f as usize] = now);
    let (mut next, mut fitted) = (0, members.len());
    loop {
        while next < members.len() && members.len() < 2 * fitted.max(4) {
            for (g, _) in &faces.faces[members[next] as usize].beside {
                let new = search.stamp[*g as usize] != now && search.owner[*g as usize] == NONE;
                if new && holds(faces, &fit, *g, coarsest).is_some() {
                    search.stamp[*g as usize] = now;
                    members.push(*g);
                }
            }
            next += 1;
        }
        if members.len() == fitted {
            break;
        }
        fit = refine(fit.form, &corners(faces, &spread(&members)), f64::INFINITY)?;
        let before = members.len();
        members.retain(|f| holds(faces, &fit, *f, coarsest).is_some());
        if members.len() < before {
            // Those dropped stay stamped, so they are not tried again.
            if 2 * members.len() < before || !window.iter().all(|f| members.contains(f)) {
                return None;
            }
            next = 0;
        }
        fitted = members.len();
    }
    let strict = members.len();
    members.retain(|f| lies_on(faces, &fit.form, *f));
    if 10 * members.len() < 9 * strict || !window.iter().any(|f| members.contains(f)) {
        return None;
    }
    members.sort_unstable();
    let area = members.iter().map(|f| faces.faces[*f as usize].area).sum();
    let region = Region { form: fit.form, faces: members, area, weak: true, few: false };
    enough(faces, region)
}

/// Members for a fit: all, or an even choice of them.
fn spread(members: &[u32]) -> Vec<u32> {
    let step = members.len().div_ceil(SAMPLE).max(1);
    members.iter().copied().step_by(step).collect()
}

/// The form with the side on which the facets' normals are.
fn signed(faces: &Faces<'_>, mut fit: Fit, window: &[u32]) -> Fit {
    let outward = fit.form.with_sign(1.0);
    let mut sum = 0.0;
    for f in window {
        let face = &faces.faces[*f as usize];
        let middle = face.corners.iter().map(|k| faces.point(*k)).sum::<Vec3>() / face.corners.len() as f64;
        sum += outward.nearest(&middle).map_or(0.0, |(_, n)| n.dot(&face.normal) * face.area);
    }
    fit.form = outward.with_sign(sum);
    fit
}

/// The region if its corners say more than any corners would; marks those that say little more.
fn enough(faces: &Faces<'_>, region: Region) -> Option<Region> {
    let points = corners(faces, &spread(&region.faces));
    match region.form {
        Form::Cylinder { .. } | Form::Cone { .. } => {
            let [around, _] = levels(faces, &region.form, &points);
            let weak = quadrics(faces, &points) != 1;
            (3 <= around).then_some(Region { few: around < 4, weak, ..region })
        }
        Form::Sphere { .. } => {
            let weak = quadrics(faces, &points) != 1;
            (2 < region.faces.len()).then_some(Region { weak, ..region })
        }
        Form::Torus { .. } => {
            let [around, tube] = levels(faces, &region.form, &points);
            let weak = around < 5 || tube < 5 || points.len() < 3 * 7 || quadrics(faces, &points) != 0;
            (3 <= around && 3 <= tube).then_some(Region { weak, ..region })
        }
        Form::Plane { .. } | Form::Free => None,
    }
}

/// How many quadrics go through the points within rounding: none, one, or a family (two circles, four
/// lines of a cylinder).
///
/// The two smallest eigenvalues of the normal equations of a general quadric, points scaled to unit spread
/// in each principal direction, against rounding.
fn quadrics(faces: &Faces<'_>, points: &[Vec3]) -> usize {
    if points.len() < 9 {
        return 2;
    }
    let n = points.len() as f64;
    let middle = points.iter().sum::<Vec3>() / n;
    let moment: Matrix3<f64> = points.iter().map(|p| (p - middle) * (p - middle).transpose() / n).sum();
    let eigen = SymmetricEigen::new(moment);
    let spans = eigen.eigenvalues.map(|x| x.max(0.0).sqrt());
    let blur = faces.rounding / spans.min();
    if !blur.is_finite() || MUDDY <= blur {
        return 2;
    }
    let mut gram = SMatrix::<f64, 10, 10>::zeros();
    for p in points {
        let q = (eigen.eigenvectors.transpose() * (p - middle)).component_div(&spans);
        let (x, y, z) = (q.x, q.y, q.z);
        let row = SVector::<f64, 10>::from([x * x, y * y, z * z, x * y, y * z, z * x, x, y, z, 1.0]);
        gram.ger(1.0 / n, &row, &row, 1.0);
    }
    let mut values: Vec<f64> = SymmetricEigen::new(gram).eigenvalues.iter().copied().collect();
    values.sort_by(f64::total_cmp);
    let rounding = |least: f64| least.max(UNIQUE * blur);
    let is_none = |value: f64, least: f64| rounding(least) < value.max(0.0).sqrt();
    usize::from(!is_none(values[0], NONE_LEAST)) + usize::from(!is_none(values[1], UNIQUE_LEAST))
}

/// Different places of points around the axis, and along it or around the tube.
fn levels(faces: &Faces<'_>, form: &Form, points: &[Vec3]) -> [usize; 2] {
    let blur = 20.0 * faces.rounding;
    let count = |origin: Vec3, axis: Vec3, radius: f64, other: &dyn Fn(&Vec3) -> f64, unit: f64| {
        let [x, y] = across(&axis);
        let off = points.iter().map(|p| p - origin).filter(|q| blur < (q - axis * q.dot(&axis)).norm());
        let turns = off.map(|q| q.dot(&y).atan2(q.dot(&x))).collect();
        [distinct(turns, blur / radius), distinct(points.iter().map(other).collect(), blur / unit)]
    };
    match *form {
        Form::Cylinder { through, axis, radius, .. } => {
            count(through, axis, radius, &|p| (p - through).dot(&axis), 1.0)
        }
        Form::Cone { apex, axis, half_angle, .. } => {
            let heights = points.iter().map(|p| (p - apex).dot(&axis)).filter(|h| blur < *h);
            let least = heights.fold(f64::INFINITY, f64::min) * half_angle.tan();
            count(apex, axis, least, &|p| (p - apex).dot(&axis), 1.0)
        }
        Form::Torus { centre, axis, major, minor, .. } => {
            let tube = |p: &Vec3| {
                let p = polar(p, &centre, &axis);
                p.height.atan2(p.rho - major)
            };
            count(centre, axis, (major - minor).max(0.2 * major), &tube, minor)
        }
        Form::Sphere { .. } | Form::Plane { .. } | Form::Free => [0, 0],
    }
}

fn across(axis: &Vec3) -> [Vec3; 2] {
    let u = Vec3::ith(axis.iamin(), 1.0).cross(axis).normalize();
    [u, axis.cross(&u)]
}

/// Number of values that differ by more than `blur` and by a thousandth of their span.
fn distinct(mut values: Vec<f64>, blur: f64) -> usize {
    values.sort_by(f64::total_cmp);
    let (Some(lo), Some(hi)) = (values.first(), values.last()) else { return 0 };
    let blur = blur.max(1e-3 * (hi - lo));
    1 + values.windows(2).filter(|w| blur < w[1] - w[0]).count()
}
