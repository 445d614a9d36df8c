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

/// What bending alone puts into η, over the change of charge by the height that a flat panel does not follow [1].
///
/// A flat panel of a bent surface meets its neighbours at an angle, and the residual knows it; the mean height
/// mends most of that.  Over 45 meshes of spheres (regular, jittered, meridians, slivers, alone, in gaps, over
/// planes) Σ|η| was 0.052 to 0.056 of that change with errors of about 0.017, which
/// [`faceting::BULGE_SHARE`] covers (`cargo bench --bench calibration`).
const BENT: f64 = 0.045;

/// Least share of η that is kept on a bent panel [1].
const KEPT: f64 = 0.25;

/// Share of the rim correction of sheets that enters the bar [1].
///
/// K comes from the panels at the rim, whose charge is off by up to a tenth.
const RIM_SHARE: f64 = 0.3;

/// Relative rounding that enters every bar, per inverse of the pivot ratio, in units of 2⁻⁵² [1].
const ROUNDING: f64 = 10.0;

/// A solved round.
///
/// Charges and capacitances are those of electrodes with their copies across even mirrors; densities and
/// residuals those of the panels.
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
    /// Distance of each panel to another conductor or a plane at 0 V, where under its length [m].
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
    // Electrodes hold the charge of their copies across even mirrors, too.
    let eps_whole = eps_r * panels.images.whole_over_part();
    let capacitance = capacitance::corrected(&panels, &charges, &residuals, eps_whole);
    let gaps = gap::gaps(&panels);
    let estimate = estimate::estimate(&panels, &residuals, &gaps, eps_whole);
    let rims = rim::rims(&panels, &charges);
    let (n, eps) = (panels.n_rows, permittivity(eps_whole));
    let gain = |i: usize, j: usize| {
        let (u, v) = (unit_weight(i, n), unit_weight(j, n));
        eps * rims.change(&u, &v).0 + faceting::left(&panels, &charges, eps_whole, [&u, &v])
    };
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

    /// Permittivity times the count of copies of the drawn part in the whole, itself included [F/m]: from
    /// `density × area` of the panels to the charge of electrodes with their copies across even mirrors.
    pub fn permittivity_of_whole(&self) -> f64 {
        permittivity(self.eps_whole())
    }

    fn eps_whole(&self) -> f64 {
        self.eps_r * self.panels.images.whole_over_part()
    }

    /// Bar of the combination `uᵀ C v`, by its own weights [F × units of u and v].
    pub fn bar(&self, u: &[f64], v: &[f64]) -> Bar {
        let (_, faceting) =
            faceting::change(&self.panels, &self.charges, &self.gaps, self.eps_whole(), [u, v]);
        let size = |i: usize, j: usize| (u[i] * self.matrix[i][j] * v[j]).abs();
        let magnitude: f64 = (0..u.len()).map(|i| (0..v.len()).map(|j| size(i, j)).sum::<f64>()).sum();
        Bar {
            discretisation: KAPPA * self.spread(u, v),
            faceting: faceting + RIM_SHARE * self.permittivity_of_whole() * self.rims.change(u, v).1,
            solver: ROUNDING * f64::EPSILON / self.charges.pivot_ratio * magnitude,
        }
    }

    /// `Σ_T |η_T|`, on bent panels without what their bending explains [F × units of u and v].
    fn spread(&self, u: &[f64], v: &[f64]) -> f64 {
        let field =
            |w: &[f64], p: usize| -> f64 { w.iter().zip(&self.charges.density).map(|(w, s)| w * s[p]).sum() };
        let eps = self.permittivity_of_whole();
        let of_panel = |p: usize| {
            let eta = self.estimate.eta(u, v, p);
            let eta = (eta.mean + eta.variation).abs();
            let own = self.panels.offset[p].abs();
            if own <= 0.0 {
                return eta;
            }
            let lift = eps * own * self.panels.triangles[p].area() * (field(u, p) * field(v, p)).abs();
            (eta - BENT * lift).max(KEPT * eta)
        };
        (0..self.panels.len()).map(of_panel).sum()
    }

    /// First-order share of the facets and of straight rims in `uᵀ C v`: rebuilt minus flat [F × units of u
    /// and v].
    pub fn faceting(&self, u: &[f64], v: &[f64]) -> f64 {
        let facets = faceting::change(&self.panels, &self.charges, &self.gaps, self.eps_whole(), [u, v]).0;
        facets + self.permittivity_of_whole() * self.rims.change(u, v).0
    }

    /// Bars of the matrix entries and of the row sums [F].
    pub fn bars(&self) -> (Vec<Vec<Bar>>, Vec<Bar>) {
        let n = self.n_rows();
        let ones = vec![1.0; n];
        let row = |i: usize| -> Vec<Bar> {
            (0..n).map(|j| self.bar(&unit_weight(i, n), &unit_weight(j, n))).collect()
        };
        let first = self.panels.first_rows();
        let (mut entries, mut earth) = (vec![vec![Bar::default(); n]; n], vec![Bar::default(); n]);
        for i in first {
            entries[i] = row(i);
            earth[i] = self.bar(&unit_weight(i, n), &ones);
        }
        (self.panels.turned_entries(entries), self.panels.turned_rows(earth))
    }
}
