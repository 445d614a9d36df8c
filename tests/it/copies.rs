//! Repeated electrodes: named one by one, and in a full ring solved from one sector.
use crate::shapes;
use crate::shapes::Facet;
use crate::solving;
use amberskin::adapt;
use amberskin::base::ImagePlane;
use amberskin::base::Images;
use amberskin::base::Motion;
use amberskin::base::Plane;
use amberskin::base::PlaneKind;
use amberskin::base::Vec3;
use amberskin::case;
use amberskin::case::ShapeFile;
use amberskin::case::Shapes;
use amberskin::panel;
use amberskin::panel::Panels;
use amberskin::panel::Ring;
use amberskin::panel::ring;
use amberskin::physics::solved;
use amberskin::physics::solved::Solved;
use amberskin::record::Record;
use amberskin::study;
use std::f64::consts::TAU;
use std::path::Path;
use std::sync::Arc;

fn turn(count: usize) -> Motion {
    Motion::Turn { through: Vec3::new(0.1, 0.0, 0.0), axis: Vec3::z(), angle: TAU / count as f64 }
}

/// `count` blocks and `count` balls around an axis, panels in sectors, cut once where they are largest.
fn ring_of(count: usize, images: &Images) -> Panels {
    let block = shapes::moved(&shapes::cuboid([0.5, 0.3, 0.6], 2), [1.6, 0.2, 0.0]);
    let ball = shapes::moved(&shapes::scaled(&shapes::icosphere(2), 0.2), [0.8, 0.0, 0.7]);
    let turned = |facets: &[Facet], s: usize| {
        let motion = turn(count).times(s);
        shapes::mapped(facets, |x| motion.point(x))
    };
    let all = (0..count).map(|s| turned(&block, s)).chain((0..count).map(|s| turned(&ball, s)));
    let bodies: Vec<_> =
        all.enumerate().map(|(k, facets)| solving::body(&format!("{k}"), facets, false)).collect();
    let assembly = solving::assembled(&bodies, &[], images);
    let rows: Vec<Vec<u32>> = assembly.rows.iter().map(|row| row.bodies.clone()).collect();
    let sectors = (0..count as u32).map(|s| vec![s, count as u32 + s]).collect();
    let ring = Ring::new(turn(count), sectors, &rows, images).unwrap();
    let panels = ring::arranged(&panel::build(Arc::new(assembly), images), ring).unwrap();
    let start = adapt::start(60, None, panels);
    // One cut in one sector is made in all.
    let cut = adapt::bisect(&start, &[(start.distinct() + 3, 1), (start.distinct() * 2 + 7, 0)]);
    assert_eq!(cut.len(), start.len() + 2 * count, "two cuts a sector");
    cut
}

fn assert_same(ring: &Solved, plain: &Solved) {
    let n = ring.n_rows();
    let (bars, plain_bars) = (ring.bars(), plain.bars());
    for i in 0..n {
        for j in 0..n {
            let scale = (plain.matrix[i][i] * plain.matrix[j][j]).sqrt();
            let apart = (ring.matrix[i][j] - plain.matrix[i][j]).abs();
            assert!(apart <= 1e-9 * scale, "entry {i} {j} differs by {:e}", apart / scale);
            let (a, b) = (bars.0[i][j].discretisation, plain_bars.0[i][j].discretisation);
            assert!((a - b).abs() <= 1e-6 * b, "bar {i} {j}: {a:e} and {b:e}");
        }
        let (a, b) = (bars.1[i].discretisation, plain_bars.1[i].discretisation);
        assert!((a - b).abs() <= 1e-6 * b, "earth bar {i}: {a:e} and {b:e}");
        for p in 0..ring.panels.len() {
            let largest = plain.charges.density[i].iter().fold(0.0, |top: f64, s| top.max(s.abs()));
            let apart = (ring.charges.density[i][p] - plain.charges.density[i][p]).abs();
            // Small panels carry rounding of the kernel that the matrix averages out.
            assert!(apart <= 1e-7 * largest, "density of row {i} on panel {p} differs by {apart:e}");
            for (a, b) in ring.residuals.at[i][p].iter().zip(&plain.residuals.at[i][p]) {
                assert!((a - b).abs() <= 1e-9, "residual of row {i} on panel {p}: {a:e} and {b:e}");
            }
        }
    }
}

/// One block column and Fourier blocks give what the full matrix gives: an even and an odd count of sectors,
/// over an earth plane and an even mirror across the axis.
#[test]
fn a_ring_is_solved_as_its_full_matrix() {
    let plane =
        |kind, z: f64, facing: Vec3| ImagePlane { plane: Plane { through: Vec3::z() * z, facing }, kind };
    let floor = Images::new(vec![plane(PlaneKind::Earth, -1.0, Vec3::z())]).unwrap();
    let lid = Images::new(vec![plane(PlaneKind::Even, 1.5, -Vec3::z())]).unwrap();
    for (count, images) in [(6, Images::none()), (5, floor), (4, lid)] {
        let panels = ring_of(count, &images);
        let plain = solved::solve(Panels { ring: None, ..panels.clone() }, 1.0).unwrap();
        assert_same(&solved::solve(panels, 1.0).unwrap(), &plain);
    }
}

/// A ring refined by its estimate stays a ring and within the limit on panels.
#[test]
fn a_ring_is_refined_in_all_sectors_alike() {
    let panels = ring_of(6, &Images::none());
    let most = panels.len() * 2;
    let limits = adapt::Limits { max_panels: Some(most), time: None, memory: 4e9 };
    let demand = adapt::Demand { capacitance: 1e-9, field: None };
    let finished = adapt::run(panels, 1.0, demand, &limits, &|_| {}).unwrap();
    let refined = &finished.solved.panels;
    assert!(refined.len() <= most && most - 6 < refined.len(), "{} of {most}", refined.len());
    let m = refined.distinct();
    for p in 0..refined.len() {
        assert_eq!(refined.bary[p], refined.bary[p % m], "panel {p}");
    }
    assert_same(&finished.solved, &solved::solve(Panels { ring: None, ..refined.clone() }, 1.0).unwrap());
}

#[test]
fn what_is_no_ring_says_why() {
    let rows: Vec<Vec<u32>> = (0..4).map(|k| vec![k]).collect();
    let sectors: Vec<Vec<u32>> = (0..4).map(|k| vec![k]).collect();
    let ring = |rows: &[Vec<u32>], images: &Images| Ring::new(turn(4), sectors.clone(), rows, images);
    assert!(ring(&rows, &Images::none()).is_ok());
    let side = Images::from(Some(Plane { through: Vec3::x() * -9.0, facing: Vec3::x() }));
    assert!(ring(&rows, &side).unwrap_err().contains("across the axis"));
    let joined = [vec![0, 1], vec![2], vec![3]];
    assert!(ring(&joined, &Images::none()).unwrap_err().contains("bonds"));
    assert!(ring(&[vec![0, 1, 2, 3]], &Images::none()).unwrap_err().contains("one conductor"));
    let more: Vec<Vec<u32>> = (0..5).map(|k| vec![k]).collect();
    assert!(ring(&more, &Images::none()).unwrap_err().contains("not copied"));
}

fn solved_case(text: &str, files: &[(&str, Vec<Facet>)]) -> Record {
    let case = case::parse(text, Path::new("c.toml")).unwrap_or_else(|error| panic!("{error}"));
    let files = case.shape_paths.iter().map(|path| {
        let (_, facets) = files.iter().find(|(name, _)| name == path).unwrap();
        ShapeFile { path: path.clone(), bytes: shapes::binary_stl(facets) }
    });
    let shapes = Shapes { files: files.collect() };
    study::run(&case, &shapes, &|_| {}).unwrap_or_else(|error| panic!("{error:?}")).record
}

/// Segments of a split ring: 24 copies give a circulant matrix, and every copy is named.
#[test]
fn a_ring_of_segments_has_a_circulant_matrix() {
    let text = r#"
[units]
length = "m"
[[electrode]]
name = "segment"
shape = "segment.stl"
[[copies]]
of = "segment"
count = 24
rotate = { axis = [0, 0, 1] }
[[voltage_case]]
name = "one"
value_is = "dc"
potentials = { segment = "0 V", "segment.3" = "1 V" }
[accuracy]
capacitance = "20 %"
"#;
    let segment = shapes::moved(&shapes::cuboid([0.05, 0.2, 0.2], 2), [1.0, 0.0, 0.0]);
    let record = solved_case(text, &[("segment.stl", segment)]);
    let c = &record.capacitance_farad;
    assert_eq!(record.electrodes[2], "segment.3");
    assert_eq!(record.effort.method, "dense blocks of a ring");
    for i in 0..24 {
        for j in 0..24 {
            let apart = (c[i][j] - c[0][(j + 24 - i) % 24]).abs();
            assert!(apart <= 1e-9 * c[0][0], "{i} {j} differs by {apart:e}");
            // The ring is its own mirror image, too.
            assert!((c[0][j] - c[0][(24 - j) % 24]).abs() <= record.capacitance_bar_farad[0][j], "{j}");
        }
    }
    let potentials = &record.voltage_cases[0].potentials_volt;
    assert_eq!((potentials["segment.3"], potentials["segment.4"]), (1.0, 0.0));
    assert!(record.checks.iter().all(|check| check.pass), "{:?}", record.checks);
}

/// Steps, part rings and rings with company are electrodes of their own, as if each were drawn.
#[test]
fn copies_without_a_full_ring_are_plain_electrodes() {
    let block = shapes::cuboid([0.3, 0.2, 0.4], 3);
    let head = "[units]\nlength = \"m\"\n[accuracy]\ncapacitance = \"20 %\"\n";
    let electrode =
        |name: &str, shape: &str| format!("[[electrode]]\nname = \"{name}\"\nshape = \"{shape}\"\n");
    let stepped =
        format!("{head}{}[[copies]]\nof = \"b\"\ncount = 3\nstep = [0, 0, 0.75]\n", electrode("b", "0"));
    let moved = |k: f64| shapes::moved(&block, [0.0, 0.0, 0.75 * k]);
    let drawn = format!("{head}{}{}{}", electrode("a", "0"), electrode("b", "1"), electrode("c", "2"));
    let one = solved_case(&stepped, &[("0", block.clone())]);
    let three = solved_case(&drawn, &[("0", block.clone()), ("1", moved(1.0)), ("2", moved(2.0))]);
    assert_eq!(one.electrodes, ["b.1", "b.2", "b.3"]);
    for (a, b) in one.capacitance_farad.iter().flatten().zip(three.capacitance_farad.iter().flatten()) {
        // Corners of the drawn ones are rounded to single precision.
        assert!((a - b).abs() <= 1e-6 * three.capacitance_farad[0][0], "{a:e} and {b:e}");
    }
    let why =
        |record: &Record| record.findings.iter().find(|f| f.code == "copies_expanded").unwrap().text.clone();
    assert!(why(&one).contains("do not close a full turn"), "{}", why(&one));
    let away = shapes::moved(&block, [2.0, 0.0, 0.0]);
    let company = format!(
        "{head}{}{}[[copies]]\nof = \"b\"\ncount = 2\nrotate = {{ axis = [0, 0, 1] }}\n",
        electrode("b", "0"),
        electrode("rod", "1")
    );
    let record = solved_case(&company, &[("0", away), ("1", block)]);
    assert_eq!(record.electrodes, ["b.1", "b.2", "rod"]);
    assert!(why(&record).contains("some electrodes are not copied"), "{}", why(&record));
    let c = &record.capacitance_farad;
    let bar = record.capacitance_bar_farad[0][0];
    assert!((c[0][0] - c[1][1]).abs() <= bar, "{:e} and {:e} within {bar:e}", c[0][0], c[1][1]);
}
