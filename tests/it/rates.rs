//! Orders of convergence on uniform meshes: a wrong formula rarely keeps its order.
use crate::shapes;
use crate::shapes::Facet;
use crate::solving;
use crate::solving::Asked;
use amberskin::base::si::EPS0;
use amberskin::mesh::Body;
use amberskin::mesh::Surface;
use amberskin::mesh::accept;
use amberskin::mesh::assembly;
use amberskin::mesh::smooth;
use std::f64::consts::PI;

/// One round on the facets as they are.
const ONE_ROUND: Asked = Asked { demand: 1e9, max_panels: usize::MAX };

/// C over 4πε₀ of facets taken as drawn, without refinement [m].
fn capacitance(facets: &[Facet], sheet: bool) -> f64 {
    let (surface, _) = accept::body(facets, sheet, "body").unwrap();
    let smooth = smooth::as_drawn(&surface.welded);
    let surface = Surface { normals: smooth.normals, creases: smooth.creases, ..surface };
    let body = Body { name: "body".to_owned(), surface };
    let assembly = assembly::expose(vec![body], &[], None).unwrap();
    let solved = solving::refined(assembly, None, ONE_ROUND).solved;
    assert_eq!(solved.panels.len(), facets.len(), "refined");
    solved.matrix[0][0] / (4.0 * PI * EPS0)
}

/// Slope of ln|error| over ln h by least squares; `h` halves from mesh to mesh.
fn order(errors: &[f64]) -> f64 {
    let n = errors.len() as f64;
    let mean = errors.iter().map(|e| e.abs().log2()).sum::<f64>() / n;
    let at = |k: usize| k as f64 - 0.5 * (n - 1.0);
    let slope: f64 = errors.iter().enumerate().map(|(k, e)| at(k) * (e.abs().log2() - mean)).sum();
    -slope / (0..errors.len()).map(|k| at(k).powi(2)).sum::<f64>()
}

#[track_caller]
fn assert_order(meshes: &[Vec<Facet>], sheet: bool, exact: f64, theory: f64) {
    let errors: Vec<f64> = meshes.iter().map(|facets| capacitance(facets, sheet) / exact - 1.0).collect();
    let found = order(&errors);
    assert!((found - theory).abs() <= 0.2, "order {found:.2}, theory {theory:.2}, errors {errors:?}");
}

#[test]
fn the_order_of_a_power_is_its_exponent() {
    let errors = [1.0, 0.25, 0.0625];
    assert!((order(&errors) - 2.0).abs() < 1e-12);
}

/// At the edges of a cube σ grows as s^(−1/3), so piecewise constants on equal panels miss h^(2/3) in
/// the energy norm and the capacitance twice that order: 4/3 (von Petersdorff and Stephan, Numer. Math.
/// 57, 1990).
#[test]
fn equal_panels_on_a_cube_converge_with_order_four_thirds() {
    assert_order(&[4, 8, 16].map(|n| shapes::cuboid([1.0; 3], n)), false, 0.66067815409957, 4.0 / 3.0);
}

/// At the rim of a sheet σ grows as s^(−1/2): order 1/2 in the energy norm, 1 in the capacitance (the same
/// source).
#[test]
fn equal_panels_on_a_square_sheet_converge_with_order_one() {
    assert_order(&[8, 16, 32].map(|n| shapes::rect_sheet(1.0, 1.0, n, n)), true, 0.36678800404, 1.0);
}

/// Facets with corners on a sphere leave out a layer of thickness h²/R: order 2.
#[test]
fn facets_taken_as_drawn_converge_to_the_sphere_with_order_two() {
    assert_order(&[3, 6, 12].map(shapes::icosphere), false, 1.0, 2.0);
}
