//! Facets in file units to facets in metres, moved into place.

use crate::base::Vec3;
use nalgebra::Rotation3;
use nalgebra::Unit;

/// How the facets of a file become a body in place.
#[derive(Clone, Debug, PartialEq)]
pub struct Placing<'a> {
    /// Metres per file unit [m].
    pub unit: f64,
    /// Factor after the unit [1]; a negative one mirrors at the origin.
    pub scale: f64,
    /// Turns in order, about the origin: axis and right-handed angle [rad].
    pub rotations: &'a [(Vec3, f64)],
    /// Shift, last [m].
    pub shift: Vec3,
}

/// The facets scaled, then rotated, then shifted [m].
///
/// Mirroring keeps normals outward: the order of the corners is then reversed.  A turn about an
/// axis of length zero is none.
pub fn place(facets: &[[Vec3; 3]], placing: &Placing<'_>) -> Vec<[Vec3; 3]> {
    let factor = placing.unit * placing.scale;
    let turn = placing.rotations.iter().fold(None, |before: Option<Rotation3<f64>>, (axis, angle)| {
        let this = Unit::try_new(*axis, 0.0).map(|axis| Rotation3::from_axis_angle(&axis, *angle));
        match (before, this) {
            (Some(before), Some(this)) => Some(this * before),
            (one, other) => one.or(other),
        }
    });
    let moved = |x: &Vec3| {
        let scaled = x * factor;
        turn.map_or(scaled, |turn| turn * scaled) + placing.shift
    };
    facets
        .iter()
        .map(|[a, b, c]| {
            let (b, c) = if factor < 0.0 { (c, b) } else { (b, c) };
            [moved(a), moved(b), moved(c)]
        })
        .collect()
}
