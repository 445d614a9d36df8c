//! Panels as seen from a point: far ones by moments, near ones by the closed form.

use crate::base::Plane;
use crate::base::Vec3;
use crate::kernel::far::Moments;
use crate::kernel::triangle::Prepared;
use crate::panel::Panels;

/// All panels, ready to be summed.
#[derive(Clone, Debug)]
pub struct Sources {
    moments: Moments,
    near: Vec<Prepared>,
    plane: Option<Plane>,
}

impl Sources {
    /// Prepares the moments and edges of all panels.
    pub fn build(panels: &Panels) -> Self {
        Sources {
            moments: Moments::build(&panels.triangles),
            near: panels.triangles.iter().map(Prepared::new).collect(),
            plane: panels.plane,
        }
    }

    /// Length of the work space for [`Sources::add_potentials`].
    pub fn scratch(&self) -> Vec<f64> {
        vec![0.0; self.moments.padded()]
    }

    /// Adds `weight · ∫dS/r` of every panel as seen from `x` to `out`, its image at the earth plane
    /// subtracted [m].
    ///
    /// `|x − y'| = |x' − y|` for mirror points, so the image is the panel seen from `x` mirrored.
    pub fn add_potentials(&self, x: &Vec3, weight: f64, out: &mut [f64], scratch: &mut [f64]) {
        self.add_direct(x, weight, out, scratch);
        if let Some(plane) = &self.plane {
            self.add_direct(&plane.mirror(x), -weight, out, scratch);
        }
    }

    fn add_direct(&self, x: &Vec3, weight: f64, out: &mut [f64], scratch: &mut [f64]) {
        self.moments.potentials(x, scratch);
        for ((out, far), near) in out.iter_mut().zip(scratch).zip(&self.near) {
            *out += weight * if far.is_nan() { near.potential(x) } else { *far };
        }
    }

    /// Gradient at `x` of `Σ_p density_p ∫_p dS/r`, image subtracted, for every set of densities
    /// [unit of density].
    pub fn gradients(&self, x: &Vec3, densities: &[&[f64]]) -> Vec<Vec3> {
        let mut sums = vec![Vec3::zeros(); densities.len()];
        for (p, near) in self.near.iter().enumerate() {
            let mut g = near.gradient(x);
            if let Some(plane) = &self.plane {
                let mirrored = near.gradient(&plane.mirror(x));
                g -= mirrored - plane.facing * (2.0 * mirrored.dot(&plane.facing));
            }
            for (sum, density) in sums.iter_mut().zip(densities) {
                *sum += g * density[p];
            }
        }
        sums
    }
}
