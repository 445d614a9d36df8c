//! Integrals of 1/r and of its gradient over points, segments and flat triangles.
//!
//! In: shapes and observation points [m].  Out: geometry only; no charge, no permittivity.
//! Not here: which panels count as near (`operator`), images (the caller mirrors the point).
//! Symbols: as in the crate's table; gradients are taken at the observation point `x`.
//! References: van Oosterom, Strackee, IEEE Trans. Biomed. Eng. 30 (1983) 125; Wilton et al.,
//! IEEE Trans. Antennas Propag. 32 (1984) 276; Dunavant, Int. J. Numer. Methods Eng. 21 (1985) 1129.
//!
//! ```
//! use amberskin::base::Vec3;
//! use amberskin::kernel::segment;
//! // A rod of length 2 seen from its perpendicular bisector at distance 1: 2·asinh(1).
//! let (a, b) = (Vec3::new(0.0, 0.0, -1.0), Vec3::new(0.0, 0.0, 1.0));
//! let v = segment::potential(&a, &b, &Vec3::new(1.0, 0.0, 0.0));
//! assert!((v - 2.0 * 1.0_f64.asinh()).abs() < 1e-15);
//! ```

pub mod batch;
mod elementary;
pub mod far;
mod lanes;
pub mod point;
pub mod rules;
pub mod segment;
mod sliver;
pub mod triangle;
mod wide;
