//! Strength of edges, and the numbers that a declared radius makes of it.
use crate::shapes;
use crate::shapes::Facet;
use crate::solving;
use crate::solving::Asked;
use amberskin::base::Vec3;
use amberskin::case;
use amberskin::case::ShapeFile;
use amberskin::case::Shapes;
use amberskin::operator::Sources;
use amberskin::physics::edges;
use amberskin::physics::edges::Edge;
use amberskin::physics::rounding;
use amberskin::physics::solved::Solved;
use amberskin::physics::strength;
use amberskin::physics::strength::Place;
use amberskin::record::Record;
use amberskin::study;
use std::f64::consts::PI;
use std::path::Path;

/// A straight bar along z over a polygon, its long sides cut `cuts` times.
fn bar(section: &[[f64; 2]], length: f64, cuts: usize) -> Vec<Facet> {
    let n = section.len();
    let at = |k: usize, c: usize| {
        let [x, y] = section[k % n];
        Vec3::new(x, y, length * (c as f64 / cuts as f64 - 0.5))
    };
    let mut facets = Vec::new();
    for (k, c) in (0..n).flat_map(|k| (0..cuts).map(move |c| (k, c))) {
        facets.push([at(k, c), at(k + 1, c), at(k + 1, c + 1)]);
        facets.push([at(k, c), at(k + 1, c + 1), at(k, c + 1)]);
    }
    for k in 1..n - 1 {
        facets.push([at(0, 0), at(k + 1, 0), at(k, 0)]);
        facets.push([at(0, cuts), at(k, cuts), at(k + 1, cuts)]);
    }
    facets
}

/// A polygon of `n` sides of length 1.
fn regular(n: usize) -> Vec<[f64; 2]> {
    let radius = 0.5 / (PI / n as f64).sin();
    let corner = |k: usize| (2.0 * PI * k as f64 / n as f64).sin_cos();
    (0..n).map(corner).map(|(s, c)| [radius * c, radius * s]).collect()
}

fn strengths(solved: &Solved) -> Vec<(Edge, Vec<Place>)> {
    let sources = Sources::build(&solved.panels);
    let found = edges::edges(&solved.panels);
    let places = strength::strengths(solved, &sources, &found, strength::MOST_PLACES);
    found.into_iter().zip(places).collect()
}

/// K and its bar at the middle of an edge when the first row is at 1 V.
fn middle((edge, places): &(Edge, Vec<Place>), solved: &Solved) -> (f64, f64) {
    let mut v = vec![0.0; solved.n_rows()];
    v[0] = 1.0;
    let bars = strength::with_bars(edge, places, &v, 0.0);
    let off = |k: &usize| (places[*k].along - 0.5 * edge.length()).abs();
    let at = (0..places.len()).min_by(|a, b| off(a).total_cmp(&off(b))).unwrap();
    bars[at]
}

#[track_caller]
fn assert_near(found: f64, wanted: f64, rel_tol: f64) {
    assert!((found / wanted - 1.0).abs() <= rel_tol, "{found}, wanted {wanted} within {rel_tol}");
}

fn solve(facets: Vec<Facet>, sheet: bool, max_panels: usize) -> Solved {
    let bodies = if sheet { solving::sheets([facets]) } else { solving::solids([facets]) };
    solving::solve(&bodies, None, Asked { demand: 1e-9, max_panels })
}

/// σ/ε = 2/(π√(R² − r²)) on each side of a disc at 1 V (Jackson, Classical Electrodynamics, section 3.12), so
/// K = 2/(π√(2R)).
#[test]
fn rim_of_a_disc_is_one_edge_with_the_strength_of_the_closed_form() {
    for (panels, rel_tol) in [(300, 0.03), (1200, 0.01)] {
        let solved = solve(shapes::polygon_sheet(5), true, panels);
        let found = strengths(&solved);
        assert_eq!(found.len(), 1);
        assert!(found[0].0.closed);
        let exact = 2.0 / PI / 2.0_f64.sqrt();
        for (k, bar) in strength::with_bars(&found[0].0, &found[0].1, &[1.0], 0.0) {
            assert_near(k, exact, rel_tol);
            assert!((k - exact).abs() <= bar, "{k} ± {bar}, exact {exact}");
        }
    }
}

/// The law of K along the edge of a cube has no closed form; the value 0.5403 at its middle (1 V, side 1) is the common
/// limit of runs of 1,600 to 6,400 panels extrapolated in the radius by hand.
#[test]
fn cube_has_twelve_edges_whose_strength_stands_still() {
    let middles: Vec<f64> = [700, 2800]
        .iter()
        .map(|panels| {
            let solved = solve(shapes::cuboid([1.0; 3], 2), false, *panels);
            let found = strengths(&solved);
            assert_eq!(found.len(), 12);
            assert!(found.iter().all(|(edge, _)| (edge.length() - 1.0).abs() < 1e-9));
            for edge in &found {
                let (k, bar) = middle(edge, &solved);
                assert!((k - 0.5403).abs() <= bar, "{k} ± {bar}");
            }
            middle(&found[0], &solved).0
        })
        .collect();
    assert_near(middles[0], middles[1], 0.03);
    assert_near(middles[1], 0.5403, 0.005);
}

/// Charge per length at the middle of a long bar, over ε₀ [V].
fn line_charge(solved: &Solved, slab: f64) -> f64 {
    let density = &solved.charges.density[0];
    let mut sum = 0.0;
    for (tri, s) in solved.panels.triangles.iter().zip(density) {
        let inside = (0..400).filter(|k| {
            let (a, b) = ((f64::from(k / 20) + 0.5) / 20.0, (f64::from(k % 20) + 0.5) / 20.0);
            let (a, b) = if 1.0 < a + b { (1.0 - a, 1.0 - b) } else { (a, b) };
            tri.at([a, b, 1.0 - a - b]).z.abs() <= 0.5 * slab
        });
        sum += s * tri.area() * inside.count() as f64 / 400.0 / slab;
    }
    sum
}

/// Length of bars of side 1.
const BAR: f64 = 10.0;

/// Panels of bars: K stands within 0.8 % from 1,000 panels on, but the charge per length at the middle, read from
/// the densities, is 2 % high with 2,000 panels, long ones of merged faces.
const BAR_PANELS: usize = 3500;

/// Length over which that charge is taken [m]: on a wire of this length its mean over it is about 0.1 % low.
const SLAB: f64 = 2.0;

/// Outside a regular polygon of side 1 the Schwarz–Christoffel map from the circle has |dz/dw| = R |1 − w^(−N)|^(2/N),
/// which gives K over the charge per length; N = 3, 4, 6 stand for wedges of 60, 90, 120 degrees.
#[test]
fn middle_of_long_bars_has_the_strength_of_the_plane_field() {
    for n in [3, 4, 6] {
        let solved = solve(bar(&regular(n), BAR, BAR as usize), false, BAR_PANELS);
        let found = strengths(&solved);
        let edge = found.iter().find(|(edge, _)| 5.0 < edge.length()).unwrap();
        let (k, _) = middle(edge, &solved);
        let power = 2.0 / n as f64;
        // Side = R ∫ |2 sin(Nθ/2)|^(2/N) dθ over one side, by the midpoint rule.
        let steps = 200_000;
        let angle = |i: usize| (i as f64 + 0.5) / steps as f64 * PI;
        let side = (0..steps).map(|i| (2.0 * angle(i).sin()).powf(power)).sum::<f64>() * 2.0 * PI
            / (n * steps) as f64;
        let radius = 1.0 / side;
        // Near a corner |dz/dθ| = R (Nθ)^p, so s = R N^p θ^(1+p)/(1+p), and E = q'/(2πε)/|dz/dθ|.
        let slope = radius * (n as f64).powf(power);
        let order = 1.0 / (1.0 + power);
        let per_charge = 1.0 / (2.0 * PI) / slope * (slope / (1.0 + power)).powf(power * order);
        assert_near(k, per_charge * line_charge(&solved, SLAB), 0.02);
    }
}

/// EDG-035 to EDG-039 (plane integral equation): highest field of an isolated square bar over its mean.
#[test]
fn rounded_square_bars_follow_the_table() {
    let solved = solve(bar(&regular(4), BAR, BAR as usize), false, BAR_PANELS);
    let found = strengths(&solved);
    let (edge, places) = found.iter().find(|(edge, _)| 5.0 < edge.length()).unwrap();
    let at = places.len() / 2;
    let (k, bar) = strength::with_bars(edge, places, &[1.0], 0.0)[at];
    let mean = line_charge(&solved, SLAB) / 4.0;
    for (radius, wanted) in
        [(0.2, 1.54296), (0.1, 1.90002), (0.05, 2.37325), (0.02, 3.20832), (0.01, 4.03825)]
    {
        let found = rounding::edge(&places[at], [k, bar], &[1.0], radius);
        assert_near(found.field / mean, wanted, 0.03);
        assert!((found.field / mean - wanted).abs() <= found.bar / mean, "{found:?}");
    }
}

/// EDG-031 to EDG-034 (plane integral equation): half-round plates against the strength of the thin one.
#[test]
fn rounded_plates_follow_the_table() {
    let strip = shapes::mapped(&shapes::rect_sheet(1.0, 30.0, 2, 15), |p| Vec3::new(p.x, 0.0, p.y));
    let solved = solve(strip, true, 1500);
    let found = strengths(&solved);
    let (edge, places) = found.iter().find(|(edge, _)| 20.0 < edge.length()).unwrap();
    let at = places.len() / 2;
    let (k, bar) = strength::with_bars(edge, places, &[1.0], 0.0)[at];
    // On a strip of width w the charge per length q' gives K = q'/(2πε√w) on each side.
    assert_near(k, line_charge(&solved, 2.0) / (2.0 * PI), 0.02);
    for (radius, wanted) in [(0.1, 1.69881), (0.05, 1.77562), (0.02, 1.83817), (0.01, 1.86492)] {
        let found = rounding::edge(&places[at], [k, bar], &[1.0], radius);
        assert_near(found.field * f64::sqrt(radius) / k, wanted, 0.01);
    }
}

/// EDG-017 to EDG-029 and EDG-003 on: the table itself, and that it is smooth between its points.
#[test]
fn coefficients_of_fillets_are_those_of_the_table() {
    for (angle, c) in [(30.0, 1.86769), (60.0, 1.81947), (90.0, 1.74606), (135.0, 1.54372), (180.0, 1.0)] {
        assert_near(rounding::coefficients(f64::to_radians(angle))[0], c, 1e-9);
    }
    let c = |angle: f64| rounding::coefficients(angle.to_radians())[0];
    assert!((1..360).all(|k| c(0.5 * f64::from(k)) <= c(0.5 * f64::from(k - 1)) || k == 1));
}

const CUBE: &str = r#"
[units]
length = "mm"
[[electrode]]
name = "cube"
shape = "cube.stl"
EXTRA
[[voltage_case]]
name = "one"
value_is = "peak"
potentials = { cube = "1 V" }
[accuracy]
capacitance = "0.0001 %"
max_panels = PANELS
"#;

fn record(extra: &str, panels: usize, facets: &[Facet]) -> Record {
    let text = CUBE.replace("EXTRA", extra).replace("PANELS", &panels.to_string());
    let case = case::parse(&text, Path::new("cube.toml")).unwrap();
    let shape = ShapeFile { path: "cube.stl".to_owned(), bytes: shapes::binary_stl(facets) };
    study::run(&case, &Shapes { files: vec![shape] }, &|_| {}).unwrap().record
}

/// Highest field on the edges' middles and at the corners of a cube of side 1000 mm [V/m].
fn rounded_cube(percent: f64, panels: usize) -> (f64, f64, Record) {
    let cube = shapes::scaled(&shapes::cuboid([1.0; 3], 1), 1000.0);
    let record = record(&format!("edge_radius = \"{} mm\"", 10.0 * percent), panels, &cube);
    let edge = &record.edges[0];
    let middle = edge.along.iter().find(|at| at.strength <= edge.strength).unwrap();
    (middle.field_v_per_m.unwrap(), record.corners[0].field_v_per_m.unwrap(), record)
}

/// Halving the radius of a right angle raises the field by 2^(1/3) = 1.26, at a corner of a cube by 2^0.546 = 1.46
/// (λ = 0.4542); actually filleted cubes of this side, solved with 4,200 panels and the field taken to the surface from
/// points above it, have 2.790 and 3.498 V/m at the middles of edges and 6.43 and 9.36 V/m at corners for 4 and 2 %.
#[test]
fn rounded_cubes_agree_with_filleted_ones_at_any_number_of_panels() {
    let found: Vec<(f64, f64)> =
        [4.0, 2.0, 1.0].iter().map(|p| rounded_cube(*p, 700)).map(|(m, c, _)| (m, c)).collect();
    for pair in found.windows(2) {
        assert!((pair[1].0 / pair[0].0 - 1.26).abs() <= 0.03, "{found:?}");
        assert!((pair[1].1 / pair[0].1 - 1.46).abs() <= 0.06, "{found:?}");
    }
    for ((middle, corner), (m, c)) in found.iter().zip([(2.790, 6.43), (3.498, 9.36)]) {
        assert_near(*middle, m, 0.05);
        assert_near(*corner, c, 0.05);
    }
    let (middle, corner, record) = rounded_cube(4.0, 2800);
    assert_near(middle, found[0].0, 0.02);
    assert_near(corner, found[0].1, 0.02);
    let maximum = &record.voltage_cases[0].maxima[0];
    assert_eq!(maximum.kind, "corner");
    let (field, bar) = (maximum.field_v_per_m.unwrap(), maximum.bar_v_per_m.unwrap());
    assert!((field - 6.43).abs() <= bar && bar < 0.2 * field, "{field} ± {bar}");
}

#[test]
fn an_edge_without_a_radius_never_has_a_number() {
    let cube = shapes::scaled(&shapes::cuboid([1.0; 3], 1), 1000.0);
    let record = record("", 400, &cube);
    let maximum = &record.voltage_cases[0].maxima[0];
    assert_eq!((maximum.field_v_per_m, maximum.kind.as_str()), (None, "corner"));
    assert!(record.edges.iter().all(|edge| edge.field_v_per_m.is_none() && 0.0 < edge.strength_bar));
    assert_eq!(record.edges.len(), 12);
    let round = shapes::scaled(&shapes::cylinder(1.0, 2.0, 1, 2, 24), 1000.0);
    let record = self::record("", 400, &round);
    assert_eq!(record.voltage_cases[0].maxima[0].kind, "edge");
    assert_eq!(record.edges.len(), 2);
}

/// A round bar of 24 sides taken as drawn: its long sides are seams, its ends have rims.
#[test]
fn seams_are_told_from_edges() {
    let round = shapes::scaled(&shapes::cylinder(1.0, 2.0, 1, 2, 24), 1000.0);
    let record = record("surface = \"as_drawn\"", 300, &round);
    let count = |kind: &str| record.edges.iter().filter(|edge| edge.kind == kind).count();
    assert_eq!((count("edge"), count("seam")), (2, 22), "24 are stored, the strongest");
    let ball = shapes::scaled(&shapes::icosphere(8), 1000.0);
    let record = self::record("surface = \"as_drawn\"", 1300, &ball);
    assert_eq!(record.voltage_cases[0].maxima[0].kind, "seam");
}

/// Two sheets that touch are one conductor, and its rims are still rims.
#[test]
fn rims_of_joined_sheets_are_kept() {
    let pair = [[0.0; 3], [1.0, 0.0, 0.0]].map(|by| shapes::moved(&shapes::rect_sheet(1.0, 1.0, 2, 2), by));
    let bonds = [vec!["a".to_owned(), "b".to_owned()]];
    let assembly = solving::assembled(&solving::sheets(pair), &bonds, None);
    let panels = amberskin::panel::build(std::sync::Arc::new(assembly), None);
    assert!(6 <= edges::edges(&panels).len());
}

#[test]
fn a_radius_that_is_not_small_is_told() {
    let told = |radius: &str| {
        let cube = shapes::scaled(&shapes::cuboid([1.0; 3], 1), 1000.0);
        let record = record(&format!("edge_radius = {radius}"), 300, &cube);
        record.findings.iter().any(|finding| finding.code == "edge_radius_not_small")
    };
    assert!(told("\"30 cm\""));
    assert!(!told("10"));
}

/// Two cubes bonded face to face are one bar: the edges of the contact are buried, and the four long edges run through.
#[test]
fn edges_inside_bonded_metal_are_left_out() {
    let pair = [[0.0; 3], [1.0, 0.0, 0.0]].map(|by| shapes::moved(&shapes::cuboid([1.0; 3], 1), by));
    let bodies = solving::solids(pair);
    let bonds = [vec!["a".to_owned(), "b".to_owned()]];
    let assembly = solving::assembled(&bodies, &bonds, None);
    let panels = amberskin::panel::build(std::sync::Arc::new(assembly), None);
    let found = edges::edges(&panels);
    assert_eq!(found.len(), 16, "eight beside each contact-free end and four on each cube along it");
    let on_contact =
        |edge: &Edge| edge.segments.iter().all(|s| s.ends.iter().all(|x| (x.x - 0.5).abs() < 1e-6));
    assert!(!found.iter().any(on_contact));
    assert!(found.iter().all(|edge| (edge.segments[0].angle - 0.5 * PI).abs() < 0.01));
}

/// A small block on a large plate: the edge of the block at the contact is an inner one.
#[test]
fn inner_edges_of_joined_bodies_are_left_out() {
    let block = shapes::moved(&shapes::cuboid([0.4; 3], 1), [0.0, 0.0, 0.7]);
    let bodies = solving::solids([shapes::cuboid([1.0; 3], 1), block]);
    let assembly = solving::assembled(&bodies, &[vec!["a".to_owned(), "b".to_owned()]], None);
    let panels = amberskin::panel::build(std::sync::Arc::new(assembly), None);
    let found = edges::edges(&panels);
    assert_eq!(found.iter().filter(|edge| edge.body == 0).count(), 12);
    assert_eq!(found.iter().filter(|edge| edge.body == 1).count(), 8);
}
