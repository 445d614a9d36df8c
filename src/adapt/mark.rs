//! Which panels to cut, and how far the demand is reached.

use crate::base::threads;
use crate::physics::estimate::Estimate;
use crate::physics::solved::Bar;
use crate::physics::solved::Solved;
use crate::physics::solved::unit_weight;

/// What is asked of capacitances.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Demand {
    /// Relative bar: on every diagonal entry, on mutual and earth entries over [`FLOOR`], and for
    /// smaller ones absolute at that floor [1].
    pub capacitance: f64,
}

/// Share of √(C_ii C_jj), or of C_ii for earth entries, under which an entry is held to an absolute
/// bar only [1].
pub(super) const FLOOR: f64 = 0.01;

/// Share of the sum of indicators that the marked panels carry [1] (DESIGN 3.4).
const BULK: f64 = 0.6;

/// Least share of panels cut in a round [1].
///
/// At 0.1, 0.15, 0.2 and 0.3, bar of the cube at 6,500 panels 3.5e-5, 3.5e-5, 4.2e-5, 4.1e-5; of a square sheet at
/// 1,500 2.3e-4, 2.7e-4, 2.8e-4, 4.8e-4; of the earth entry of two plates at 2,500 1.6e-3, 1.2e-3, 1.8e-3, 1.8e-3.
const MIN_GROWTH: f64 = 0.15;

/// Weight of the variation η̃ in the indicator [1] (DESIGN 3.4: without it ridges are never cut, with
/// weight 1 the cube needs five times the error at 1,300 panels).
const VARIATION_WEIGHT: f64 = 0.2;

/// Magnitude to which the bar of mutual entry (i, j) or, for `None`, of earth entry i relates [F].
pub fn scale(matrix: &[Vec<f64>], i: usize, j: Option<usize>) -> f64 {
    match j {
        Some(j) => matrix[i][j].abs().max(FLOOR * (matrix[i][i] * matrix[j][j]).max(0.0).sqrt()),
        None => matrix[i].iter().sum::<f64>().abs().max(FLOOR * matrix[i][i].abs()),
    }
}

/// Whether mutual entry (i, j) or earth entry i is over the floor, and so under the relative demand.
pub fn over_floor(matrix: &[Vec<f64>], i: usize, j: Option<usize>) -> bool {
    let entry = j.map_or_else(|| matrix[i].iter().sum::<f64>(), |j| matrix[i][j]);
    scale(matrix, i, j) <= entry.abs()
}

/// Largest bar over its scale, among all entries and row sums [1].
pub fn reached(matrix: &[Vec<f64>], bars: &(Vec<Vec<Bar>>, Vec<Bar>)) -> f64 {
    let n = matrix.len();
    let mut worst = 0.0_f64;
    // `max` would pass over what is not a number.
    let mut take = |ratio: f64| worst = if ratio.is_nan() { f64::INFINITY } else { worst.max(ratio) };
    for i in 0..n {
        for j in 0..n {
            take(bars.0[i][j].total() / scale(matrix, i, Some(j)));
        }
        take(bars.1[i].total() / scale(matrix, i, None));
    }
    worst
}

/// Cuts for the next round: the panels that carry [`BULK`] of the indicators, at most `room` of them,
/// each along its steepest edge.
pub(super) fn cuts(solved: &Solved, room: usize) -> Vec<(usize, usize)> {
    let indicators = indicators(solved);
    let mut order: Vec<usize> = (0..indicators.len()).collect();
    order.sort_by(|a, b| indicators[*b].total_cmp(&indicators[*a]).then(a.cmp(b)));
    let total: f64 = indicators.iter().sum();
    let mut carried = 0.0;
    let mut marked: Vec<usize> = Vec::new();
    for p in order {
        let grown = MIN_GROWTH * indicators.len() as f64 <= marked.len() as f64;
        if (grown && BULK * total <= carried) || room <= marked.len() {
            break;
        }
        carried += indicators[p];
        marked.push(p);
    }
    marked.sort_unstable();
    let weight: Vec<f64> = (0..solved.n_rows()).map(|i| 1.0 / solved.matrix[i][i].abs().sqrt()).collect();
    let edge = |p: usize| Estimate::steepest_edge(&solved.panels, &solved.residuals, &weight, p);
    marked.into_iter().map(|p| (p, edge(p))).collect()
}

/// Share of every panel in the bars, each relative to what is allowed [1].
fn indicators(solved: &Solved) -> Vec<f64> {
    let n = solved.n_rows();
    let ones = vec![1.0; n];
    let weights: Vec<Vec<f64>> = (0..n).map(|i| unit_weight(i, n)).collect();
    threads::map(solved.panels.len(), |p| {
        let size = |u: &[f64], v: &[f64]| {
            let eta = solved.estimate.eta(u, v, p);
            eta.mean.abs() + VARIATION_WEIGHT * eta.variation.abs()
        };
        (0..n)
            .map(|i| {
                let diagonal = size(&weights[i], &weights[i]) / scale(&solved.matrix, i, Some(i));
                let earth = size(&weights[i], &ones) / scale(&solved.matrix, i, None);
                diagonal + if 1 < n { earth } else { 0.0 }
            })
            .sum()
    })
}
