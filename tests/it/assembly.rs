//! From bodies to what is exposed: contact, overlap, nesting, the earth plane.

use crate::bodies;
use crate::bodies::Facets;
use crate::bodies::sheet;
use crate::bodies::solid;
use crate::bodies::vec3;
use amberskin::base::Finding;
use amberskin::base::Plane;
use amberskin::base::Severity;
use amberskin::base::Vec3;
use amberskin::geom::Triangle;
use amberskin::mesh::Assembly;
use amberskin::mesh::Body;
use amberskin::mesh::Net;
use amberskin::mesh::assembly::crossings_within;
use amberskin::mesh::assembly::expose;

fn bond(members: &[&str]) -> Vec<Vec<String>> {
    vec![members.iter().map(|m| (*m).to_owned()).collect()]
}

/// Exposed area of all pieces; each piece must also be where its parent says and face its way.
#[track_caller]
fn area(assembly: &Assembly) -> f64 {
    let mut sum = 0.0;
    for piece in &assembly.pieces {
        let welded = &assembly.bodies[piece.body as usize].surface.welded;
        let facet = Triangle::new(welded.facets[piece.facet as usize].map(|c| welded.points[c as usize]));
        for (corner, w) in piece.corners.iter().zip(piece.bary) {
            assert!((facet.at(w) - corner).norm() <= 1e-12 * facet.longest_edge(), "{w:?} is not {corner:?}");
            assert!((w[0] + w[1] + w[2] - 1.0).abs() < 1e-12, "{w:?} does not add up to one");
        }
        let triangle = Triangle::new(piece.corners);
        assert!(0.0 < triangle.cross().dot(&facet.cross()), "a piece faces the other way");
        sum += triangle.area();
    }
    sum
}

#[track_caller]
fn assert_area(assembly: &Assembly, expected: f64) {
    let found = area(assembly);
    assert!((found - expected).abs() <= 1e-9 * expected, "exposed {found}, computed by hand {expected}");
}

fn codes(findings: &[Finding]) -> Vec<&'static str> {
    findings.iter().map(|f| f.code).collect()
}

#[track_caller]
fn refusal<'a>(result: &'a Result<Assembly, Vec<Finding>>, code: &str) -> &'a Finding {
    let Err(findings) = result else { panic!("{code}: not refused") };
    let found = findings.iter().find(|f| f.code == code && f.severity == Severity::Refusal);
    found.unwrap_or_else(|| panic!("no {code} in {findings:?}"))
}

fn unit_box(n: usize) -> Facets {
    bodies::cuboid(Vec3::zeros(), Vec3::repeat(1.0), n)
}

/// A turn that leaves no axis where it was.
fn turn(x: &Vec3) -> Vec3 {
    turned_by(x, 0.3, 0.7)
}

fn turned_by(x: &Vec3, a: f64, b: f64) -> Vec3 {
    let y = vec3(x.x * a.cos() - x.y * a.sin(), x.x * a.sin() + x.y * a.cos(), x.z);
    vec3(y.x, y.y * b.cos() - y.z * b.sin(), y.y * b.sin() + y.z * b.cos())
}

/// 6 + 6·(1/2)² minus twice the contact face of (1/2)².
#[test]
fn stacked_boxes_lose_both_contact_faces() {
    for (n, m) in [(1, 1), (3, 2), (4, 5)] {
        let small = bodies::cuboid(vec3(0.2, 0.3, 1.0), vec3(0.7, 0.8, 1.5), m);
        for case in 0..3 {
            let (a, b) = match case {
                0 => (unit_box(n), small.clone()),
                1 => (bodies::moved(&unit_box(n), turn), bodies::moved(&small, turn)),
                _ => {
                    let mirror = |f: &Facets| bodies::flipped(&bodies::moved(f, |x| vec3(-x.x, x.y, x.z)));
                    (mirror(&unit_box(n)), mirror(&small))
                }
            };
            for pair in [vec![solid("a", &a), solid("b", &b)], vec![solid("b", &b), solid("a", &a)]] {
                let name = format!("{}+{}", pair[0].name, pair[1].name);
                let assembly = expose(pair, &bond(&["a", "b"]), None).unwrap();
                assert_area(&assembly, 6.0 + 1.5 - 0.5);
                assert_eq!(assembly.rows.len(), 1);
                assert_eq!(assembly.rows[0].name, name);
                assert!(codes(&assembly.findings).contains(&"hidden_contact"), "{:?}", assembly.findings);
            }
        }
    }
}

/// Union of two boxes that overlap in (1/2)³ at a corner: 12 − 6·(1/2)²; and of two that share
/// four outer planes (a bar of length 3/2): 2 + 4·3/2.
#[test]
fn overlapping_boxes_show_the_surface_of_their_union() {
    for n in [1, 2, 3] {
        let corner = bodies::moved(&unit_box(3), |x| x + Vec3::repeat(0.5));
        let along = bodies::moved(&unit_box(2), |x| x + vec3(0.5, 0.0, 0.0));
        for (other, expected) in [(corner, 12.0 - 1.5), (along, 2.0 + 6.0)] {
            for turned in [false, true] {
                let pose = |f: &Facets| if turned { bodies::moved(f, turn) } else { f.clone() };
                let pair = vec![solid("a", &pose(&unit_box(n))), solid("b", &pose(&other))];
                assert_area(&expose(pair, &bond(&["b", "a"]), None).unwrap(), expected);
            }
        }
    }
}

/// Two shells of one electrode are the same metal, as two bonded bodies are.
#[test]
fn overlapping_shells_of_one_body_are_one_metal() {
    let both = [unit_box(2), bodies::moved(&unit_box(3), |x| x + Vec3::repeat(0.5))].concat();
    let assembly = expose(vec![solid("a", &both)], &[], None).unwrap();
    assert_area(&assembly, 12.0 - 1.5);
    assert!(codes(&assembly.findings).contains(&"shells_overlap"), "{:?}", assembly.findings);
    assert!(codes(&assembly.findings).contains(&"hidden_inside"), "{:?}", assembly.findings);
}

#[test]
fn a_second_copy_of_a_body_is_left_out() {
    let pair = vec![solid("a", &unit_box(2)), solid("b", &unit_box(3))];
    let assembly = expose(pair, &bond(&["a", "b"]), None).unwrap();
    assert_area(&assembly, 6.0);
    assert!(assembly.pieces.iter().all(|p| p.body == 0), "the first copy stays");
}

/// A rod of section 1/5 × 1/5 through a plate of thickness 1: the plate loses two openings, the
/// rod the part inside.
#[test]
fn a_rod_through_a_plate_is_hidden_inside_it() {
    let plate = bodies::cuboid(vec3(-2.0, -2.0, 0.0), vec3(2.0, 2.0, 1.0), 1);
    let rod = bodies::cuboid(vec3(-0.1, -0.1, -1.0), vec3(0.1, 0.1, 2.0), 1);
    let pair = vec![solid("plate", &plate), solid("rod", &rod)];
    let assembly = expose(pair, &bond(&["plate", "rod"]), None).unwrap();
    assert_area(&assembly, 32.0 + 16.0 - 2.0 * 0.04 + 2.0 * 0.04 + 4.0 * 0.2 * 2.0);
}

/// Surface of the cells of a grid that `filled` names, in faces of one cell.
fn surface_of_cells(filled: impl Fn(i32, i32, i32) -> bool) -> f64 {
    let mut faces = 0;
    for (x, y, z) in (-1..7).flat_map(|x| (-1..7).flat_map(move |y| (-1..7).map(move |z| (x, y, z)))) {
        let here = filled(x, y, z);
        let next = [filled(x + 1, y, z), filled(x, y + 1, z), filled(x, y, z + 1)];
        faces += next.iter().filter(|n| **n != here).count();
    }
    faces as f64
}

/// Boxes with corners on a grid, in all ways of touching and overlapping: the surface of the union
/// is counted cell by cell.  Turned boxes are rounded to single precision, as STL does.
#[test]
fn bonded_boxes_on_a_grid_show_the_surface_counted_in_cells() {
    let mut seed = 7_u64;
    let mut dice = move |n: u64| {
        seed = seed.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
        ((seed >> 33) % n) as i32
    };
    for case in 0..150 {
        let boxes: Vec<[i32; 6]> = (0..2 + dice(4))
            .map(|_| {
                let lo = [dice(4), dice(4), dice(4)];
                [lo[0], lo[1], lo[2], lo[0] + 1 + dice(2), lo[1] + 1 + dice(2), lo[2] + 1 + dice(2)]
            })
            .collect();
        let turned = case % 2 == 1;
        let all = boxes.iter().enumerate().map(|(b, s)| {
            let corner = |k: usize| vec3(f64::from(s[k]), f64::from(s[k + 1]), f64::from(s[k + 2]));
            let facets = bodies::cuboid(corner(0), corner(3), 1 + b % 3);
            let pose = |x: &Vec3| if turned { turn(x).map(|c| f64::from(c as f32)) } else { *x };
            solid(&format!("b{b}"), &bodies::moved(&facets, pose))
        });
        let names: Vec<String> = (0..boxes.len()).map(|b| format!("b{b}")).collect();
        let assembly = expose(all.collect(), &[names], None).unwrap();
        let expected = surface_of_cells(|x, y, z| {
            boxes.iter().any(|s| s[0] <= x && x < s[3] && s[1] <= y && y < s[4] && s[2] <= z && z < s[5])
        });
        let (found, rel_tol) = (area(&assembly), if turned { 1e-5 } else { 1e-9 });
        assert!(
            (found - expected).abs() <= rel_tol * expected,
            "{case} {boxes:?}: {found}, counted {expected}"
        );
    }
}

/// A faceted sphere half sunk into a box: the flat facets' own areas are the closed form.
#[test]
fn a_fine_contact_line_on_coarse_faces_keeps_the_area() {
    let ball = bodies::sphere(vec3(0.5, 0.5, 1.0), 0.3, 60, 30);
    let pair = vec![solid("box", &unit_box(1)), solid("ball", &ball)];
    let assembly = expose(pair, &bond(&["box", "ball"]), None).unwrap();
    // The equator is a polygon of 60 corners in the top face.
    let polygon = 0.5 * 60.0 * 0.09 * (std::f64::consts::TAU / 60.0).sin();
    assert_area(&assembly, 6.0 - polygon + 0.5 * bodies::area(&ball));
}

#[test]
fn bonds_are_transitive_and_touching_members_become_one_row() {
    let at = |x: f64| bodies::moved(&unit_box(1), move |p| p + vec3(x, 0.0, 0.0));
    let all = vec![solid("a", &at(0.0)), solid("x", &at(9.0)), solid("b", &at(1.0)), solid("c", &at(4.0))];
    let bonds = [bond(&["a", "c"]), bond(&["c", "b"])].concat();
    let assembly = expose(all, &bonds, None).unwrap();
    let rows: Vec<_> = assembly.rows.iter().map(|r| (r.name.as_str(), r.bodies.clone())).collect();
    assert_eq!(rows, [("a+b", vec![0, 2]), ("x", vec![1]), ("c", vec![3])]);
    assert!(assembly.pieces.iter().all(|p| p.net == Net::Row([0, 1, 0, 2][p.body as usize])), "nets");
    assert_eq!(assembly.bodies.len(), 4);
}

#[test]
fn unbonded_bodies_that_meet_are_refused_by_name() {
    let pair = |shift: Vec3| {
        let other = bodies::moved(&bodies::cuboid(Vec3::zeros(), Vec3::repeat(0.5), 2), |x| x + shift);
        expose(vec![solid("live", &unit_box(3)), solid("foot", &other)], &[], None)
    };
    let cases = [
        (vec3(0.25, 0.25, 1.0), "contact"),
        (vec3(0.25, 0.25, 0.8), "overlap"),
        (vec3(0.25, 0.25, 0.2), "overlap"),
        (vec3(1.0, 1.0, 1.0), "contact"),
        (vec3(1.0, 0.2, 0.3), "contact"),
    ];
    for (shift, code) in cases {
        let result = pair(shift);
        let finding = refusal(&result, code);
        for word in ["live", "foot", "bond them if they are joined"] {
            assert!(finding.text.contains(word), "{}", finding.text);
        }
        let place = finding.place.unwrap();
        assert!((0..3).all(|k| -1e-9 <= place[k] && place[k] <= 1.5), "{place:?}");
    }
    let twice = expose(vec![solid("live", &unit_box(3)), solid("foot", &unit_box(2))], &[], None);
    refusal(&twice, "coplanar_overlap");
}

#[test]
fn small_gaps_are_listed_with_their_length() {
    let at = |gap: f64| {
        let other = bodies::moved(&unit_box(2), |x| x + vec3(1.0 + gap, 0.25, 0.25));
        expose(vec![solid("a", &unit_box(3)), solid("b", &other)], &[], None).unwrap().findings
    };
    let size = 3.0_f64.sqrt();
    let note = at(0.05 * size);
    assert_eq!((note[0].code, note[0].severity), ("near_contact", Severity::Note));
    assert!(note[0].text.contains("8.6603e-2 m"), "{}", note[0].text);
    assert!((note[0].place.unwrap().x - 1.0 - 0.025 * size).abs() < 1e-12, "{:?}", note[0].place);
    let warning = at(5e-4 * size);
    assert_eq!((warning[0].code, warning[0].severity), ("near_contact", Severity::Warning));
    assert!(at(0.11 * size).is_empty(), "a wide gap is not listed");
}

fn vessel() -> Facets {
    let wall = bodies::cuboid(Vec3::repeat(-1.0), Vec3::repeat(2.0), 3);
    [bodies::cuboid(Vec3::repeat(-1.5), Vec3::repeat(2.5), 2), bodies::flipped(&wall)].concat()
}

#[test]
fn a_vessel_keeps_its_cavity_wall_only_around_an_electrode() {
    let core = solid("core", &unit_box(1));
    let full = expose(vec![solid("vessel", &vessel()), core], &[], None).unwrap();
    assert_area(&full, 6.0 * 16.0 + 6.0 * 9.0 + 6.0);
    let nested = full.findings.iter().find(|f| f.code == "nested").unwrap();
    assert!(nested.text.contains("`core`") && nested.text.contains("`vessel`"), "{}", nested.text);

    let empty = expose(vec![solid("vessel", &vessel())], &[], None).unwrap();
    assert_area(&empty, 6.0 * 16.0);
    let saved = empty.findings.iter().find(|f| f.code == "empty_cavity").unwrap();
    assert!(saved.text.contains("108 facets"), "{}", saved.text);
}

/// An electrode in the metal around the cavity is not in the cavity.
#[test]
fn a_body_inside_metal_is_refused() {
    let grain = bodies::cuboid(Vec3::repeat(-1.4), Vec3::repeat(-1.2), 1);
    let result = expose(vec![solid("vessel", &vessel()), solid("grain", &grain)], &[], None);
    let finding = refusal(&result, "overlap");
    assert!(finding.text.contains("`grain` lies inside the metal of `vessel`"), "{}", finding.text);
    let bonded = vec![solid("vessel", &vessel()), solid("grain", &grain)];
    assert_area(&expose(bonded, &bond(&["vessel", "grain"]), None).unwrap(), 6.0 * 16.0);
}

/// A bonded post across the cavity leaves the wall in place, without the two contact faces.
#[test]
fn a_cavity_with_a_post_keeps_its_wall() {
    let post = bodies::cuboid(vec3(0.0, 0.0, -1.0), vec3(1.0, 1.0, 2.0), 2);
    let pair = vec![solid("vessel", &vessel()), solid("post", &post)];
    let assembly = expose(pair, &bond(&["vessel", "post"]), None).unwrap();
    assert_area(&assembly, 96.0 + 54.0 - 2.0 + 12.0);
}

fn plane(through: Vec3, facing: Vec3) -> Plane {
    Plane { through, facing: facing.normalize() }
}

/// A unit cube whose bottom lies in the plane keeps 5, sunk by 1/4 it keeps 1 + 4·3/4, in any pose.
#[test]
fn a_body_on_the_earth_plane_is_cut_there() {
    let up = vec3(0.0, 0.0, 1.0);
    for (sunk, expected) in [(0.0, 5.0), (0.25, 4.0), (0.5, 3.0)] {
        for n in [1, 2, 3] {
            for turned in [false, true] {
                let (facets, facing) =
                    if turned { (bodies::moved(&unit_box(n), turn), turn(&up)) } else { (unit_box(n), up) };
                let earth = plane(facing * sunk, facing);
                let assembly =
                    expose(vec![solid("foot", &facets)], &bond(&["foot", "earth"]), Some(&earth)).unwrap();
                assert_area(&assembly, expected);
                assert!(assembly.rows.is_empty() && assembly.bodies.len() == 1, "earth has no row");
                assert!(assembly.pieces.iter().all(|p| p.net == Net::Earth), "net");
                let low = assembly.pieces.iter().flat_map(|p| &p.corners).map(|x| earth.height(x));
                assert!(low.fold(f64::MAX, f64::min) > -1e-9, "something is left behind the plane");
            }
        }
    }
}

/// The diagonal plane through four corners of the unit cube leaves half of it.
#[test]
fn a_cube_cut_along_its_diagonal_keeps_half() {
    let earth = plane(Vec3::zeros(), vec3(1.0, -1.0, 0.0));
    let assembly =
        expose(vec![solid("foot", &unit_box(2))], &bond(&["foot", "earth"]), Some(&earth)).unwrap();
    assert_area(&assembly, 3.0);
}

#[test]
fn only_what_touches_the_foot_belongs_to_earth() {
    let at = |z: f64| bodies::moved(&unit_box(2), move |p| p + vec3(0.0, 0.0, z));
    let all = vec![solid("foot", &at(0.0)), solid("post", &at(1.0)), solid("cap", &at(4.0))];
    let earth = plane(Vec3::zeros(), vec3(0.0, 0.0, 1.0));
    let assembly = expose(all, &bond(&["foot", "earth", "cap", "post"]), Some(&earth)).unwrap();
    assert_area(&assembly, 4.0 + 5.0 + 6.0);
    assert_eq!(assembly.rows.len(), 1);
    assert_eq!(assembly.rows[0].name, "cap");
    assert!(assembly.pieces.iter().all(|p| (p.net == Net::Earth) == (p.body < 2)), "nets");
}

#[test]
fn bodies_at_or_behind_the_plane_are_refused() {
    let earth = plane(Vec3::zeros(), vec3(0.0, 0.0, 1.0));
    let standing = expose(vec![solid("foot", &unit_box(1))], &[], Some(&earth));
    assert!(refusal(&standing, "meets_earth").text.contains("bond `foot` with `earth`"), "{standing:?}");
    let turned = plane(vec3(0.0, 0.0, 2.0), vec3(0.0, 0.0, 1.0));
    let behind = expose(vec![solid("foot", &unit_box(1))], &[], Some(&turned));
    let text = &refusal(&behind, "behind_earth").text;
    assert!(text.contains("faces [0, 0, 1]") && text.contains("turn `facing` to [0, 0, -1]"), "{text}");
}

/// Open and closed sheets keep every facet; a sheet lying on a solid does not double its face.
#[test]
fn sheets_are_exposed_on_both_sides() {
    let square = |z: f64| bodies::patch(vec3(0.25, 0.25, z), vec3(0.5, 0.0, 0.0), vec3(0.0, 0.5, 0.0), 2, 2);
    let hollow = expose(vec![sheet("shell", &unit_box(2)), sheet("plate", &square(0.5))], &[], None).unwrap();
    assert_area(&hollow, 6.25);
    let pair = vec![sheet("plate", &square(1.0)), solid("box", &unit_box(1))];
    let lying = expose(pair, &bond(&["plate", "box"]), None).unwrap();
    assert_area(&lying, 6.0);
    let across = bodies::patch(vec3(0.5, 0.5, 0.0), vec3(1.0, 0.0, 0.0), vec3(0.0, 0.0, 1.0), 1, 1);
    let pair = vec![sheet("fin", &across), solid("box", &unit_box(1))];
    let half = expose(pair, &bond(&["fin", "box"]), None).unwrap();
    assert_area(&half, 6.5);
}

#[test]
fn crossing_sheets_are_noted_and_crossing_solids_refused() {
    let flat = bodies::patch(vec3(-1.0, -1.0, 0.0), vec3(2.0, 0.0, 0.0), vec3(0.0, 2.0, 0.0), 2, 3);
    let upright = bodies::patch(vec3(-1.0, 0.1, -1.0), vec3(2.0, 0.0, 0.0), vec3(0.0, 0.0, 2.0), 2, 3);
    let cross = bodies::surface(&[flat, upright].concat(), true);
    let found = crossings_within(&cross, "cross");
    assert!(!found.is_empty() && found.iter().all(|f| f.severity == Severity::Note), "{found:?}");
    // One corner of the top face pushed through the bottom face.
    let pushed = |x: &Vec3| if *x == vec3(0.5, 0.5, 1.0) { vec3(0.55, 0.53, -0.5) } else { *x };
    let spike = bodies::surface(&bodies::moved(&unit_box(4), pushed), false);
    let found = crossings_within(&spike, "spike");
    assert_eq!((found[0].code, found[0].severity), ("self_intersection", Severity::Refusal));
    assert!(found.len() <= 6 && found[0].text.contains("`spike`"), "{found:?}");
    let place = found[0].place.unwrap();
    assert!(place.z.abs() < 1e-9 && 0.4 < place.x && place.x < 0.7, "{place:?}");
    for clean in [bodies::torus(1.0, 0.4, 64, 32), bodies::sphere(Vec3::zeros(), 1.0, 64, 32), unit_box(4)] {
        assert!(crossings_within(&bodies::surface(&clean, false), "clean").is_empty(), "a clean body");
    }
}

#[test]
fn an_unknown_member_of_a_bond_is_refused() {
    let result = expose(vec![solid("a", &unit_box(1))], &bond(&["a", "b"]), None);
    assert!(refusal(&result, "bond_unknown").text.contains("`b`"), "{result:?}");
}

/// Nothing of this is a body, and nothing of it may end the program.
#[test]
fn degenerate_input_does_not_panic() {
    let point = Vec3::repeat(1.0);
    let nan = Vec3::repeat(f64::NAN);
    let far = Vec3::repeat(1e300);
    let bad: Facets = vec![[point; 3], [point, far, -far], [nan; 3], [point, point * 2.0, point * 3.0]];
    let empty = Facets::new();
    for facets in [bad, empty] {
        for pair in [vec![solid("a", &facets), solid("b", &unit_box(1))], vec![sheet("a", &facets)]] {
            let earth = plane(Vec3::zeros(), vec3(0.0, 0.0, 1.0));
            let _either: Result<Assembly, Vec<Finding>> =
                expose(pair, &bond(&["a", "b", "earth"]), Some(&earth));
        }
    }
    let none: Vec<Body> = Vec::new();
    assert!(expose(none, &[], None).unwrap().pieces.is_empty(), "nothing in, nothing out");
}
