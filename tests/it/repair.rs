//! Welding, repairs and acceptance: each repair undoes a planted defect.
use crate::stl_bodies;
use crate::stl_bodies::Facets;
use amberskin::base::Finding;
use amberskin::base::Severity;
use amberskin::base::Vec3;
use amberskin::mesh::Surface;
use amberskin::mesh::accept;
use amberskin::mesh::shells;
use amberskin::mesh::weld;

fn facets_of(surface: &Surface) -> Facets {
    surface.welded.facets.iter().map(|f| f.map(|p| surface.welded.points[p as usize])).collect()
}

#[track_caller]
fn accepted(facets: &[[Vec3; 3]]) -> (Facets, Vec<Finding>) {
    let (surface, findings) = accept::body(facets, false, "part").unwrap();
    (facets_of(&surface), findings)
}

#[track_caller]
fn refused(facets: &[[Vec3; 3]], code: &str) -> Finding {
    let findings = accept::body(facets, false, "part").unwrap_err();
    let found = findings.iter().find(|f| f.code == code && f.severity == Severity::Refusal);
    found.unwrap_or_else(|| panic!("no {code} in {findings:?}")).clone()
}

/// Same volume and area as the original to 1e-12: the closed forms of the body itself.
#[track_caller]
fn restored(broken: &[[Vec3; 3]], original: &[[Vec3; 3]], code: &str) -> Vec<Finding> {
    let (mended, findings) = accepted(broken);
    let close = |a: f64, b: f64| assert!((a - b).abs() <= 1e-12 * b.abs(), "{a} against {b}");
    close(stl_bodies::volume(&mended), stl_bodies::volume(original));
    close(stl_bodies::area(&mended), stl_bodies::area(original));
    assert!(findings.iter().any(|f| f.code == code && f.place.is_some()), "no {code} in {findings:?}");
    findings
}

#[test]
fn a_clean_body_passes_without_a_finding() {
    for body in [stl_bodies::cube(), stl_bodies::ball(Vec3::new(0.1, 0.2, 0.3), 0.05, 3)] {
        let (same, findings) = accepted(&body);
        assert_eq!(same, body);
        assert_eq!(findings, []);
    }
}

#[test]
fn welding_shares_corners_and_is_the_same_each_time() {
    let ball = stl_bodies::ball(Vec3::zeros(), 1.0, 3);
    let one = weld::weld(&ball, weld::WELD_REL_TOL);
    // Euler: a closed body without a hole has facets / 2 + 2 corners.
    assert_eq!(one.points.len(), ball.len() / 2 + 2);
    assert_eq!(one, weld::weld(&ball, weld::WELD_REL_TOL));
}

#[test]
fn minus_zero_is_zero() {
    let minus =
        stl_bodies::cube().iter().map(|f| f.map(|x| x.map(|c| if c < 0.5 { -0.0 } else { c }))).collect();
    let mixed: Facets = [stl_bodies::cube(), minus].concat();
    let welded = weld::weld(&mixed, 0.0);
    assert_eq!(welded.points.len(), 8);
    assert!(welded.points.iter().all(|x| x.iter().all(|c| c.is_sign_positive())));
}

#[test]
fn shells_come_in_file_order() {
    let (a, b) = (stl_bodies::cuboid([5.0; 3], [6.0; 3]), stl_bodies::cube());
    let mixed: Facets = a.iter().zip(&b).flat_map(|(a, b)| [*a, *b]).collect();
    let shells = shells::split(&weld::weld(&mixed, weld::WELD_REL_TOL));
    assert_eq!(shells.iter().map(|s| s.points[0].x).collect::<Vec<_>>(), [5.0, 0.0]);
    assert!(shells.iter().all(|s| s.facets.len() == 12 && s.points.len() == 8));
}

#[test]
fn a_repeated_facet_is_taken_out() {
    let mut body = stl_bodies::cube();
    body.push(body[4]);
    restored(&body, &stl_bodies::cube(), "duplicate_removed");
}

#[test]
fn a_hole_is_refused_with_its_corners() {
    let body = &stl_bodies::cube()[1..];
    let finding = refused(body, "hole");
    assert!(finding.text.contains("hole of 3 corners and perimeter 3.41421 m"), "{}", finding.text);
    assert!(finding.text.contains("(1, 1, 0) m"), "{}", finding.text);
}

#[test]
fn an_inside_out_shell_is_turned() {
    restored(&stl_bodies::inside_out(&stl_bodies::cube()), &stl_bodies::cube(), "shell_turned");
}
