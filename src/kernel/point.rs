//! The point charge.

use crate::base::Vec3;

/// `1/r` [1/m]; infinite at the charge itself.
///
/// Relative error: 3 roundings, 4e-16.
pub fn potential(y: &Vec3, x: &Vec3) -> f64 {
    1.0 / (x - y).norm()
}

/// Gradient of `1/r` at `x`: `−(x − y)/r³` [1/m²].
///
/// Relative error 1e-15.
pub fn gradient(y: &Vec3, x: &Vec3) -> Vec3 {
    let d = x - y;
    let r = d.norm();
    -d / (r * r * r)
}
