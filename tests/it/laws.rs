//! Laws of electrostatics that hold whatever the shape: scaling, order, mirror, images, nesting, medium,
//! bonds, Gauss; and of the program: any number of threads and any repetition give the same digits.
use crate::reference::TestBody;
use crate::shapes;
use crate::shapes::Facet;
use crate::solving;
use crate::solving::Asked;
use amberskin::adapt;
use amberskin::base::Plane;
use amberskin::base::Vec3;
use amberskin::case;
use amberskin::case::ShapeFile;
use amberskin::case::Shapes;
use amberskin::operator::Sources;
use amberskin::panel;
use amberskin::physics;
use amberskin::physics::field;
use amberskin::physics::look;
use amberskin::physics::look::Map;
use amberskin::physics::solved::Solved;
use amberskin::record::Record;
use amberskin::record::store;
use amberskin::study;
use std::f64::consts::PI;
use std::path::Path;
use std::sync::Arc;

/// One round on the facets as they are (or on 60 panels a body): the demand is met by anything.
const ONE_ROUND: Asked = Asked { demand: 1e9, max_panels: usize::MAX };

fn floor(z: f64) -> Option<Plane> {
    Some(Plane { through: Vec3::z() * z, facing: Vec3::z() })
}

/// A ball, a block and a sheet, none of them symmetric to another.
fn three_bodies() -> Vec<TestBody> {
    let ball = shapes::moved(&shapes::jittered_icosphere(3, 5), [0.0, 0.0, 1.5]);
    let block = shapes::turned(&shapes::cuboid([1.0, 0.7, 0.4], 1), [1.0, 2.0, 0.5], 0.6);
    let sheet = shapes::turned(&shapes::rect_sheet(1.5, 1.0, 2, 1), [1.0, 0.2, 0.1], 0.4);
    vec![
        solving::body("ball", ball, false),
        solving::body("block", shapes::moved(&block, [2.0, 0.3, 1.0]), false),
        solving::body("sheet", shapes::moved(&sheet, [0.2, -0.4, 3.5]), true),
    ]
}

fn mapped(bodies: &[TestBody], map: impl Fn(&[Facet]) -> Vec<Facet>) -> Vec<TestBody> {
    bodies.iter().map(|b| solving::body(&b.name, map(&b.facets), b.sheet)).collect()
}

#[track_caller]
fn assert_close(found: f64, exact: f64, abs_tol: f64) {
    assert!((found - exact).abs() <= abs_tol, "found {found:e}, exact {exact:e}, allowed {abs_tol:e}");
}

/// Every entry of `a` against `b`, relative to √(C_ii C_jj) of `b`.
#[track_caller]
fn assert_same_matrix(a: &[Vec<f64>], b: impl Fn(usize, usize) -> f64, rel_tol: f64) {
    for (i, row) in a.iter().enumerate() {
        for (j, c) in row.iter().enumerate() {
            assert_close(*c, b(i, j), rel_tol * (b(i, i) * b(j, j)).sqrt());
        }
    }
}

/// With a power of two nothing rounds but what the machine's logarithm and arc tangent see, which is
/// without unit; a wrong power of length or a hidden absolute tolerance breaks it, in the weld, in the
/// marks or in the fits.
#[test]
fn lengths_times_a_power_of_two_scale_capacitance_and_field_to_the_last_digits() {
    let s = 1.0 / 1024.0;
    let asked = Asked { demand: 1e-9, max_panels: 700 };
    let bodies = three_bodies();
    let one = solving::solve(&bodies, floor(-1.0), asked);
    let small = solving::solve(&mapped(&bodies, |f| shapes::scaled(f, s)), floor(-s), asked);
    assert_eq!(one.panels.len(), small.panels.len());
    assert_same_matrix(&small.matrix, |i, j| s * one.matrix[i][j], 1e-14);
    let peaks = |solved: &Solved| {
        field::peaks(
            solved,
            &Sources::build(&solved.panels),
            &[1.0, 0.0, -0.5],
            &solving::charge_bars(solved),
        )
    };
    for (small, one) in peaks(&small).iter().zip(&peaks(&one)) {
        assert_close(small.field * s, one.field, 1e-12 * one.field);
        assert_close(small.bar * s, one.bar, 1e-9 * one.field);
        assert!((small.at / s - one.at).norm() <= 1e-9, "{} and {}", small.at, one.at);
    }
}

#[test]
fn another_order_of_electrodes_permutes_the_matrix() {
    let bodies = three_bodies();
    let order = [2, 0, 1];
    let a = solving::solve(&bodies, floor(-1.0), ONE_ROUND);
    let turned: Vec<TestBody> = order.iter().map(|k| bodies[*k].clone()).collect();
    let b = solving::solve(&turned, floor(-1.0), ONE_ROUND);
    assert_same_matrix(&b.matrix, |i, j| a.matrix[order[i]][order[j]], 1e-9);
    let (bars_a, bars_b) = (a.bars().0, b.bars().0);
    for (i, row) in bars_b.iter().enumerate() {
        for (j, bar) in row.iter().enumerate() {
            let expected = bars_a[order[i]][order[j]].total();
            assert_close(bar.total(), expected, 1e-6 * expected);
        }
    }
}

#[test]
fn a_mirrored_assembly_has_the_same_matrix() {
    let bodies = three_bodies();
    let a = solving::solve(&bodies, None, ONE_ROUND);
    let b = solving::solve(&mapped(&bodies, shapes::mirrored), None, ONE_ROUND);
    assert_same_matrix(&b.matrix, |i, j| a.matrix[i][j], 1e-9);
}

/// A conductor over an earthed plane against itself and its mirror body at −V: charge and field are
/// those of the pair (Kelvin 1848; Smythe, Static and Dynamic Electricity, chapter 5).
#[test]
fn an_earth_plane_is_a_mirror_body_at_the_opposite_voltage() {
    let ball = shapes::moved(&shapes::jittered_icosphere(6, 9), [0.3, 0.0, 1.4]);
    let over = solving::solve(&solving::solids([ball.clone()]), floor(0.0), ONE_ROUND);
    let pair = solving::solve(&solving::solids([ball.clone(), shapes::mirrored(&ball)]), None, ONE_ROUND);
    let (c, p) = (over.matrix[0][0], &pair.matrix);
    assert_close(c, p[0][0] - p[0][1], 1e-6 * c);
    let peak = |solved: &Solved, v: &[f64]| {
        field::peaks(solved, &Sources::build(&solved.panels), v, &solving::charge_bars(solved))[0].field
    };
    let field = peak(&over, &[1.0]);
    assert_close(field, peak(&pair, &[1.0, -1.0]), 1e-6 * field);
}

/// All field lines of an electrode in a closed vessel end on the vessel.
#[test]
fn an_electrode_in_a_vessel_sees_nothing_but_the_vessel() {
    let inner = shapes::moved(&shapes::icosphere(5), [0.2, 0.0, -0.3]);
    let mut vessel = shapes::scaled(&shapes::icosphere(4), 2.6);
    vessel.extend(shapes::flipped(&shapes::scaled(&shapes::icosphere(6), 2.0)));
    let outside = shapes::moved(&shapes::icosphere(3), [0.0, 5.0, 0.0]);
    let bodies = solving::solids([inner, vessel, outside]);
    let assembly = solving::assembled(&bodies, &[], None);
    assert!(assembly.findings.iter().any(|f| f.code == "nested"), "{:?}", assembly.findings);
    let solved = solving::refined(assembly, None, Asked { demand: 5e-3, max_panels: 3000 }).solved;
    let c = &solved.matrix;
    let (bars, earth_bars) = solved.bars();
    assert_close(c[0].iter().sum(), 0.0, earth_bars[0].total());
    assert_close(c[0][1], -c[0][0], bars[0][0].total() + bars[0][1].total());
    assert_close(c[0][2], 0.0, bars[0][2].total());
    assert!(earth_bars[0].total() < 0.02 * c[0][0], "the bar of nothing is {:e} F", earth_bars[0].total());
    // From outside the vessel is a ball of metal: with the outer body far enough, over 4πε₀ R.
    assert!(4.0 * PI * physics::permittivity(1.0) * 2.6 * 0.98 < c[1][1] + c[0][0] + 2.0 * c[0][1]);
}

#[test]
fn permittivity_scales_capacitances_and_bars() {
    let bodies = three_bodies();
    let assembly = Arc::new(solving::assembled(&bodies, &[], None));
    let panels = adapt::at_least(solving::FIRST_PANELS, panel::build(assembly, None));
    let of = |eps_r: f64| physics::solved::solve(panels.clone(), eps_r).unwrap();
    let (vacuum, oil) = (of(1.0), of(2.25));
    assert_same_matrix(&oil.matrix, |i, j| 2.25 * vacuum.matrix[i][j], 1e-13);
    let (a, b) = (vacuum.bars().1[0].total(), oil.bars().1[0].total());
    assert_close(b, 2.25 * a, 1e-9 * b);
    // The field at given potentials does not know the medium.
    assert_eq!(field::normal_field(&oil, &[1.0; 3]), field::normal_field(&vacuum, &[1.0; 3]));
}

#[test]
fn bonded_boxes_that_touch_are_one_box() {
    let half = |z: f64| shapes::moved(&shapes::cuboid([1.0, 1.0, 0.5], 1), [0.0, 0.0, z]);
    let asked = Asked { demand: 2e-3, max_panels: 2500 };
    let halves = solving::solids([half(-0.25), half(0.25)]);
    let bonds = [vec!["a".to_owned(), "b".to_owned()]];
    let joined = solving::refined(solving::assembled(&halves, &bonds, None), None, asked).solved;
    let whole = solving::solve(&solving::solids([shapes::cuboid([1.0; 3], 1)]), None, asked);
    assert_eq!(joined.n_rows(), 1);
    let bar = joined.bars().0[0][0].total() + whole.bars().0[0][0].total();
    assert_close(joined.matrix[0][0], whole.matrix[0][0], bar);
}

/// 4πε₀ r φ far away is the charge; from both sides the dipole cancels and what is left falls with r⁻².
#[test]
fn from_far_away_the_charges_are_seen_as_their_sum() {
    let solved = solving::solve(&three_bodies(), None, Asked { demand: 5e-3, max_panels: 1500 });
    let volts = [1.0, -0.3, 0.6];
    let (far, sources) = (Vec3::new(1.0, 2.0, -2.0) * 1000.0, Sources::build(&solved.panels));
    let seen = look::look(&solved, &sources, &Map::new(&solved.panels), &volts, &[far, -far]);
    let unit = 4.0 * PI * physics::permittivity(1.0);
    let charge = unit * far.norm() * 0.5 * (seen[0].potential + seen[1].potential);
    let sum =
        |c: &[Vec<f64>]| c.iter().flat_map(|row| row.iter().zip(&volts).map(|(c, v)| c * v)).sum::<f64>();
    let raw = sum(&solved.capacitance.raw);
    assert_close(charge, raw, 1e-5 * raw.abs());
    let (corrected, bar) = solving::combination(&solved, &[1.0; 3], &volts);
    // The charges themselves, unlike the matrix, are of first order in what the panels miss.
    assert_close(charge, corrected, bar + 5e-3 * corrected.abs());
}

/// A ball that floats between a live block and the floor, small and drawn coarsely.
const CASE: &str = r#"
[units]
length = "mm"
capacitance = "pF"
field = "kV/mm"

[[earth_plane]]
name = "floor"
through = [0, 0, 0]
facing = [0, 0, 1]

[[electrode]]
name = "block"
shape = "block.stl"
role = "live"

[[electrode]]
name = "ball"
shape = "ball.stl"
role = "floating"

[[voltage_case]]
name = "10 kV"
value_is = "peak"
potentials = { block = "10 kV" }

[[look]]
name = "under the ball"
line = { from = [0, 0, 1], to = [0, 0, 19], points = 7 }

[accuracy]
capacitance = "1 %"
max_panels = 1200
"#;

fn record(threads: usize) -> Record {
    let mut case = case::parse(CASE, Path::new("law.toml")).unwrap();
    case.accuracy.threads = Some(threads);
    let ball = shapes::moved(&shapes::scaled(&shapes::jittered_icosphere(4, 3), 10.0), [0.0, 0.0, 30.0]);
    let block = shapes::moved(&shapes::cuboid([20.0, 16.0, 8.0], 1), [2.0, 0.0, 60.0]);
    let files = case.shape_paths.iter().map(|path| {
        let facets = if path == "ball.stl" { &ball } else { &block };
        ShapeFile { path: path.clone(), bytes: shapes::binary_stl(facets) }
    });
    let shapes = Shapes { files: files.collect() };
    study::run(&case, &shapes, &|_| {}).unwrap().record
}

/// The text of a record without what it cost, and without the count of threads asked for.
fn text(record: &Record) -> String {
    let mut bytes = Vec::new();
    store::write(record, &mut bytes).unwrap();
    let mut value: serde_json::Value = serde_json::from_slice(&bytes).unwrap();
    value.as_object_mut().unwrap().remove("effort").unwrap();
    let resolved = value["case"]["resolved"].as_object_mut().unwrap();
    resolved.retain(|key, _| !key.contains("threads"));
    value.to_string()
}

#[test]
fn one_thread_and_two_and_every_repetition_give_the_same_record() {
    let [one, two, again] = [1, 2, 2].map(record);
    assert!(1 < two.effort.rounds, "the law needs some refinement");
    assert_eq!(text(&two), text(&again));
    assert_eq!(text(&one), text(&two));
    assert_eq!(one.effort.history, two.effort.history);
}
