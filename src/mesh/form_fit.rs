//! Forms through given points, by least squares of the distances.

use super::form::Form;
use super::form::polar;
use crate::base::Vec3;
use nalgebra::Matrix3;
use nalgebra::Matrix4;
use nalgebra::Matrix6;
use nalgebra::SMatrix;
use nalgebra::SVector;
use nalgebra::SymmetricEigen;
use nalgebra::Vector4;
use std::f64::consts::FRAC_PI_2;

/// Most numbers that fix a form: those of a torus.
const MOST: usize = 7;

/// Steps of Gauss and Newton at most; from a start out of normals that are half a facet's turn wrong the
/// fits of the tests settle within 6 to 12.
const STEPS: usize = 25;

/// Steps after which a fit that is far off and does not halve the sum of squares in a step is given up.
const PATIENT: usize = 4;

/// Sum of squares over that of the distances allowed above which a fit is far off [1].
const HOPELESS: f64 = 1e4;

/// Distance from the apex, in extents of the points, within which a corner is meant to be the apex [1].
const TIP: f64 = 1e-2;

/// Smallest over largest eigenvalue of the scaled normal equations under which the points do not fix the
/// form: two circles leave a family of tori, whose smallest eigenvalue is rounding (below 1e-13); the
/// thinnest real patch of the tests has 1e-7.
const FIXED: f64 = 1e-11;

/// Half angle of a cone, and what it lacks of a right angle, at least [rad]: beyond it is a cylinder or a
/// plane.
const LEAST_ANGLE: f64 = 1e-4;

type Square = SMatrix<f64, MOST, MOST>;
type Column = SVector<f64, MOST>;

/// The kinds of form that are fitted.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Kind {
    Sphere,
    Cylinder,
    Cone,
    Torus,
}

/// Numbers that fix a form of this kind.
pub(super) fn freedoms(kind: Kind) -> usize {
    match kind {
        Kind::Sphere => 4,
        Kind::Cylinder => 5,
        Kind::Cone => 6,
        Kind::Torus => 7,
    }
}

/// Where a facet stands: centre of the circle through its corners and unit normal.
///
/// On a strip between two circles of a surface of revolution this line meets the axis exactly.
#[derive(Clone, Copy, Debug)]
pub(super) struct Stand {
    pub(super) centre: Vec3,
    pub(super) normal: Vec3,
}

/// A form with how well the points fix it.
#[derive(Clone, Debug)]
pub(super) struct Fit {
    pub(super) form: Form,
    frame: [Vec3; 2],
    spread: Square,
    scale: f64,
}

impl Fit {
    /// Error of the form at `x` for an error of one of the points fitted, in the same unit [1].
    pub(super) fn amplification(&self, x: &Vec3) -> f64 {
        let (_, row) = row(&self.form, &self.frame, self.scale, x);
        (row.transpose() * self.spread * row)[0].max(0.0).sqrt()
    }
}

/// The form of this kind within `near` [m] of all points, or None where there is none or they do not fix
/// one.
///
/// Starts from what the facets' normals tell and refines all numbers with the distances of the points
/// (Gauss and Newton with the damping of Levenberg and Marquardt).
pub(super) fn fit(kind: Kind, points: &[Vec3], stands: &[Stand], near: f64) -> Option<Fit> {
    if points.len() <= freedoms(kind) {
        return None;
    }
    let start = match kind {
        Kind::Sphere => sphere_start(points),
        Kind::Cylinder => cylinder_start(points, stands),
        Kind::Cone => cone_start(points, stands),
        Kind::Torus => torus_start(points, stands),
    }?;
    refine(start, points, near)
}

/// The form moved to the least squares of the distances of the points; None where one stays farther than
/// `near` [m].
pub(super) fn refine(start: Form, points: &[Vec3], near: f64) -> Option<Fit> {
    let hopeless = near * near * points.len() as f64 * HOPELESS;
    let scale = extent(points);
    let mut form = start;
    let mut damping = 1e-6;
    let mut sum = square_sum(&form, points, scale);
    let mut last = None;
    for n in 0..STEPS {
        let frame = frame(&form);
        let (normal, right) = equations(&form, &frame, scale, points);
        last = Some((normal, frame));
        let mut damped = normal;
        (0..MOST).for_each(|k| damped[(k, k)] *= 1.0 + damping);
        let step = damped.cholesky().map(|c| c.solve(&right)).unwrap_or_else(Column::zeros);
        let Some(next) = stepped(&form, &frame, scale, &step) else {
            damping = (damping * 10.0_f64).max(1e-4);
            continue;
        };
        let next_sum = square_sum(&next, points, scale);
        let size = step.amax();
        if next_sum <= sum {
            let gain = sum - next_sum;
            (form, damping) = (next, damping * 0.1);
            sum = next_sum;
            if PATIENT <= n && hopeless < sum && gain < sum {
                return None;
            }
            if size < 1e-12 || gain <= 1e-9 * sum {
                break;
            }
        } else {
            if size < 1e-10 || 1e6 < damping {
                break;
            }
            damping = (damping * 10.0).max(1e-6);
        }
    }
    let (normal, frame) = last?;
    if !points.iter().all(|p| form.distance(p).abs() <= near) {
        return None;
    }
    let spread = inverse(&form, &normal)?;
    Some(Fit { form, frame, spread, scale })
}

/// Inverse of the normal equations, None where the smallest eigenvalue says that the form is not fixed.
fn inverse(form: &Form, normal: &Square) -> Option<Square> {
    let n = match form {
        Form::Sphere { .. } => 4,
        Form::Cylinder { .. } => 5,
        Form::Cone { .. } => 6,
        Form::Torus { .. } => 7,
        Form::Plane { .. } | Form::Free => return None,
    };
    let mut scaled = *normal;
    let root = Column::from_fn(|k, _| if k < n { normal[(k, k)].sqrt() } else { 1.0 });
    if root.iter().any(|x| !(0.0 < *x && x.is_finite())) {
        return None;
    }
    for i in 0..MOST {
        for k in 0..MOST {
            scaled[(i, k)] /= root[i] * root[k];
        }
    }
    let eigen = SymmetricEigen::new(scaled);
    let (lo, hi) = (eigen.eigenvalues.min(), eigen.eigenvalues.max());
    if lo <= FIXED * hi {
        return None;
    }
    let mut inverse = scaled.try_inverse()?;
    for i in 0..MOST {
        for k in 0..MOST {
            inverse[(i, k)] = if i < n && k < n { inverse[(i, k)] / (root[i] * root[k]) } else { 0.0 };
        }
    }
    Some(inverse)
}

/// Largest distance of a point from their mean [m].
fn extent(points: &[Vec3]) -> f64 {
    let mean = mean(points);
    points.iter().map(|p| (p - mean).norm()).fold(0.0, f64::max).max(f64::MIN_POSITIVE)
}

fn mean(points: &[Vec3]) -> Vec3 {
    points.iter().sum::<Vec3>() / points.len().max(1) as f64
}

fn square_sum(form: &Form, points: &[Vec3], scale: f64) -> f64 {
    let square = |p: &Vec3| match tip(form, p, scale) {
        Some(off) => off.norm_squared(),
        None => form.distance(p).powi(2),
    };
    points.iter().map(square).sum()
}

/// From the apex to a corner that is meant to be it [m]: there the distance from the cone has no
/// derivative, and a cone through a circle could turn about the corner.
fn tip(form: &Form, x: &Vec3, scale: f64) -> Option<Vec3> {
    let Form::Cone { apex, .. } = form else { return None };
    Some(x - apex).filter(|off| off.norm() <= TIP * scale)
}

fn frame(form: &Form) -> [Vec3; 2] {
    match form {
        Form::Cylinder { axis, .. } | Form::Cone { axis, .. } | Form::Torus { axis, .. } => {
            let k = axis.iamin();
            let u = Vec3::ith(k, 1.0).cross(axis).normalize();
            [u, axis.cross(&u)]
        }
        _ => [Vec3::x(), Vec3::y()],
    }
}

/// Distance of `x` and its derivatives with respect to the numbers of the form: lengths [1], angles times
/// `scale` [1].
fn row(form: &Form, frame: &[Vec3; 2], scale: f64, x: &Vec3) -> (f64, Column) {
    let mut row = Column::zeros();
    let [u, v] = frame;
    let distance = match *form {
        Form::Sphere { centre, radius, .. } => {
            let q = x - centre;
            let e = q.try_normalize(0.0).unwrap_or_else(Vec3::zeros);
            row.fixed_rows_mut::<3>(0).copy_from(&-e);
            row[3] = -1.0;
            q.norm() - radius
        }
        Form::Cylinder { through, axis, radius, .. } => {
            let p = polar(x, &through, &axis);
            let (eu, ev) = (p.away.dot(u), p.away.dot(v));
            (row[0], row[1]) = (-p.height * eu / scale, -p.height * ev / scale);
            (row[2], row[3], row[4]) = (-eu, -ev, -1.0);
            p.rho - radius
        }
        Form::Cone { apex, axis, half_angle, .. } => {
            let p = polar(x, &apex, &axis);
            let (sin, cos) = half_angle.sin_cos();
            let lever = -(p.height * cos + p.rho * sin) / scale;
            (row[0], row[1]) = (lever * p.away.dot(u), lever * p.away.dot(v));
            row.fixed_rows_mut::<3>(2).copy_from(&-(p.away * cos - axis * sin));
            row[5] = -(p.rho * sin + p.height * cos) / scale;
            p.rho * cos - p.height * sin
        }
        Form::Torus { centre, axis, major, minor, .. } => {
            let p = polar(x, &centre, &axis);
            let out = p.rho - major;
            let tube = out.hypot(p.height);
            let inverse = if 0.0 < tube { 1.0 / tube } else { 0.0 };
            let lever = (p.height * p.rho - out * p.height) * inverse / scale;
            (row[0], row[1]) = (lever * p.away.dot(u), lever * p.away.dot(v));
            row.fixed_rows_mut::<3>(2).copy_from(&(-(p.away * out + axis * p.height) * inverse));
            (row[5], row[6]) = (-out * inverse, -1.0);
            tube - minor
        }
        Form::Plane { .. } | Form::Free => 0.0,
    };
    (distance, row)
}

fn equations(form: &Form, frame: &[Vec3; 2], scale: f64, points: &[Vec3]) -> (Square, Column) {
    let (mut normal, mut right) = (Square::zeros(), Column::zeros());
    for p in points {
        if let Some(off) = tip(form, p, scale) {
            for k in 0..3 {
                normal[(k + 2, k + 2)] += 1.0;
                right[k + 2] += off[k];
            }
            continue;
        }
        let (distance, row) = row(form, frame, scale, p);
        normal.ger(1.0, &row, &row, 1.0);
        right.axpy(-distance, &row, 1.0);
    }
    // Numbers that the form does not have stay as they are.
    for k in 0..MOST {
        if normal[(k, k)] <= 0.0 {
            normal[(k, k)] = 1.0;
        }
    }
    (normal, right)
}

fn stepped(form: &Form, [u, v]: &[Vec3; 2], scale: f64, step: &Column) -> Option<Form> {
    let turned = |axis: Vec3| (axis + (u * step[0] + v * step[1]) / scale).try_normalize(0.0);
    let shift = |k: usize| Vec3::new(step[k], step[k + 1], step[k + 2]);
    let form = match *form {
        Form::Sphere { centre, radius, sign } => {
            Form::Sphere { centre: centre + shift(0), radius: radius + step[3], sign }
        }
        Form::Cylinder { through, axis, radius, sign } => Form::Cylinder {
            through: through + u * step[2] + v * step[3],
            axis: turned(axis)?,
            radius: radius + step[4],
            sign,
        },
        Form::Cone { apex, axis, half_angle, sign } => Form::Cone {
            apex: apex + shift(2),
            axis: turned(axis)?,
            half_angle: half_angle + step[5] / scale,
            sign,
        },
        Form::Torus { centre, axis, major, minor, sign } => Form::Torus {
            centre: centre + shift(2),
            axis: turned(axis)?,
            major: major + step[5],
            minor: minor + step[6],
            sign,
        },
        flat => flat,
    };
    is_sound(&form).then_some(form)
}

fn is_sound(form: &Form) -> bool {
    match *form {
        Form::Sphere { radius, .. } | Form::Cylinder { radius, .. } => 0.0 < radius && radius.is_finite(),
        Form::Cone { half_angle, .. } => LEAST_ANGLE < half_angle && half_angle < FRAC_PI_2 - LEAST_ANGLE,
        Form::Torus { major, minor, .. } => 0.0 < minor && 0.0 < major && (major + minor).is_finite(),
        Form::Plane { .. } | Form::Free => true,
    }
}

/// Sphere by the linear equations |x|² = 2 c·x + (r² − |c|²), about the mean.
fn sphere_start(points: &[Vec3]) -> Option<Form> {
    let middle = mean(points);
    let (mut a, mut b) = (Matrix4::zeros(), Vector4::zeros());
    let scale = extent(points);
    for p in points {
        let q = (p - middle) / scale;
        let row = Vector4::new(2.0 * q.x, 2.0 * q.y, 2.0 * q.z, 1.0);
        a.ger(1.0, &row, &row, 1.0);
        b.axpy(q.norm_squared(), &row, 1.0);
    }
    let s = a.cholesky()?.solve(&b);
    let centre = Vec3::new(s.x, s.y, s.z);
    let radius = (s.w + centre.norm_squared()).max(0.0).sqrt() * scale;
    let form = Form::Sphere { centre: middle + centre * scale, radius, sign: 1.0 };
    is_sound(&form).then_some(form)
}

/// Direction to which the vectors are most nearly perpendicular.
fn least_direction(moment: Matrix3<f64>) -> Vec3 {
    let eigen = SymmetricEigen::new(moment);
    eigen.eigenvectors.column(eigen.eigenvalues.imin()).into_owned()
}

/// Centre and radius of the circle through the points (r, z) [m].
fn circle(points: &[(f64, f64)]) -> Option<(f64, f64, f64)> {
    let n = points.len() as f64;
    let (mr, mz) = points.iter().fold((0.0, 0.0), |(a, b), (r, z)| (a + r / n, b + z / n));
    let (mut a, mut b) = (Matrix3::zeros(), Vec3::zeros());
    let scale = points.iter().map(|(r, z)| (r - mr).hypot(z - mz)).fold(f64::MIN_POSITIVE, f64::max);
    for (r, z) in points {
        let (x, y) = ((r - mr) / scale, (z - mz) / scale);
        let row = Vec3::new(2.0 * x, 2.0 * y, 1.0);
        a.ger(1.0, &row, &row, 1.0);
        b.axpy(x * x + y * y, &row, 1.0);
    }
    let s = a.cholesky()?.solve(&b);
    let radius = (s.z + s.x * s.x + s.y * s.y).max(0.0).sqrt();
    (radius.is_finite() && 0.0 < radius).then_some((mr + s.x * scale, mz + s.y * scale, radius * scale))
}

fn cylinder_start(points: &[Vec3], stands: &[Stand]) -> Option<Form> {
    let moment: Matrix3<f64> = stands.iter().map(|s| s.normal * s.normal.transpose()).sum();
    let axis = least_direction(moment);
    let middle = mean(points);
    let [u, v] = frame(&Form::Cylinder { through: middle, axis, radius: 1.0, sign: 1.0 });
    let flat: Vec<(f64, f64)> = points.iter().map(|p| ((p - middle).dot(&u), (p - middle).dot(&v))).collect();
    let (a, b, radius) = circle(&flat)?;
    let form = Form::Cylinder { through: middle + u * a + v * b, axis, radius, sign: 1.0 };
    is_sound(&form).then_some(form)
}

/// Cone whose facets' planes pass through the apex, with normals at one angle to the axis.
fn cone_start(points: &[Vec3], stands: &[Stand]) -> Option<Form> {
    let middle = mean(points);
    let n: Vec3 = stands.iter().map(|s| s.normal).sum::<Vec3>() / stands.len().max(1) as f64;
    let moment: Matrix3<f64> = stands.iter().map(|s| (s.normal - n) * (s.normal - n).transpose()).sum();
    let axis = least_direction(moment);
    let (mut a, mut b) = (Matrix3::zeros(), Vec3::zeros());
    for s in stands {
        a.ger(1.0, &s.normal, &s.normal, 1.0);
        b.axpy(s.normal.dot(&(s.centre - middle)), &s.normal, 1.0);
    }
    let apex = middle + a.lu().solve(&b)?;
    let axis = if axis.dot(&(middle - apex)) < 0.0 { -axis } else { axis };
    let (mut sum, mut count) = (0.0, 0.0);
    for p in points {
        let p = polar(p, &apex, &axis);
        if 0.0 < p.rho && p.height.is_finite() {
            sum += p.rho.atan2(p.height);
            count += 1.0;
        }
    }
    let form = Form::Cone { apex, axis, half_angle: sum / f64::max(count, 1.0), sign: 1.0 };
    is_sound(&form).then_some(form)
}

/// Torus about the axis that all normals meet.
///
/// A line through `p` along `n` meets the axis through `q` along `a` where `n·(q × a) + (p × n)·a = 0`:
/// linear in `a` and `q × a` (Pottmann, Wallner: Computational Line Geometry, 2001, chapter 3).
fn torus_start(points: &[Vec3], stands: &[Stand]) -> Option<Form> {
    let middle = mean(points);
    let scale = extent(points);
    let mut a = Matrix6::zeros();
    for s in stands {
        let m = ((s.centre - middle) / scale).cross(&s.normal);
        let n = &s.normal;
        let row = nalgebra::Vector6::new(m.x, m.y, m.z, n.x, n.y, n.z);
        a.ger(1.0, &row, &row, 1.0);
    }
    let eigen = SymmetricEigen::new(a);
    let least = eigen.eigenvectors.column(eigen.eigenvalues.imin());
    let direction = Vec3::new(least[0], least[1], least[2]);
    let moment = Vec3::new(least[3], least[4], least[5]);
    let axis = direction.try_normalize(1e-9)?;
    let through = middle + direction.cross(&moment) / direction.norm_squared() * scale;
    let profile: Vec<(f64, f64)> =
        points.iter().map(|p| polar(p, &through, &axis)).map(|p| (p.rho, p.height)).collect();
    let (major, height, minor) = circle(&profile)?;
    let form = Form::Torus { centre: through + axis * height, axis, major, minor, sign: 1.0 };
    is_sound(&form).then_some(form)
}
