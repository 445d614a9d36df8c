//! Which panels belong to which maximum of a body, and how much area stands high.

use crate::base::threads;
use crate::kernel::rules;
use crate::panel::Panels;
use crate::physics::patch;
use crate::physics::patch::Cell;
use crate::physics::patch::Patch;

/// Panels of a patch, at most.
pub(super) const PATCH: usize = 80;

/// Neighbours over which a path from one maximum to another leads.
const STEP: usize = 10;

/// A body ready for any field on it.
#[derive(Clone, Debug)]
pub(super) struct Ground {
    /// Its panels.
    pub(super) cells: Vec<Cell>,
    /// Nearest cells of each cell, itself first.
    near: Vec<Vec<u32>>,
    /// How their densities make the values at the six places of each cell; none where panels do not
    /// determine them [1].
    weights: Vec<Option<[Vec<f64>; 6]>>,
}

/// The ground of the panels `held`.
pub(super) fn ground(panels: &Panels, held: &[usize]) -> Ground {
    let cells = patch::cells(panels, held);
    let of_cell = threads::map(cells.len(), |k| {
        let patch = Patch::new(&cells, [cells[k].middle, cells[k].normal], PATCH);
        let weights = patch::weights_at(&cells, &patch, k);
        let used = weights.as_ref().map_or(0, |w| w[0].len()).max(STEP + 1).min(patch.near.len());
        (patch.near[..used].iter().map(|(_, q)| *q as u32).collect(), weights)
    });
    let (near, weights) = of_cell.into_iter().unzip();
    Ground { cells, near, weights }
}

/// A field on a body, smoothed.
#[derive(Clone, Debug)]
pub(super) struct Smoothed {
    /// At the six places of each cell [V/m].
    places: Vec<[f64; 6]>,
    /// Mean over each cell [V/m].
    pub(super) means: Vec<f64>,
}

impl Ground {
    /// The quadratics through `field[panel]` [V/m].
    pub(super) fn smoothed(&self, field: &[f64]) -> Smoothed {
        let own = |k: usize| field[self.cells[k].panel] * self.cells[k].ratio;
        let at = |k: usize| match &self.weights[k] {
            None => [own(k); 6],
            Some(weights) => {
                let around = || self.near[k].iter().map(|q| own(*q as usize));
                // A fit out of what its panels hold extrapolates.
                let top = around().fold(0.0, f64::max);
                let value = |w: &Vec<f64>| w.iter().zip(around()).map(|(w, f)| w * f).sum::<f64>();
                [0, 1, 2, 3, 4, 5].map(|q| value(&weights[q]).clamp(0.0, TOP * top))
            }
        };
        let places: Vec<[f64; 6]> = (0..self.cells.len()).map(at).collect();
        let mean = |six: &[f64; 6]| six.iter().zip(rules::SIX).map(|(f, (_, w))| f * w).sum();
        Smoothed { means: places.iter().map(mean).collect(), places }
    }

    /// Area where the smoothed field is at least `level` [m²].
    pub(super) fn area_above(&self, smoothed: &Smoothed, level: f64) -> f64 {
        let share = |six: &[f64; 6]| -> f64 {
            six.iter().zip(rules::SIX).filter(|(f, _)| level <= **f).map(|(_, (_, w))| w).sum()
        };
        self.cells.iter().zip(&smoothed.places).map(|(cell, six)| cell.area * share(six)).sum()
    }

    /// Charge over area of the panel where that is highest; a panel smaller than half of those around it counts
    /// together with its nearest until they are as large [V/m].
    pub(super) fn raw(&self, field: &[f64]) -> f64 {
        let robust = |k: usize| {
            let near = &self.near[k][..(STEP + 1).min(self.near[k].len())];
            let area = |q: &u32| self.cells[*q as usize].area;
            let enough = SLIVER * near.iter().map(area).sum::<f64>() / near.len().max(1) as f64;
            let (mut charge, mut held) = (0.0, 0.0);
            for q in near {
                let cell = &self.cells[*q as usize];
                (charge, held) = (charge + field[cell.panel] * cell.ratio * cell.area, held + cell.area);
                if enough <= held {
                    break;
                }
            }
            charge / held
        };
        (0..self.cells.len()).map(robust).fold(0.0, f64::max)
    }

    /// Groups of cells round separate maxima, each with its cells from the highest down, the highest
    /// maximum first.
    ///
    /// Cells join in falling order; two groups that meet stay apart if the lower top stands out of the pass
    /// between them by [`SADDLE`], or by [`FAR_SADDLE`] over a distance of [`FAR`] of the body's size.
    pub(super) fn maxima(&self, smoothed: &Smoothed) -> Vec<Vec<usize>> {
        let n = self.cells.len();
        let f = &smoothed.means;
        let mut order: Vec<usize> = (0..n).collect();
        order.sort_by(|a, b| f[*b].total_cmp(&f[*a]).then(a.cmp(b)));
        let far = FAR * self.size();
        let mut links = vec![Vec::new(); n];
        for k in 0..n {
            for q in self.near[k].iter().skip(1).take(STEP) {
                links[k].push(*q as usize);
                links[*q as usize].push(k);
            }
        }
        // `group[k]`: index into `groups`; `into[g]`: the group that took it in.
        let mut group = vec![usize::MAX; n];
        let mut groups: Vec<Vec<usize>> = Vec::new();
        let mut into: Vec<usize> = Vec::new();
        for k in order {
            let mut met: Vec<usize> = links[k]
                .iter()
                .filter(|q| group[**q] != usize::MAX)
                .map(|q| root(&into, group[*q]))
                .collect();
            met.sort_unstable();
            met.dedup();
            // Groups are numbered from the highest top down.
            let Some(first) = met.first().copied() else {
                group[k] = groups.len();
                into.push(groups.len());
                groups.push(vec![k]);
                continue;
            };
            group[k] = first;
            groups[first].push(k);
            for other in &met[1..] {
                let (top, high) = (groups[*other][0], groups[first][0]);
                let apart = (self.cells[top].middle - self.cells[high].middle).norm();
                let separate = f[k] < SADDLE * f[top] || (far < apart && f[k] < FAR_SADDLE * f[top]);
                if !separate {
                    into[*other] = first;
                    let taken = std::mem::take(&mut groups[*other]);
                    groups[first].extend(taken);
                }
            }
        }
        let mut kept: Vec<Vec<usize>> = groups.into_iter().filter(|held| !held.is_empty()).collect();
        kept.iter_mut().for_each(|held| held.sort_by(|a, b| f[*b].total_cmp(&f[*a]).then(a.cmp(b))));
        kept
    }

    /// Largest extent of the body [m].
    fn size(&self) -> f64 {
        let (mut lo, mut hi) = ([f64::INFINITY; 3], [f64::NEG_INFINITY; 3]);
        for cell in &self.cells {
            for k in 0..3 {
                (lo[k], hi[k]) = (lo[k].min(cell.middle[k]), hi[k].max(cell.middle[k]));
            }
        }
        (0..3).map(|k| hi[k] - lo[k]).fold(0.0, f64::max)
    }
}

fn root(into: &[usize], mut group: usize) -> usize {
    while into[group] != group {
        group = into[group];
    }
    group
}

/// Highest smoothed value over the highest panel of its patch [1].
const TOP: f64 = 1.2;

/// Area of a panel over the mean around it under which its own value is not taken alone [1].
///
/// Needles of a flat cap hold a hundredth of the area around them and were off by 70 %.
const SLIVER: f64 = 0.5;

/// Pass between two maxima over the lower one under which they are separate [1].
const SADDLE: f64 = 0.9;

/// The same for maxima that stand [`FAR`] of the body's size apart [1]: wider than the scatter of
/// irregular panels on a body of even field.
const FAR_SADDLE: f64 = 0.97;
const FAR: f64 = 0.25;
