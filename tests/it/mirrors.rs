//! Mirrors and several earth planes: the part with its images is the whole drawn out (method of images).
use crate::reference::TestBody;
use crate::shapes;
use crate::shapes::Facet;
use crate::solving;
use crate::solving::Asked;
use amberskin::base::ImagePlane;
use amberskin::base::Images;
use amberskin::base::ImagesError;
use amberskin::base::Plane;
use amberskin::base::PlaneKind;
use amberskin::base::Vec3;
use amberskin::mesh::accept;
use amberskin::mesh::whole;
use amberskin::operator::Sources;
use amberskin::physics::look;
use amberskin::physics::look::Map;
use amberskin::physics::look::Medium;
use amberskin::physics::solved::Solved;
use amberskin::report::csv;
use amberskin::report::netlist;
use std::f64::consts::PI;

/// One round on the facets as they are.
const ONE_ROUND: Asked = Asked { demand: 1e9, max_panels: usize::MAX };

fn plane(kind: PlaneKind, facing: Vec3) -> ImagePlane {
    ImagePlane { plane: Plane { through: Vec3::zeros(), facing }, kind }
}

/// A drawn part, and which of the planes it meets, by number.
struct Drawn {
    facets: Vec<Facet>,
    sheet: bool,
    meets: Vec<usize>,
}

fn reflected(facets: &[Facet], plane: &Plane) -> Vec<Facet> {
    shapes::flipped(&shapes::mapped(facets, |x| plane.mirror(x)))
}

/// The whole drawn out without images: bodies, and for each the part it comes from, its potential over that
/// of the part, and whether it is a copy by even mirrors only.
fn drawn_out(parts: &[Drawn], planes: &[ImagePlane]) -> (Vec<TestBody>, Vec<(usize, f64, bool)>) {
    let (mut bodies, mut origin) = (Vec::new(), Vec::new());
    for (k, part) in parts.iter().enumerate() {
        let cap =
            |f: &Facet| part.meets.iter().any(|n| f.iter().all(|x| planes[*n].plane.height(x).abs() < 1e-12));
        let mut joined: Vec<Facet> = part.facets.iter().filter(|f| !cap(f)).copied().collect();
        for n in &part.meets {
            joined.extend(reflected(&joined, &planes[*n].plane));
        }
        let mut copies = vec![(joined, 1.0, true)];
        for (_, p) in planes.iter().enumerate().filter(|(n, _)| !part.meets.contains(n)) {
            let more: Vec<_> = copies
                .iter()
                .map(|(f, sign, even)| {
                    (reflected(f, &p.plane), sign * p.kind.sign(), *even && p.kind == PlaneKind::Even)
                })
                .collect();
            copies.extend(more);
        }
        for (facets, sign, even) in copies {
            bodies.push(solving::body(&format!("{k} {}", bodies.len()), facets, part.sheet));
            origin.push((k, sign, even));
        }
    }
    (bodies, origin)
}

/// The part with images against the whole drawn out: every entry, every bar, the count of panels.
fn compare(parts: &[Drawn], planes: &[ImagePlane]) -> (Solved, Solved) {
    let drawn: Vec<TestBody> = parts
        .iter()
        .enumerate()
        .map(|(k, p)| solving::body(&format!("part {k}"), p.facets.clone(), p.sheet))
        .collect();
    let part = solving::solve_as_drawn(&drawn, Images::new(planes.to_vec()).unwrap(), ONE_ROUND);
    let (bodies, origin) = drawn_out(parts, planes);
    let full = solving::solve_as_drawn(&bodies, None, ONE_ROUND);
    assert_eq!(full.panels.len(), part.panels.len() << planes.len(), "panels");
    let weight = |k: usize, of: &dyn Fn(&(usize, f64, bool)) -> f64| -> Vec<f64> {
        origin.iter().map(|o| if o.0 == k { of(o) } else { 0.0 }).collect()
    };
    for i in 0..parts.len() {
        for j in 0..parts.len() {
            let u = weight(i, &|o| if o.2 { 1.0 } else { 0.0 });
            let v = weight(j, &|o| o.1);
            let (expected, _) = solving::combination(&full, &u, &v);
            let scale = (part.matrix[i][i] * part.matrix[j][j]).sqrt();
            let found = part.matrix[i][j];
            assert!((found - expected).abs() <= 1e-9 * scale, "{i} {j}: {found:e}, drawn out {expected:e}");
            // Both sides of a bar are seen with their copies: an odd one counts as a copy of the field.
            let all = weight(i, &|o| o.1);
            let share = u.iter().sum::<f64>() / all.iter().map(|w| w.abs()).sum::<f64>();
            let (bar, exact) =
                (part.bars().0[i][j].discretisation, full.bar(&all, &v).discretisation * share);
            assert!((bar - exact).abs() <= 1e-6 * exact, "bar of {i} {j}: {bar:e}, drawn out {exact:e}");
        }
    }
    (part, full)
}

/// A quarter of a ball about the origin, closed by two flat caps in x = 0 and y = 0.
fn quarter_ball(radius: f64) -> Vec<Facet> {
    let ball = shapes::scaled(&shapes::meridian_sphere(10, 20), radius);
    let snapped = shapes::mapped(&ball, |x| x.map(|c| if c.abs() < 1e-12 { 0.0 } else { c }));
    let front = |f: &&Facet| f.iter().all(|x| 0.0 <= x.x && 0.0 <= x.y);
    let mut facets: Vec<Facet> = snapped.iter().filter(front).copied().collect();
    let onto_axis = |x: &Vec3| Vec3::new(0.0, 0.0, x.z);
    let mut caps: Vec<Facet> = Vec::new();
    for f in &facets {
        for k in 0..3 {
            let (a, b) = (f[k], f[(k + 1) % 3]);
            let in_cap = (0..2).any(|c| a[c].abs() + b[c].abs() <= 0.0);
            if in_cap {
                let quad = [[b, a, onto_axis(&a)], [b, onto_axis(&a), onto_axis(&b)]];
                caps.extend(quad.iter().filter(|t| 1e-9 < (t[1] - t[0]).cross(&(t[2] - t[0])).norm()));
            }
        }
    }
    facets.extend(caps);
    facets
}

fn block(lo: [f64; 3], hi: [f64; 3], n: usize) -> Vec<Facet> {
    let (lo, hi) = (Vec3::from(lo), Vec3::from(hi));
    let middle = (lo + hi) * 0.5;
    shapes::moved(&shapes::cuboid((hi - lo).into(), n), middle.into())
}

fn quarter_plate(z: f64) -> Vec<Facet> {
    shapes::moved(&shapes::rect_sheet(1.0, 0.8, 8, 8), [0.5, 0.4, z])
}

/// Ball and sheet meet both mirrors, the block one of them, the small ball none.
fn quarter_model() -> Vec<Drawn> {
    let ball = shapes::moved(&shapes::scaled(&shapes::icosphere(3), 0.3), [1.6, 1.7, 0.5]);
    vec![
        Drawn { facets: quarter_ball(0.8), sheet: false, meets: vec![0, 1] },
        Drawn { facets: block([0.0, 1.2, -0.3], [0.6, 1.6, 0.2], 3), sheet: false, meets: vec![0] },
        Drawn { facets: ball, sheet: false, meets: vec![] },
        Drawn { facets: quarter_plate(1.3), sheet: true, meets: vec![0, 1] },
    ]
}

#[test]
fn a_quarter_model_is_the_full_one_at_a_quarter_of_the_panels() {
    let planes = [plane(PlaneKind::Even, Vec3::x()), plane(PlaneKind::Even, Vec3::y())];
    let (part, full) = compare(&quarter_model(), &planes);
    // The halves of a smooth body have no edge in the mirror: normals and creases are those of the whole.
    let whole_ball = &part.panels.assembly.bodies[0].surface;
    assert!(whole_ball.creases.is_empty(), "{:?}", whole_ball.creases);
    // A place and its images see the same, in front of the mirrors and behind them.
    let (volts, x) = ([1.0, -0.4, 0.3, 0.0], Vec3::new(0.9, 0.7, 0.8));
    let places = [x, Vec3::new(-x.x, x.y, x.z), Vec3::new(-x.x, -x.y, x.z)];
    let seen = look::look(&part, &Sources::build(&part.panels), &Map::new(&part.panels), &volts, &places);
    let all: Vec<f64> = full_volts(&full, &volts);
    let exact = look::look(&full, &Sources::build(&full.panels), &Map::new(&full.panels), &all, &places);
    for (seen, exact) in seen.iter().zip(&exact) {
        assert!((seen.potential - exact.potential).abs() <= 1e-9, "{seen:?} {exact:?}");
        assert!((seen.field - exact.field).norm() <= 1e-9, "{seen:?} {exact:?}");
    }
}

/// Potentials of the rows of the whole from those of the parts; row names begin with the part's number.
fn full_volts(full: &Solved, volts: &[f64]) -> Vec<f64> {
    let of = |name: &str| volts[name.split(' ').next().unwrap().parse::<usize>().unwrap()];
    full.panels.assembly.rows.iter().map(|row| of(&row.name)).collect()
}

#[test]
fn even_and_odd_mirrors_and_an_earth_plane_go_together() {
    let parts = vec![
        Drawn { facets: block([0.0, 0.5, 0.3], [0.6, 1.1, 0.8], 4), sheet: false, meets: vec![0] },
        Drawn {
            facets: shapes::moved(&shapes::scaled(&shapes::icosphere(3), 0.3), [1.2, 0.7, 0.9]),
            sheet: false,
            meets: vec![],
        },
    ];
    let [x, y, z] = [Vec3::x(), Vec3::y(), Vec3::z()];
    compare(&parts, &[plane(PlaneKind::Even, x), plane(PlaneKind::Odd, y), plane(PlaneKind::Earth, z)]);
    compare(&parts, &[plane(PlaneKind::Even, x), plane(PlaneKind::Earth, y), plane(PlaneKind::Earth, z)]);
}

/// A ball in the corner of two earth planes, far off: C = 4πε₀R (1 + R/2a + R/2b − R/(2√(a²+b²)) + …), by the
/// potentials of the three images at distances 2a, 2b and 2√(a²+b²) (Jackson, section 2.1), here with the
/// first correction squared as the only term of second order.
#[test]
fn a_ball_far_from_two_earth_planes() {
    let (a, b) = (20.0, 30.0);
    let ball = shapes::moved(&shapes::icosphere(6), [a, b, 0.0]);
    let planes = vec![plane(PlaneKind::Earth, Vec3::x()), plane(PlaneKind::Earth, Vec3::y())];
    let far = solving::solve(&solving::solids([ball.clone()]), Images::new(planes).unwrap(), ONE_ROUND);
    let free = solving::solve(&solving::solids([ball]), None, ONE_ROUND);
    let ratio = far.matrix[0][0] / free.matrix[0][0];
    let shift = 0.5 / a + 0.5 / b - 0.5 / f64::hypot(a, b);
    let expected = 1.0 / (1.0 - shift);
    assert!((ratio - expected).abs() < 2e-5, "{ratio} against {expected}");
    assert!((free.matrix[0][0] / (4.0 * PI * amberskin::base::si::EPS0) - 1.0).abs() < 1e-3);
}

#[test]
fn planes_without_a_finite_set_of_images_are_refused() {
    let even = |facing: [f64; 3]| plane(PlaneKind::Even, Vec3::from(facing).normalize());
    let [x, y, z] = [even([1.0, 0.0, 0.0]), even([0.0, 1.0, 0.0]), even([0.0, 0.0, 1.0])];
    assert_eq!(
        Images::new(vec![x, even([-1.0, 0.0, 0.0])]),
        Err(ImagesError::Parallel { first: 0, second: 1 })
    );
    assert_eq!(
        Images::new(vec![x, y, even([0.0, 1.0, 1.0])]),
        Err(ImagesError::Oblique { first: 1, second: 2, degrees: 45.0 })
    );
    // In three dimensions a fourth is never at right angles to all.
    assert!(Images::new(vec![x, y, z, even([1.0, 1.0, 1.0])]).is_err());
    assert_eq!(Images::new(vec![x, y, z]).unwrap().reflections().len(), 7);
}

/// What lies in an even mirror closes the part; what crosses one has no meaning.
#[test]
fn bodies_at_an_even_mirror() {
    let images = Images::new(vec![plane(PlaneKind::Even, Vec3::x())]).unwrap();
    let whole = |facets: &[Facet], sheet: bool| {
        let (surface, _) = accept::body(facets, sheet, "a").unwrap();
        whole::whole(surface, &images, "a")
    };
    let code = |facets: &[Facet], sheet: bool| whole(facets, sheet).unwrap_err()[0].code;
    assert_eq!(code(&block([-0.1, 0.0, 0.0], [1.0; 3], 1), false), "crosses_mirror");
    assert_eq!(code(&block([-2.0, 0.0, 0.0], [-1.0, 1.0, 1.0], 1), false), "behind_mirror");
    let upright = shapes::turned(&shapes::rect_sheet(1.0, 1.0, 2, 2), [0.0, 1.0, 0.0], 0.5 * PI);
    let upright = shapes::mapped(&upright, |x| Vec3::new(0.0, x.y, x.z));
    assert_eq!(code(&upright, true), "sheet_in_mirror");
    let (surface, findings) = whole(&block([0.0; 3], [1.0; 3], 2), false).unwrap();
    let facets: Vec<Facet> =
        surface.welded.facets.iter().map(|f| f.map(|k| surface.welded.points[k as usize])).collect();
    assert!((shapes::volume(&facets) - 2.0).abs() < 1e-12, "twice the cube");
    assert_eq!((shapes::open_edges(&facets), findings[0].code), (0, "cap_in_mirror"));
    // Touching along an edge only, or standing clear: two bodies, one the copy of the other.
    let edge = shapes::turned(&block([0.0; 3], [1.0; 3], 1), [0.0, 0.0, 1.0], -0.25 * PI);
    assert_eq!(whole(&edge, false).unwrap().0.welded.facets.len(), 12);
}

/// A body on an odd mirror would touch its copy at the opposite potential.
#[test]
fn a_body_on_an_odd_mirror_is_earthed_or_refused() {
    let images = Images::new(vec![plane(PlaneKind::Odd, Vec3::z())]).unwrap();
    let bodies = |bonds: &[Vec<String>]| {
        let surface = accept::body(&block([0.0; 3], [1.0; 3], 2), false, "a").unwrap().0;
        let foot = amberskin::mesh::Body { name: "a".to_owned(), surface };
        amberskin::mesh::assembly::expose(vec![foot], bonds, &images)
    };
    let refused = bodies(&[]).unwrap_err();
    assert!(
        refused.iter().any(|f| f.code == "meets_mirror" && f.text.contains("opposite potential")),
        "{refused:?}"
    );
    let bonded = bodies(&[vec!["a".to_owned(), "earth".to_owned()]]).unwrap();
    let area: f64 = bonded.pieces.iter().map(|p| amberskin::geom::Triangle::new(p.corners).area()).sum();
    assert!((area - 5.0).abs() < 1e-9 && bonded.rows.is_empty(), "{area}");
}

/// Behind an odd mirror stands the copy at the opposite potential.
#[test]
fn looks_behind_mirrors() {
    let ball = shapes::moved(&shapes::icosphere(4), [0.0, 0.0, 2.0]);
    let images = |kind| Images::new(vec![plane(kind, Vec3::z())]).unwrap();
    let x = Vec3::new(0.3, 0.2, 0.5);
    let places = [x, Vec3::new(x.x, x.y, -x.z), Vec3::new(0.0, 0.0, -2.0)];
    let seen = |kind| {
        let solved = solving::solve(&solving::solids([ball.clone()]), images(kind), ONE_ROUND);
        let map = Map::new(&solved.panels);
        let media: Vec<Medium> = places.iter().map(|x| map.medium(x)).collect();
        (look::look(&solved, &Sources::build(&solved.panels), &map, &[1.0], &places), media)
    };
    let (odd, media) = seen(PlaneKind::Odd);
    assert!((odd[0].potential + odd[1].potential).abs() < 1e-12 && (odd[2].potential + 1.0).abs() < 1e-12);
    assert_eq!(media[1..], [Medium::Surroundings, Medium::Opposite(0)]);
    let (even, media) = seen(PlaneKind::Even);
    assert!((even[0].potential - even[1].potential).abs() < 1e-12 && (even[2].potential - 1.0).abs() < 1e-12);
    assert_eq!(media[2], Medium::Metal(0));
    assert!(
        (even[0].field.z + even[1].field.z).abs() < 1e-12 && (odd[0].field.z - odd[1].field.z).abs() < 1e-12
    );
    let (earth, media) = seen(PlaneKind::Earth);
    assert!(
        (earth[0].potential - odd[0].potential).abs() < 1e-15,
        "in front an odd mirror is an earth plane"
    );
    assert_eq!(media[1], Medium::BehindEarth);
}

/// A quarter of a box between two even mirrors, over an odd one: the record names part and whole.
#[test]
fn the_record_names_the_part_and_the_whole() {
    let text = r#"
[units]
length = "m"
[[mirror]]
name = "left"
through = [0, 0, 0]
facing = [1, 0, 0]
parity = "even"
[[mirror]]
name = "front"
through = [0, 0, 0]
facing = [0, 1, 0]
parity = "even"
[[electrode]]
name = "box"
shape = "box.stl"
[[electrode]]
name = "ball"
shape = "ball.stl"
role = "floating"
[[voltage_case]]
name = "v"
value_is = "dc"
potentials = { box = "1 V" }
[accuracy]
capacitance = "1 %"
"#;
    let quarter = block([0.0; 3], [0.5; 3], 2);
    let ball = shapes::moved(&shapes::scaled(&shapes::icosphere(3), 0.2), [1.0, 1.0, 0.3]);
    let record = solved_case(text, &[quarter, ball]);
    assert!((record.part_of_whole.factor - 4.0).abs() < 1e-15, "two even mirrors");
    assert!(record.part_of_whole.text.contains("4 times those of the part"), "{}", record.part_of_whole.text);
    let (whole, part) = (&record.capacitance_farad, &record.part_capacitance_farad);
    assert!((whole[0][0] / part[0][0] - 4.0).abs() < 1e-15);
    for text in printed(&record) {
        assert!(text.contains("part and whole: an electrode is the part drawn"), "{text}");
    }
    let v = &record.voltage_cases[0];
    let charge = v.charges_coulomb["box"];
    assert!((2.0 * v.energy_joule - charge).abs() <= 1e-12 * charge, "½ Q V of the whole");
    assert!(record.checks.iter().all(|check| check.pass), "{:?}", record.checks);
    let size = record.parts[0].size_metre;
    assert!(size.iter().all(|c| (c - 0.5).abs() < 1e-12), "of the part: {size:?}");
    // The box alone, 1 × 1 × 0.5 drawn out, and four balls, against the same without mirrors.
    let full = text.replace("facing", "# facing").replace("[[mirror]]", "[[earth_plane]]");
    let head = full.find("[[earth_plane]]").unwrap();
    let rest = full.find("[[electrode]]").unwrap();
    let full = format!("{}{}", &full[..head], &full[rest..]).replace(
        "[[voltage_case]]",
        "[[copies]]\nof = \"ball\"\ncount = 4\nrotate = { axis = [0, 0, 1] }\n[[voltage_case]]",
    );
    let box_whole = block([-0.5, -0.5, 0.0], [0.5; 3], 2);
    let ball = shapes::moved(&shapes::scaled(&shapes::icosphere(3), 0.2), [1.0, 1.0, 0.3]);
    let drawn = solved_case(&full, &[box_whole, ball]);
    let bars = record.capacitance_bar_farad[0][0] + drawn.capacitance_bar_farad[0][0];
    assert!((whole[0][0] - drawn.capacitance_farad[0][0]).abs() <= bars, "{:e}", whole[0][0]);
    let balls: f64 = drawn.capacitance_farad[0][1..].iter().sum();
    let bars = record.capacitance_bar_farad[0][1] + drawn.capacitance_bar_farad[0][1..].iter().sum::<f64>();
    assert!((whole[0][1] - balls).abs() <= bars, "{:e} and {balls:e}", whole[0][1]);
}

fn solved_case(text: &str, files: &[Vec<Facet>]) -> amberskin::record::Record {
    let case = amberskin::case::parse(text, std::path::Path::new("c.toml")).unwrap_or_else(|e| panic!("{e}"));
    let file = |(path, facets): (&String, &Vec<Facet>)| amberskin::case::ShapeFile {
        path: path.clone(),
        bytes: shapes::binary_stl(facets),
    };
    let shapes = amberskin::case::Shapes { files: case.shape_paths.iter().zip(files).map(file).collect() };
    amberskin::study::run(&case, &shapes, &|_| {}).unwrap_or_else(|e| panic!("{e:?}")).record
}

/// What is handed over: netlist and both layouts of the matrix.
fn printed(record: &amberskin::record::Record) -> [String; 3] {
    let options = netlist::Options { name: "part".to_owned(), bleeds: false };
    let mut out: [Vec<u8>; 3] = Default::default();
    netlist::write(record, &options, &mut out[0]).unwrap();
    csv::square(record, csv::Form::Maxwell, &mut out[1]).unwrap();
    csv::long(record, &mut out[2]).unwrap();
    out.map(|bytes| String::from_utf8(bytes).unwrap())
}
