//! One full round: unit charges, residuals, corrected matrix, and bars for any combination.

use crate::operator::Sources;
use crate::panel::Panels;
use crate::physics::capacitance;
use crate::physics::capacitance::Capacitance;
use crate::physics::capacitance::Matrix;
use crate::physics::estimate;
use crate::physics::estimate::Estimate;
use crate::physics::faceting;
use crate::physics::gap;
use crate::physics::permittivity;
use crate::physics::rim;
use crate::physics::rim::Rims;
use crate::physics::unit;
use crate::physics::unit::Residuals;
use crate::physics::unit::UnitCharges;
use crate::solve::direct::SolveError;

/// Factor from Σ|η| to the bar [1].
///
/// Without the steps at narrow gaps η was 0.6 to 4.4 times the error over cube, sheets and spheres (earth
/// entries 5 to 10); with them it is above 1 on every row of the reference table and on cubes down to
/// a gap of a 5,000th.  The earth entry of two plates bounds κ from above: 12 times the error are asked.
pub const KAPPA: f64 = 1.3;

/// Share of the rim correction of sheets that enters the bar [1].
///
/// K comes from the panels at the rim, whose charge is off by up to a tenth.
const RIM_SHARE: f64 = 0.3;

/// Relative rounding that enters every bar, per inverse of the pivot ratio, in units of 2⁻⁵² [1].
const ROUNDING: f64 = 10.0;

/// A solved round.
#[derive(Clone, Debug)]
pub struct Solved {
    /// The panels.
    pub panels: Panels,
    /// Relative permittivity of the surroundings [1].
    pub eps_r: f64,
    /// Unit charges.
    pub charges: UnitCharges,
    /// What they miss.
    pub residuals: Residuals,
    /// Weighted gradients of what they miss.
    pub estimate: Estimate,
    /// Distance of each panel to another conductor or the earth plane, where under its length [m].
    pub gaps: Vec<f64>,
    /// Round rims of sheets.
    pub rims: Rims,
    /// Before and after the residual correction.
    pub capacitance: Capacitance,
    /// After the correction, and with the round rims of sheets: the result [F].
    pub matrix: Matrix,
}

/// Parts of a bar.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Bar {
    /// Of the flat panels' solution [F × units of u and v].
    pub discretisation: f64,
    /// Of the faceting correction [F × units of u and v].
    pub faceting: f64,
    /// Of rounding [F × units of u and v].
    pub solver: f64,
}

impl Bar {
    /// The whole bar [F × units of u and v].
    pub fn total(&self) -> f64 {
        self.discretisation + self.faceting + self.solver
    }
}

/// Runs one round on frozen panels.
///
/// # Errors
/// Those of the factorisation.
pub fn solve(panels: Panels, eps_r: f64) -> Result<Solved, SolveError> {
    let sources = Sources::build(&panels);
    let charges = unit::solve(&panels, &sources)?;
    let residuals = unit::residuals(&panels, &sources, &charges);
    let capacitance = capacitance::corrected(&panels, &charges, &residuals, eps_r);
    let gaps = gap::gaps(&panels);
    let estimate = estimate::estimate(&panels, &residuals, &gaps, eps_r);
    let rims = rim::rims(&panels, &charges);
    let (n, eps) = (panels.n_rows, permittivity(eps_r));
    let gain = |i: usize, j: usize| eps * rims.change(&unit_weight(i, n), &unit_weight(j, n)).0;
    let entry = |i: usize, j: usize| capacitance.corrected[i][j] + gain(i, j);
    let matrix = (0..n).map(|i| (0..n).map(|j| entry(i, j)).collect()).collect();
    Ok(Solved { panels, eps_r, charges, residuals, estimate, gaps, rims, capacitance, matrix })
}

/// Weight 1 on row `i`, 0 elsewhere.
pub fn unit_weight(i: usize, n_rows: usize) -> Vec<f64> {
    (0..n_rows).map(|k| if k == i { 1.0 } else { 0.0 }).collect()
}

impl Solved {
    /// Count of rows.
    pub fn n_rows(&self) -> usize {
        self.panels.n_rows
    }

    /// Bar of the combination `uᵀ C v`, by its own weights [F × units of u and v].
    pub fn bar(&self, u: &[f64], v: &[f64]) -> Bar {
        let (_, faceting) = faceting::change(&self.panels, &self.charges, &self.gaps, self.eps_r, [u, v]);
        let size = |i: usize, j: usize| (u[i] * self.matrix[i][j] * v[j]).abs();
        let magnitude: f64 = (0..u.len()).map(|i| (0..v.len()).map(|j| size(i, j)).sum::<f64>()).sum();
        Bar {
            discretisation: KAPPA * self.estimate.total(u, v),
            faceting: faceting + RIM_SHARE * permittivity(self.eps_r) * self.rims.change(u, v).1,
            solver: ROUNDING * f64::EPSILON / self.charges.pivot_ratio * magnitude,
        }
    }

    /// First-order share of the facets and of straight rims in `uᵀ C v`: rebuilt minus flat [F × units of u
    /// and v].
    pub fn faceting(&self, u: &[f64], v: &[f64]) -> f64 {
        let facets = faceting::change(&self.panels, &self.charges, &self.gaps, self.eps_r, [u, v]).0;
        facets + permittivity(self.eps_r) * self.rims.change(u, v).0
    }

    /// Bars of the matrix entries and of the row sums [F].
    pub fn bars(&self) -> (Vec<Vec<Bar>>, Vec<Bar>) {
        let n = self.n_rows();
        let ones = vec![1.0; n];
        let row = |i: usize| -> Vec<Bar> {
            (0..n).map(|j| self.bar(&unit_weight(i, n), &unit_weight(j, n))).collect()
        };
        ((0..n).map(row).collect(), (0..n).map(|i| self.bar(&unit_weight(i, n), &ones)).collect())
    }
}
