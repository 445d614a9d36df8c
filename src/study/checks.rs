//! Laws that every result must obey, held against the bars (DESIGN 7).

use crate::base::Vec3;
use crate::geom::Triangle;
use crate::kernel::rules;
use crate::mesh::shells;
use crate::mesh::weld;
use crate::physics;
use crate::physics::solved::Solved;
use crate::record::Check;
use crate::record::VoltageCase;
use nalgebra::DMatrix;
use std::f64::consts::PI;

/// All checks, each with its value and limit.
pub(super) fn checks(
    solved: &Solved,
    bars: &[Vec<f64>],
    earth_bars: &[f64],
    inverse: &[Vec<f64>],
    cases: &[VoltageCase],
) -> Vec<Check> {
    let c = &solved.matrix;
    let n = c.len();
    let pairs = || (0..n).flat_map(|i| (0..n).map(move |j| (i, j)));
    let relative = |i: usize, j: usize| bars[i][j] / (c[i][i] * c[j][j]).abs().sqrt();
    let worst = |values: &mut dyn Iterator<Item = f64>| values.fold(0.0_f64, larger);
    let most_bar = worst(&mut pairs().map(|(i, j)| relative(i, j)));
    let mut found = vec![
        check(
            "off-diagonal entries above zero, over their bars [1]",
            worst(&mut pairs().filter(|(i, j)| i != j).map(|(i, j)| c[i][j] / bars[i][j])),
            1.0,
        ),
        check("diagonal entries below zero [count]", (0..n).filter(|i| c[*i][*i] <= 0.0).count() as f64, 0.0),
        check(
            "asymmetry before the correction, over √(C_ii C_jj) [1]",
            worst(&mut pairs().map(|(i, j)| asymmetry(solved, i, j))),
            ASYMMETRY + most_bar,
        ),
        check(
            "row sums below zero, over their bars [1]",
            worst(&mut (0..n).map(|i| -c[i].iter().sum::<f64>() / earth_bars[i])),
            1.0,
        ),
        check("eigenvalues of the matrix that are not positive [count]", not_positive(c), 0.0),
        check(
            "potential coefficients below zero, over the largest [1]",
            worst(&mut pairs().map(|(i, j)| -inverse[i][j]))
                / worst(&mut pairs().map(|(i, j)| inverse[i][j])),
            most_bar,
        ),
        check(
            "charge against energy functional, over C_ii [1]",
            worst(&mut (0..n).map(|i| {
                (solved.capacitance.raw[i][i] - solved.capacitance.corrected[i][i]).abs() / c[i][i]
            })),
            CORRECTION + CORRECTION_IN_BARS * most_bar,
        ),
        check(
            "mean potential error between collocation points [V per V]",
            mean_residual(solved),
            RESIDUAL + most_bar,
        ),
        check(
            "charge of the wrong sign at unit potentials, over C_jj [1]",
            wrong_sign(solved),
            WRONG_SIGN + most_bar,
        ),
    ];
    found.extend(volume_checks(solved, earth_bars));
    found.extend(cases.iter().map(|case| energy_check(solved, case)));
    found
}

/// Asymmetry allowed beside the bar [1]: averaged testing leaves 2e-5 on two plates (DESIGN 3.3), coarse
/// panels up to a hundred times more.
const ASYMMETRY: f64 = 2e-3;

/// Correction allowed beside the bars [1], and in bars: on coarse panels it is as large as the error.
const CORRECTION: f64 = 1e-3;
const CORRECTION_IN_BARS: f64 = 3.0;

/// Area-weighted mean of |residual| allowed [V per V]: 96 panels on a cube leave 0.01.
const RESIDUAL: f64 = 0.05;

/// Charge of the wrong sign allowed beside the bar [1].
///
/// At concave seams the density tends to zero and steps of constant density cross it: 3.5e-3 on bonded balls
/// and rod, 1.1e-2 on a cube in a box, both with right capacitances; a wrong sign of an image gives 0.1 and more.
const WRONG_SIGN: f64 = 0.03;

/// The larger of two numbers, or not-a-number if one is none.
fn larger(a: f64, b: f64) -> f64 {
    if a.is_nan() || b.is_nan() { f64::NAN } else { a.max(b) }
}

fn check(name: &str, value: f64, limit: f64) -> Check {
    // A value that is not a number must not pass, nor be stored.
    let value = if value.is_finite() { value } else { f64::MAX };
    Check { name: name.to_owned(), value, limit, pass: value <= limit }
}

fn asymmetry(solved: &Solved, i: usize, j: usize) -> f64 {
    let (raw, c) = (&solved.capacitance.raw, &solved.matrix);
    (raw[i][j] - raw[j][i]).abs() / (c[i][i] * c[j][j]).abs().sqrt()
}

fn not_positive(c: &[Vec<f64>]) -> f64 {
    let m = DMatrix::from_fn(c.len(), c.len(), |i, j| c[i][j]);
    m.symmetric_eigenvalues().iter().filter(|value| value.is_nan() || **value <= 0.0).count() as f64
}

fn mean_residual(solved: &Solved) -> f64 {
    let areas: Vec<f64> = solved.panels.triangles.iter().map(Triangle::area).collect();
    let total: f64 = areas.iter().sum();
    let of_row = |row: &Vec<[f64; 6]>| {
        let mean = |r: &[f64; 6]| r.iter().zip(rules::SIX).map(|(r, (_, w))| w * r.abs()).sum::<f64>();
        row.iter().zip(&areas).map(|(r, area)| area * mean(r)).sum::<f64>() / total
    };
    solved.residuals.at.iter().map(of_row).fold(0.0, larger)
}

/// Maximum principle: at 1 V on row j and 0 V elsewhere, charge is positive on j and negative elsewhere.
fn wrong_sign(solved: &Solved) -> f64 {
    let panels = &solved.panels;
    let of_row = |j: usize| {
        let density = &solved.charges.density[j];
        let sign = |p: usize| if panels.row(p) == Some(j) { 1.0 } else { -1.0 };
        let wrong = |p: usize| (-sign(p) * density[p]).max(0.0) * panels.triangles[p].area();
        let total: f64 = (0..panels.len()).map(wrong).sum();
        total * physics::permittivity(solved.eps_r) / solved.matrix[j][j]
    };
    (0..solved.n_rows()).map(of_row).fold(0.0, larger)
}

/// All rows together hold at least the capacitance of the ball of equal volume as the largest body
/// (Pólya and Szegő, Isoperimetric Inequalities in Mathematical Physics, 1951), and without an earth
/// plane at most that of a ball around everything.
fn volume_checks(solved: &Solved, earth_bars: &[f64]) -> Vec<Check> {
    let panels = &solved.panels;
    let unit = 4.0 * PI * physics::permittivity(solved.eps_r);
    let total: f64 = solved.matrix.iter().flatten().sum();
    let bar: f64 = earth_bars.iter().sum::<f64>() / total;
    let volume = |body: &crate::mesh::Body| {
        if body.surface.sheet { 0.0 } else { shells::volume(&body.surface.welded) }
    };
    let in_row = |k: usize| panels.assembly.rows.iter().any(|row| row.bodies.contains(&(k as u32)));
    let bodies = panels.assembly.bodies.iter().enumerate().filter(|(k, _)| in_row(*k));
    let largest = bodies.map(|(_, body)| volume(body)).fold(0.0, f64::max);
    let ball = unit * (0.75 * largest / PI).cbrt();
    let mut found = vec![check(
        "equal-volume bound over the capacitance of all rows together [1]",
        ball / total,
        1.0 + bar,
    )];
    if panels.plane.is_none() {
        let corners: Vec<Vec3> = panels.triangles.iter().flat_map(|tri| tri.corners).collect();
        let (lo, hi) = weld::bounds(&corners);
        let centre = (lo + hi) * 0.5;
        let radius = corners.iter().map(|p| (p - centre).norm()).fold(0.0, f64::max);
        let value = total / (unit * radius);
        found.push(check(
            "capacitance of all rows together over the enclosing-ball bound [1]",
            value,
            1.0 + bar,
        ));
    }
    found
}

/// Energy from potentials and charges against the charge on the panels times their potential: raw charges
/// know nothing of the residual correction.
fn energy_check(solved: &Solved, case: &VoltageCase) -> Check {
    let rows = &solved.panels.assembly.rows;
    let v: Vec<f64> = rows.iter().map(|row| *case.potentials_volt.get(&row.name).unwrap_or(&0.0)).collect();
    let field = physics::field::normal_field(solved, &v);
    let eps = physics::permittivity(solved.eps_r);
    let of_panel = |p: usize| {
        let volt = solved.panels.row(p).map_or(0.0, |row| v[row]);
        0.5 * volt * field[p] * eps * solved.panels.triangles[p].area()
    };
    let from_panels: f64 = (0..solved.panels.len()).map(of_panel).sum();
    let name = format!("energy on the panels against ½ Σ V Q in `{}` [1]", case.name);
    let size = case.energy_joule.abs().max(f64::MIN_POSITIVE);
    let limit = CORRECTION + CORRECTION_IN_BARS * case.energy_bar_joule / size;
    check(&name, (from_panels - case.energy_joule).abs() / size, limit)
}
