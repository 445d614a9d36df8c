//! Welding, repairs and acceptance: each repair undoes a planted defect.
use crate::stl_bodies;
use crate::stl_bodies::Facets;
use amberskin::base::Finding;
use amberskin::base::Severity;
use amberskin::base::Vec3;
use amberskin::mesh::Surface;
use amberskin::mesh::accept;
use amberskin::mesh::place;
use amberskin::mesh::place::Placing;
use amberskin::mesh::shells;
use amberskin::mesh::size;
use amberskin::mesh::weld;
use std::f64::consts::FRAC_PI_2;

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
fn the_innermost_shell_that_holds_a_point_is_found() {
    let nested = [0.5, 2.0, 1.0].map(|r| stl_bodies::ball(Vec3::zeros(), r, 1)).concat();
    let shells = shells::split(&weld::weld(&nested, weld::WELD_REL_TOL));
    let at = |x: f64| shells::holding(&shells, &Vec3::new(x, 0.0, 0.0));
    assert_eq!([0.1, 0.7, 1.5, 2.5].map(at), [Some(0), Some(2), Some(1), None]);
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

#[test]
fn a_facet_without_area_is_taken_out_and_its_neighbours_are_joined() {
    // Two facets of the top of the cube with a needle between them whose middle corner lies on the
    // diagonal: on one side the diagonal is whole, on the other it is in two.
    let body = stl_bodies::cube();
    let [a, b, c] = body[1];
    let middle = (a + b) * 0.5;
    let mut broken: Facets = body.clone();
    broken[1] = [a, middle, c];
    broken.push([middle, b, c]);
    broken.push([a, b, middle]);
    let findings = restored(&broken, &body, "zero_area_removed");
    assert!(findings.iter().all(|f| f.code != "t_joint_closed"), "{findings:?}");
}

#[test]
fn a_facet_with_equal_corners_is_taken_out() {
    let mut body = stl_bodies::cube();
    let [a, b, _] = body[3];
    body.push([a, b, b]);
    restored(&body, &stl_bodies::cube(), "zero_area_removed");
}

#[test]
fn t_joints_are_closed() {
    let body = stl_bodies::ball(Vec3::zeros(), 1.0, 2);
    let [a, b, c] = body[17];
    let mut broken = body.clone();
    // Thirds of one side: two T-joints on one open side of the neighbour.
    let (p, q) = (a + (b - a) / 3.0, a + (b - a) * (2.0 / 3.0));
    broken.splice(17..18, [[a, p, c], [p, q, c], [q, b, c]]);
    let findings = restored(&broken, &body, "t_joint_closed");
    assert_eq!(findings.iter().filter(|f| f.code == "t_joint_closed").count(), 2);
}

#[test]
fn t_joints_on_all_three_sides_of_a_facet_are_closed() {
    let body = stl_bodies::ball(Vec3::zeros(), 1.0, 1);
    let [a, b, c] = body[3];
    let (ab, bc, ca) = ((a + b) * 0.5, (b + c) * 0.5, (c + a) * 0.5);
    let mut broken = body.clone();
    broken.splice(3..4, [[a, ab, ca], [ab, b, bc], [ca, bc, c], [ab, bc, ca]]);
    let findings = restored(&broken, &body, "t_joint_closed");
    assert_eq!(findings.len(), 3, "{findings:?}");
    // And the other way round: the facet between three that are halved.
    let body = stl_bodies::ball(Vec3::zeros(), 1.0, 2);
    let halved = |f: &[Vec3; 3]| -> Option<Facets> {
        let k = (0..3)
            .find(|&k| body[3].contains(&f[k]) && body[3].contains(&f[(k + 1) % 3]) && *f != body[3])?;
        let (x, y, z) = (f[k], f[(k + 1) % 3], f[(k + 2) % 3]);
        let m = (x + y) * 0.5;
        Some(vec![[x, m, z], [m, y, z]])
    };
    let broken: Facets = body.iter().flat_map(|f| halved(f).unwrap_or_else(|| vec![*f])).collect();
    assert_eq!(broken.len(), body.len() + 3);
    restored(&broken, &body, "t_joint_closed");
}

/// The body with a small triangular hole in the plane of facet `f`.
fn pierced(body: &[[Vec3; 3]], f: usize) -> Facets {
    let [a, b, c] = body[f];
    let [p, q, r] = [a, b, c].map(|x| (a + b + c) / 3.0 + (x - (a + b + c) / 3.0) * 0.05);
    let ring = [[a, b, q], [a, q, p], [b, c, r], [b, r, q], [c, a, p], [c, p, r]];
    [&body[..f], &ring, &body[f + 1..]].concat()
}

#[test]
fn a_tiny_hole_is_filled() {
    let body = stl_bodies::ball(Vec3::new(1.0, 2.0, 3.0), 1.0, 3);
    let findings = restored(&pierced(&body, 123), &body, "tiny_hole_filled");
    assert!(findings[0].text.contains("tiny hole of 3 sides"), "{findings:?}");
}

#[test]
fn a_tiny_hole_of_many_sides_is_filled() {
    // A square whose grid is fine near the middle, with a hole there in the form of an L.
    let lines = [0.0, 0.2, 0.4, 0.5, 0.502, 0.504, 0.6, 0.8, 1.0];
    let (mut top, mut holed) = (Vec::new(), Vec::new());
    for i in 0..lines.len() - 1 {
        for j in 0..lines.len() - 1 {
            let at = |i: usize, j: usize| Vec3::new(lines[i], lines[j], 0.0);
            let quad =
                [[at(i, j), at(i + 1, j), at(i + 1, j + 1)], [at(i, j), at(i + 1, j + 1), at(i, j + 1)]];
            top.extend(quad);
            if ![(3, 3), (4, 3), (3, 4)].contains(&(i, j)) {
                holed.extend(quad);
            }
        }
    }
    // Below, facets from the rim to one point close the body.
    let apex = Vec3::new(0.5, 0.5, -0.5);
    let mut cone = Vec::new();
    for s in lines.windows(2) {
        let sides = [
            (Vec3::new(s[0], 0.0, 0.0), Vec3::new(s[1], 0.0, 0.0)),
            (Vec3::new(1.0, s[0], 0.0), Vec3::new(1.0, s[1], 0.0)),
            (Vec3::new(s[1], 1.0, 0.0), Vec3::new(s[0], 1.0, 0.0)),
            (Vec3::new(0.0, s[1], 0.0), Vec3::new(0.0, s[0], 0.0)),
        ];
        cone.extend(sides.map(|(a, b)| [b, a, apex]));
    }
    let findings = restored(&[holed, cone.clone()].concat(), &[top, cone].concat(), "tiny_hole_filled");
    assert!(findings[0].text.contains("tiny hole of 8 sides"), "{findings:?}");
}

#[test]
fn flipped_facets_of_a_closed_shell_are_turned() {
    let body = stl_bodies::ball(Vec3::zeros(), 1.0, 2);
    let mut broken = body.clone();
    for f in [3, 4, 77] {
        broken[f].swap(0, 1);
    }
    let findings = restored(&broken, &body, "facet_flipped");
    assert_eq!(findings.len(), 3);
}

#[test]
fn long_lists_end_with_the_number_of_the_rest() {
    let body = stl_bodies::ball(Vec3::zeros(), 1.0, 3);
    let broken: Facets = [body.clone(), body[..70].to_vec()].concat();
    let findings = restored(&broken, &body, "duplicate_removed");
    assert_eq!(findings.len(), 51);
    assert!(findings[50].text.contains("20 more of the kind `duplicate_removed`"), "{}", findings[50].text);
}

#[test]
fn all_defects_at_once_are_mended() {
    let body = stl_bodies::ball(Vec3::zeros(), 1.0, 3);
    let mut broken = pierced(&body, 300);
    let [a, b, c] = broken[40];
    broken[7].swap(0, 1);
    broken.push(body[99]);
    let m = (a + b) * 0.5;
    broken.splice(40..41, [[a, m, c], [m, b, c]]);
    broken.push([a, a, b]);
    let findings = restored(&stl_bodies::inside_out(&broken), &body, "shell_turned");
    for code in
        ["zero_area_removed", "duplicate_removed", "t_joint_closed", "facet_flipped", "tiny_hole_filled"]
    {
        assert!(findings.iter().any(|f| f.code == code), "{code}: {findings:?}");
    }
}

#[test]
fn a_shell_inside_another_is_a_cavity_wall_however_it_was_drawn() {
    let outer = stl_bodies::ball(Vec3::zeros(), 1.0, 2);
    let inner = stl_bodies::ball(Vec3::new(0.1, 0.0, 0.0), 0.5, 2);
    let core = stl_bodies::ball(Vec3::new(0.1, 0.0, 0.0), 0.2, 2);
    let expected = stl_bodies::volume(&outer) - stl_bodies::volume(&inner) + stl_bodies::volume(&core);
    for walls in [inner.clone(), stl_bodies::inside_out(&inner)] {
        for core in [core.clone(), stl_bodies::inside_out(&core)] {
            let (mended, findings) = accepted(&[core, walls.clone(), outer.clone()].concat());
            assert!((stl_bodies::volume(&mended) / expected - 1.0).abs() < 1e-12);
            assert!(findings.iter().any(|f| f.code == "cavity_wall" && f.text.contains("shell 1")));
        }
    }
}

#[test]
fn walls_without_thickness_are_refused() {
    let mut fin = stl_bodies::cube();
    let [a, b] = [Vec3::new(0.0, 0.0, 1.0), Vec3::new(1.0, 0.0, 1.0)];
    let tip = Vec3::new(0.5, 0.0, 2.0);
    fin.extend([[a, b, tip], [b, a, tip]]);
    refused(&fin, "double_face");
    refused(&[[a, b, tip], [b, a, tip]], "double_face");
}

#[test]
fn edges_of_more_than_two_facets_are_refused_on_a_solid_and_noted_on_a_sheet() {
    let pair = [stl_bodies::cube(), stl_bodies::cuboid([1.0, 1.0, 0.0], [2.0, 2.0, 1.0])].concat();
    let finding = refused(&pair, "non_manifold_edge");
    assert!(
        finding.text.contains("4 facets meet at the edge from (1, 1, 0) m to (1, 1, 1) m"),
        "{}",
        finding.text
    );
    let [o, x, y, z] = [Vec3::zeros(), Vec3::x(), Vec3::y(), Vec3::z()];
    let (surface, findings) = accept::body(&[[o, x, y], [o, x, z], [o, x, -y]], true, "fins").unwrap();
    assert_eq!(surface.welded.facets.len(), 3);
    assert!(findings.iter().any(|f| f.code == "sheet_junction" && f.severity == Severity::Note));
}

/// A band of `2 n` facets, half a turn from one end to the other if `twisted`.
fn band(n: usize, twisted: bool) -> Facets {
    let rung = |k: usize| {
        let turn = std::f64::consts::TAU * (k % n) as f64 / n as f64;
        let lean = if twisted { turn / 2.0 } else { 0.3 };
        let out = Vec3::new(turn.cos(), turn.sin(), 0.0);
        let across = (out * lean.cos() + Vec3::z() * lean.sin()) * 0.2;
        if k == n && twisted { [out + across * -1.0, out + across] } else { [out + across, out - across] }
    };
    (0..n)
        .flat_map(|k| {
            let ([a, b], [c, d]) = (rung(k), rung(k + 1));
            [[a, b, d], [a, d, c]]
        })
        .collect()
}

#[test]
fn a_surface_with_one_side_is_named() {
    refused(&band(40, true), "one_sided");
    let (_, findings) = accept::body(&band(40, true), true, "band").unwrap();
    assert!(
        findings.iter().any(|f| f.code == "one_sided" && f.severity == Severity::Warning),
        "{findings:?}"
    );
    let (_, findings) = accept::body(&band(40, false), true, "band").unwrap();
    assert_eq!(findings, []);
}

#[test]
fn a_sheet_may_be_open_and_keeps_its_rim() {
    let square = &stl_bodies::cube()[..2];
    let (surface, findings) = accept::body(square, true, "plate").unwrap();
    assert_eq!((facets_of(&surface), surface.sheet, findings), (square.to_vec(), true, vec![]));
    let mut mixed = square.to_vec();
    mixed[1].swap(0, 1);
    let (surface, _) = accept::body(&mixed, true, "plate").unwrap();
    let [n, m] = [0, 1].map(|f| surface.normals[f][0]);
    assert!((n - m).norm() < 1e-15, "both facets face one way");
    let twice: Facets = [square, &stl_bodies::inside_out(square)].concat();
    let (surface, findings) = accept::body(&twice, true, "plate").unwrap();
    assert_eq!(surface.welded.facets.len(), 2);
    assert!(findings[0].text.contains("reversed copy"), "{findings:?}");
}

#[test]
fn slivers_are_warned_of() {
    let tip = Vec3::new(0.5, -2e-4, 0.5);
    let mut body = stl_bodies::cube();
    let [a, b, c] = body[4];
    body.splice(4..5, [[a, b, tip], [b, c, tip], [c, a, tip]]);
    let (_, findings) = accepted(&body);
    assert!(findings.iter().any(|f| f.code == "sliver" && f.severity == Severity::Warning), "{findings:?}");
}

#[test]
fn nothing_at_all_is_refused() {
    refused(&[], "no_facets");
    refused(&[[Vec3::x(); 3]], "no_facets");
}

#[test]
fn sizes_off_the_drawing_name_the_likely_factor() {
    let drawn = Vec3::new(0.1, 0.05, 0.02);
    assert_eq!(size::size_check(&(drawn * 1.004), &drawn, "ball"), None);
    let text = |size: Vec3| size::size_check(&size, &drawn, "ball").unwrap().text;
    assert!(text(drawn / 25.4).contains("multiplied by 25.4 it fits: inches"), "{}", text(drawn / 25.4));
    assert!(text(drawn * 1000.0).contains("size 100 × 50 × 20 m but 0.1 × 0.05 × 0.02 m"));
    assert!(text(drawn * 1000.0).contains("multiplied by 0.001"));
    assert!(text(drawn * 1.03).contains("no common factor fits"));
    assert!(text(Vec3::new(0.05, 0.1, 0.02)).contains("axes look exchanged"));
    let sheet = Vec3::new(1.0, 1.0, 0.0);
    assert_eq!(size::size_check(&sheet, &sheet, "plate"), None);
    assert!(size::unit_suspicion(&drawn, "ball").is_none());
    assert!(size::unit_suspicion(&(drawn * 1e-4), "ball").is_some());
    assert!(size::unit_suspicion(&(drawn * 1e5), "ball").is_some());
}

#[test]
fn far_coordinates_that_blur_a_gap_are_warned_of() {
    // Single precision has 24 bits: at 1e5 the spacing is 2^(16 − 23) = 0.0078125.
    assert!((weld::f32_spacing(1e5) - 0.007_812_5).abs() < 1e-15);
    assert!(weld::spacing_finding(1e5, 0.7, "tap").unwrap().text.contains("7.8e-3 apart"));
    assert_eq!(weld::spacing_finding(1e5, 0.8, "tap"), None);
}

#[test]
fn placing_scales_then_turns_then_shifts() {
    let turns = [(Vec3::z(), FRAC_PI_2), (Vec3::x(), FRAC_PI_2)];
    let shift = Vec3::new(10.0, 0.0, 0.0);
    let placing = Placing { unit: 1e-3, scale: 2.0, rotations: &turns, shift };
    let placed = place(&[[Vec3::x(), Vec3::y(), Vec3::z()]], &placing);
    // x goes to y and then to z; y to −x; z to z and then to −y.
    let expected = [Vec3::z(), -Vec3::x(), -Vec3::y()].map(|x| shift + x * 2e-3);
    for (is, wanted) in placed[0].iter().zip(expected) {
        assert!((is - wanted).norm() < 1e-15, "{is} against {wanted}");
    }
    let mirrored = Placing { unit: 1.0, scale: -1.0, rotations: &[], shift: Vec3::zeros() };
    assert!((stl_bodies::volume(&place(&stl_bodies::cube(), &mirrored)) - 1.0).abs() < 1e-15);
}

#[test]
fn lengths_times_a_power_of_two_change_nothing_else() {
    let s = 1.0 / 1024.0;
    let mut body = stl_bodies::ball(Vec3::new(1.0, 0.0, 0.0), 1.0, 2);
    body[9].swap(0, 1);
    body.push(body[3]);
    let small: Facets = body.iter().map(|f| f.map(|x| x * s)).collect();
    let (one, scaled) = (accepted(&body).0, accepted(&small).0);
    assert_eq!(one.iter().map(|f| f.map(|x| x * s)).collect::<Facets>(), scaled);
}

#[test]
fn closed_solids_that_touch_stay_apart_and_faces_of_one_body_are_joined() {
    let (left, right) = (stl_bodies::cube(), stl_bodies::cuboid([1.0, 0.0, 0.0], [2.0, 1.0, 1.0]));
    let (surface, findings) = accept::body_of(&[&left, &right], false, "part").unwrap();
    assert_eq!((surface.welded.facets.len(), surface.welded.points.len(), findings), (24, 16, vec![]));
    let faces: Vec<&[[Vec3; 3]]> = left.chunks(2).collect();
    let (surface, findings) = accept::body_of(&faces, false, "part").unwrap();
    assert_eq!((facets_of(&surface), findings), (left.clone(), vec![]));
}
