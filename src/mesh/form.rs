//! Planes, spheres, cylinders, cones and tori: foot points, normals and curvatures.

use crate::base::Vec3;

/// What a smooth patch is.
///
/// `sign` is +1 where the normal out of the metal points away from the centre, the axis or the tube's
/// middle line (a ball, a rod, a bead), −1 where it points towards it (a hole, a bowl, a groove).
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Form {
    /// A flat.
    Plane {
        /// A point of it [m].
        through: Vec3,
        /// Unit normal out of the metal [1].
        normal: Vec3,
    },
    /// A part of a sphere.
    Sphere {
        /// Centre [m].
        centre: Vec3,
        /// Radius [m].
        radius: f64,
        /// +1 for a ball, −1 for a hollow [1].
        sign: f64,
    },
    /// A part of a circular cylinder.
    Cylinder {
        /// A point of the axis [m].
        through: Vec3,
        /// Unit vector along the axis [1].
        axis: Vec3,
        /// Radius [m].
        radius: f64,
        /// +1 for a rod, −1 for a bore [1].
        sign: f64,
    },
    /// A part of a circular cone.
    Cone {
        /// Apex [m].
        apex: Vec3,
        /// Unit vector along the axis, from the apex into the cone [1].
        axis: Vec3,
        /// Angle between axis and generators [rad].
        half_angle: f64,
        /// +1 for a cone of metal, −1 for a countersink [1].
        sign: f64,
    },
    /// A part of a torus.
    Torus {
        /// Centre [m].
        centre: Vec3,
        /// Unit vector along the axis [1].
        axis: Vec3,
        /// Radius of the middle line of the tube [m].
        major: f64,
        /// Radius of the tube [m].
        minor: f64,
        /// +1 for a ring of metal, −1 for a groove [1].
        sign: f64,
    },
    /// None of these.
    Free,
}

/// Place of a point with respect to an axis.
pub(super) struct Polar {
    /// Height along the axis [m].
    pub(super) height: f64,
    /// Distance from the axis [m].
    pub(super) rho: f64,
    /// Unit vector away from the axis; zero on it [1].
    pub(super) away: Vec3,
}

/// Height, distance and direction of `x` from the axis through `origin` [m].
pub(super) fn polar(x: &Vec3, origin: &Vec3, axis: &Vec3) -> Polar {
    let q = x - origin;
    let height = q.dot(axis);
    let across = q - axis * height;
    let rho = across.norm();
    let away = if 0.0 < rho { across / rho } else { Vec3::zeros() };
    Polar { height, rho, away }
}

impl Form {
    /// Nearest point of the form to `x` [m] and the unit normal there, out of the metal.
    ///
    /// None for `Free`, and where the nearest point or the normal is not unique: at a centre, on an
    /// axis, behind an apex.
    pub fn nearest(&self, x: &Vec3) -> Option<(Vec3, Vec3)> {
        match *self {
            Form::Plane { through, normal } => Some((x - normal * (x - through).dot(&normal), normal)),
            Form::Sphere { centre, radius, sign } => {
                let away = (x - centre).try_normalize(0.0)?;
                Some((centre + away * radius, away * sign))
            }
            Form::Cylinder { through, axis, radius, sign } => {
                let p = polar(x, &through, &axis);
                (0.0 < p.rho).then(|| (through + axis * p.height + p.away * radius, p.away * sign))
            }
            Form::Cone { apex, axis, half_angle, sign } => {
                let p = polar(x, &apex, &axis);
                let (sin, cos) = half_angle.sin_cos();
                let along = p.height * cos + p.rho * sin;
                let foot = apex + (axis * cos + p.away * sin) * along;
                (0.0 < p.rho && 0.0 < along).then(|| (foot, (p.away * cos - axis * sin) * sign))
            }
            Form::Torus { centre, axis, major, minor, sign } => {
                let p = polar(x, &centre, &axis);
                let middle = centre + p.away * major;
                let away = (x - middle).try_normalize(0.0)?;
                (0.0 < p.rho).then(|| (middle + away * minor, away * sign))
            }
            Form::Free => None,
        }
    }

    /// Principal curvatures [1/m] at the point of the form next to `x`, positive where the metal bulges
    /// out; for cylinder and cone the first goes around and the second, zero, along; for a torus the
    /// first goes around the tube and the second around the axis.
    ///
    /// Zeros for `Plane` and `Free`, and where the nearest point is not unique.
    pub fn curvatures(&self, x: &Vec3) -> [f64; 2] {
        match *self {
            Form::Plane { .. } | Form::Free => [0.0, 0.0],
            Form::Sphere { radius, sign, .. } => [sign / radius; 2],
            Form::Cylinder { radius, sign, .. } => [sign / radius, 0.0],
            Form::Cone { apex, axis, half_angle, sign } => {
                let p = polar(x, &apex, &axis);
                let (sin, cos) = half_angle.sin_cos();
                let rho = (p.height * cos + p.rho * sin) * sin;
                [if 0.0 < rho { sign * cos / rho } else { 0.0 }, 0.0]
            }
            Form::Torus { centre, axis, major, minor, sign } => {
                let p = polar(x, &centre, &axis);
                let out = p.rho - major;
                let tube = out.hypot(p.height);
                let cos = if 0.0 < tube { out / tube } else { 0.0 };
                let rho = major + minor * cos;
                [sign / minor, if 0.0 < rho.abs() { sign * cos / rho } else { 0.0 }]
            }
        }
    }

    /// Signed distance of `x` from the form, positive away from centre, axis or tube [m]; infinite for
    /// `Free`.
    pub fn distance(&self, x: &Vec3) -> f64 {
        match *self {
            Form::Plane { through, normal } => (x - through).dot(&normal),
            Form::Sphere { centre, radius, .. } => (x - centre).norm() - radius,
            Form::Cylinder { through, axis, radius, .. } => polar(x, &through, &axis).rho - radius,
            Form::Cone { apex, axis, half_angle, .. } => {
                let p = polar(x, &apex, &axis);
                let (sin, cos) = half_angle.sin_cos();
                if p.height * cos + p.rho * sin < 0.0 {
                    (x - apex).norm()
                } else {
                    p.rho * cos - p.height * sin
                }
            }
            Form::Torus { centre, axis, major, minor, .. } => {
                let p = polar(x, &centre, &axis);
                (p.rho - major).hypot(p.height) - minor
            }
            Form::Free => f64::INFINITY,
        }
    }

    /// The same form with the normal on the other side if `sign` is negative.
    pub(super) fn with_sign(self, to: f64) -> Form {
        let to = if to < 0.0 { -1.0 } else { 1.0 };
        match self {
            Form::Sphere { centre, radius, .. } => Form::Sphere { centre, radius, sign: to },
            Form::Cylinder { through, axis, radius, .. } => {
                Form::Cylinder { through, axis, radius, sign: to }
            }
            Form::Cone { apex, axis, half_angle, .. } => Form::Cone { apex, axis, half_angle, sign: to },
            Form::Torus { centre, axis, major, minor, .. } => {
                Form::Torus { centre, axis, major, minor, sign: to }
            }
            flat => flat,
        }
    }

    /// Rank by simplicity, the simplest first; a zone between two circles is a cone before it is a
    /// sphere.
    pub(super) fn rank(&self) -> u8 {
        match self {
            Form::Plane { .. } => 0,
            Form::Cylinder { .. } => 1,
            Form::Cone { .. } => 2,
            Form::Sphere { .. } => 3,
            Form::Torus { .. } => 4,
            Form::Free => 5,
        }
    }
}
