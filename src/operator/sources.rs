//! Panels and their images as seen from many points.

use crate::base::Plane;
use crate::base::Vec3;
use crate::base::threads;
use crate::kernel::batch::Points;
use crate::kernel::batch::Source;
use crate::panel::Panels;

/// All panels, ready to be summed.
#[derive(Clone, Debug)]
pub struct Sources {
    panels: Vec<Source>,
    plane: Option<Plane>,
}

/// Points with their mirror points at the earth plane.
///
/// `|x − y'| = |x' − y|` for mirror points, so the image of a panel is the panel seen from `x` mirrored.
#[derive(Clone, Debug)]
pub(super) struct Targets {
    direct: Points,
    mirrored: Option<Points>,
}

impl Targets {
    pub(super) fn new(points: &[Vec3], plane: Option<&Plane>) -> Self {
        let mirrored = plane.map(|plane| Points::new(points.iter().map(|x| plane.mirror(x))));
        Targets { direct: Points::new(points.iter().copied()), mirrored }
    }

    /// Length of the work space of [`Sources::column`].
    pub(super) fn padded(&self) -> usize {
        self.direct.padded()
    }
}

/// Points treated at a time: their coordinates and sums stay in the nearest cache.
const BLOCK: usize = 512;

impl Sources {
    /// Prepares the moments and edges of all panels.
    pub fn build(panels: &Panels) -> Self {
        Sources { panels: panels.triangles.iter().map(Source::new).collect(), plane: panels.plane }
    }

    /// The earth plane.
    pub(super) fn plane(&self) -> Option<&Plane> {
        self.plane.as_ref()
    }

    /// Writes `∫dS/r` of panel `p`, its image subtracted, as seen from all targets [m].
    pub(super) fn column(&self, p: usize, targets: &Targets, out: &mut [f64], scratch: &mut [f64]) {
        self.panels[p].potentials(&targets.direct, out);
        if let Some(mirrored) = &targets.mirrored {
            self.panels[p].potentials(mirrored, scratch);
            out.iter_mut().zip(scratch).for_each(|(out, image)| *out -= *image);
        }
    }

    /// `sums[d][k] = Σ_p densities[d][p] ∫_p dS/r` at point `k`, images subtracted [m × unit of density].
    ///
    /// In parallel over blocks of points; every sum runs over the panels in their order.
    pub fn potentials(&self, points: &[Vec3], densities: &[Vec<f64>]) -> Vec<Vec<f64>> {
        let blocks: Vec<&[Vec3]> = points.chunks(BLOCK).collect();
        let by_block: Vec<Vec<Vec<f64>>> = threads::map(blocks.len(), |b| {
            let targets = Targets::new(blocks[b], self.plane());
            let (mut seen, mut scratch) = (vec![0.0; targets.padded()], vec![0.0; targets.padded()]);
            let mut sums = vec![vec![0.0; targets.padded()]; densities.len()];
            for p in 0..self.panels.len() {
                self.column(p, &targets, &mut seen, &mut scratch);
                for (sum, density) in sums.iter_mut().zip(densities) {
                    sum.iter_mut().zip(&seen).for_each(|(sum, seen)| *sum += density[p] * seen);
                }
            }
            sums.iter_mut().for_each(|sum| sum.truncate(blocks[b].len()));
            sums
        });
        (0..densities.len())
            .map(|d| by_block.iter().flat_map(|block| block[d].iter().copied()).collect())
            .collect()
    }

    /// Gradient at `x` of `Σ_p density_p ∫_p dS/r`, image subtracted [unit of density].
    pub fn gradient(&self, x: &Vec3, density: &[f64]) -> Vec3 {
        let mut sum = Vec3::zeros();
        for (source, density) in self.panels.iter().zip(density) {
            let mut g = source.exact().gradient(x);
            if let Some(plane) = &self.plane {
                let mirrored = source.exact().gradient(&plane.mirror(x));
                g -= mirrored - plane.facing * (2.0 * mirrored.dot(&plane.facing));
            }
            sum += g * *density;
        }
        sum
    }
}
