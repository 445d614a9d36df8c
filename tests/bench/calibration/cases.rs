//! The meshes of the study, with the exact values that are known of each.
use crate::kelvin;
use crate::kelvin::Ball;
use crate::reference;
use crate::reference::Row;
use crate::reference::TestBody;
use crate::reference::Wanted;
use crate::shapes;
use crate::shapes::Facet;
use crate::solving;
use amberskin::base::ImagePlane;
use amberskin::base::Images;
use amberskin::base::Plane;
use amberskin::base::PlaneKind;
use amberskin::base::Vec3;
use amberskin::base::si::EPS0;
use amberskin::mesh::stl;
use std::collections::BTreeMap;
use std::f64::consts::PI;
use std::fs;
use std::path::Path;

/// Potentials [V], and bodies with their highest field [V/m].
pub(crate) type Drive = (Vec<f64>, Vec<(usize, f64)>);

/// One mesh.
pub(crate) struct Case {
    /// What it is.
    pub(crate) name: String,
    /// Its conductors.
    pub(crate) bodies: Vec<TestBody>,
    /// Earth planes and mirrors.
    pub(crate) images: Images,
    /// Maxwell entries that are known [F].
    pub(crate) matrix: Vec<Vec<Option<f64>>>,
    /// Potentials [V], and the highest field of bodies at them [V/m].
    pub(crate) maxima: Vec<Drive>,
    /// Relative uncertainty of these values [1].
    pub(crate) uncertainty: f64,
}

const COULOMB: f64 = 4.0 * PI * EPS0;

/// Every mesh, in the order in which the halves take turns.
pub(crate) fn all() -> Vec<Case> {
    let mut cases = balls();
    cases.extend(ellipsoids());
    cases.extend(pairs());
    cases.extend(over_planes());
    cases.extend(triples());
    cases.extend(boxes());
    cases.extend(discs());
    cases.extend(half_models());
    cases.extend(rows());
    cases.extend(drawings());
    cases
}

fn odd(facets: &[Facet]) -> Vec<Facet> {
    shapes::turned(facets, [1.0, 2.0, 3.0], 0.7)
}

fn single(name: String, facets: Vec<Facet>, c: f64, field: Option<f64>) -> Case {
    let maxima = field.map(|field| (vec![1.0], vec![(0, field)])).into_iter().collect();
    let (bodies, images) = (solving::solids([facets]), Images::none());
    Case { name, bodies, images, matrix: vec![vec![Some(c)]], maxima, uncertainty: 1e-9 }
}

/// Balls of radius 1 in many meshes.
fn ball_meshes() -> Vec<(&'static str, Vec<Facet>)> {
    vec![
        ("regular 320", odd(&shapes::icosphere(4))),
        ("regular 1280", odd(&shapes::icosphere(8))),
        ("regular 2880", odd(&shapes::icosphere(12))),
        ("jittered 320", odd(&shapes::jittered_icosphere(4, 3))),
        ("jittered 1280", odd(&shapes::jittered_icosphere(8, 7))),
        ("jittered 2420", odd(&shapes::jittered_icosphere(11, 5))),
        ("meridians 12x24", odd(&shapes::meridian_sphere(12, 24))),
        ("meridians 24x48", shapes::meridian_sphere(24, 48)),
        ("slivers 8x96", odd(&shapes::meridian_sphere(8, 96))),
        ("slivers 60x10", odd(&shapes::meridian_sphere(60, 10))),
    ]
}

fn balls() -> Vec<Case> {
    let of = |(name, facets)| single(format!("ball, {name}"), facets, COULOMB, Some(1.0));
    ball_meshes().into_iter().map(of).collect()
}

/// Carlson's R_F by duplication (Carlson, Numerical Algorithms 10, 1995).
fn carlson(mut x: [f64; 3]) -> f64 {
    for _ in 0..60 {
        let [a, b, c] = x.map(f64::sqrt);
        let shift = a * b + b * c + c * a;
        x = x.map(|x| 0.25 * (x + shift));
    }
    (3.0 / (x[0] + x[1] + x[2])).sqrt()
}

/// Capacitance and highest field at 1 V of an ellipsoid (Landau and Lifshitz, Electrodynamics of
/// Continuous Media, section 4).
fn ellipsoid(axes: [f64; 3]) -> (f64, f64) {
    let c = 1.0 / carlson(axes.map(|a| a * a));
    let longest = axes.iter().fold(0.0_f64, |l, a| l.max(*a));
    (COULOMB * c, c * longest / (axes[0] * axes[1] * axes[2]))
}

fn ellipsoids() -> Vec<Case> {
    let stretched =
        |axes: [f64; 3], facets: &[Facet]| shapes::mapped(facets, |p| p.component_mul(&Vec3::from(axes)));
    let [regular, jittered, meridian] =
        [odd(&shapes::icosphere(8)), odd(&shapes::jittered_icosphere(8, 2)), shapes::meridian_sphere(20, 40)];
    let mut cases = Vec::new();
    for (axes, name, facets) in [
        ([3.0, 2.0, 1.0], "regular", &regular),
        ([3.0, 2.0, 1.0], "jittered", &jittered),
        ([1.5, 1.2, 1.0], "regular", &regular),
        ([1.5, 1.2, 1.0], "meridians", &meridian),
        ([1.0, 1.0, 0.5], "jittered", &jittered),
        ([1.0, 1.0, 0.5], "meridians", &meridian),
        ([1.0, 1.0, 0.25], "regular", &regular),
        ([1.0, 1.0, 2.0], "jittered", &jittered),
        ([1.0, 1.0, 2.0], "meridians", &meridian),
        ([1.0, 1.0, 4.0], "regular", &regular),
    ] {
        let (c, field) = ellipsoid(axes);
        cases.push(single(format!("ellipsoid {axes:?}, {name}"), stretched(axes, facets), c, Some(field)));
    }
    for (a, c) in [(1.0, 5.0), (1.0, 10.0), (1.0, 0.2), (1.0, 0.1)] {
        let (value, field) = ellipsoid([a, a, c]);
        let facets = shapes::spheroid(a, c, 24, 36);
        cases.push(single(format!("spheroid {a}:{c}, meridians"), facets, value, Some(field)));
    }
    cases
}

/// Two or three balls; fields at every `potentials`.
fn group(name: String, balls: &[Ball], meshes: Vec<Vec<Facet>>, potentials: &[Vec<f64>]) -> Case {
    let place = |((at, radius), facets): (&Ball, Vec<Facet>)| {
        shapes::moved(&shapes::scaled(&facets, *radius), [at.x, at.y, at.z])
    };
    let of = |v: &Vec<f64>| (v.clone(), kelvin::highest(balls, v).into_iter().enumerate().collect());
    Case {
        name,
        bodies: solving::solids(balls.iter().zip(meshes).map(place)),
        images: Images::none(),
        matrix: kelvin::matrix(balls).into_iter().map(|row| row.into_iter().map(Some).collect()).collect(),
        maxima: potentials.iter().map(of).collect(),
        uncertainty: 1e-6,
    }
}

fn pairs() -> Vec<Case> {
    let meshes = || {
        [
            ("regular", odd(&shapes::icosphere(8))),
            ("jittered", odd(&shapes::jittered_icosphere(7, 4))),
            ("meridians", odd(&shapes::meridian_sphere(16, 32))),
        ]
    };
    let mut cases = Vec::new();
    let drives = [vec![0.5, -0.5], vec![1.0, 0.0]];
    for (k, gap) in [5.0, 1.0, 0.5, 0.2, 0.1, 0.05, 0.02].into_iter().enumerate() {
        for (n, (name, facets)) in meshes().into_iter().enumerate() {
            if (k + n) % 3 == 0 {
                continue;
            }
            let balls = [(Vec3::zeros(), 1.0), (Vec3::new(0.6, 0.0, 0.8) * (2.0 + gap), 1.0)];
            let name = format!("two balls, gap {gap}, {name}");
            cases.push(group(name, &balls, vec![facets.clone(), facets], &drives));
        }
    }
    for (radius, gap) in [(0.5, 0.3), (0.2, 0.1)] {
        for (name, facets) in meshes().into_iter().take(2) {
            let balls = [(Vec3::zeros(), 1.0), (-Vec3::z() * (1.0 + gap + radius), radius)];
            let name = format!("balls 1:{radius}, gap {gap}, {name}");
            cases.push(group(name, &balls, vec![facets.clone(), facets], &drives));
        }
    }
    cases
}

/// A ball over an earth plane is half of the pair at ±1 V.
fn over_planes() -> Vec<Case> {
    let meshes = [
        ("regular", odd(&shapes::icosphere(9))),
        ("jittered", odd(&shapes::jittered_icosphere(9, 4))),
        ("meridians", shapes::meridian_sphere(20, 40)),
    ];
    let mut cases = Vec::new();
    for (k, height) in [5.0, 1.0, 0.5, 0.2, 0.1, 0.05].into_iter().enumerate() {
        let (name, facets) = &meshes[k % 3];
        let balls = [(Vec3::z() * (1.0 + height), 1.0), (-Vec3::z() * (1.0 + height), 1.0)];
        let c = kelvin::matrix(&balls);
        let field = kelvin::highest(&balls, &[1.0, -1.0])[0];
        let placed = shapes::moved(facets, [0.0, 0.0, 1.0 + height]);
        let name = format!("ball over a plane, gap {height}, {name}");
        let case = single(name, placed, c[0][0] - c[0][1], Some(field));
        cases.push(Case { images: floor().into(), ..case });
    }
    cases
}

fn floor() -> Option<Plane> {
    Some(Plane { through: Vec3::zeros(), facing: Vec3::z() })
}

fn triples() -> Vec<Case> {
    let at = |x: f64, y: f64, z: f64| Vec3::new(x, y, z);
    let drives = [vec![1.0, 0.0, 0.0], vec![1.0, -1.0, 0.3]];
    let meshes = |a: usize, jitter: bool| {
        let one = |seed| if jitter { shapes::jittered_icosphere(a, seed) } else { shapes::icosphere(a) };
        [1, 2, 3].map(|seed| odd(&one(seed))).to_vec()
    };
    let wide = [(at(0.0, 0.0, 0.0), 1.0), (at(3.0, 0.5, 0.0), 1.0), (at(1.0, 3.2, 1.0), 0.8)];
    let line = [(at(0.0, 0.0, 0.0), 1.0), (at(2.5, 0.0, 0.0), 0.6), (at(-2.8, 0.0, 0.5), 0.9)];
    let mut cases = vec![
        group("three balls, regular".into(), &wide, meshes(7, false), &drives),
        group("three balls, jittered".into(), &wide, meshes(6, true), &drives),
        group("three balls in a row, regular".into(), &line, meshes(6, false), &drives),
        group("three balls in a row, jittered".into(), &line, meshes(8, true), &drives),
    ];
    // The stack of the demo, by the image series (tests/it/fixtures.rs, tests/it/accuracy.rs) [pF, V/m].
    let c = [
        [6.4155114543, -1.2371277443, -0.3065412242],
        [-1.2371277443, 3.9702508605, -0.7399930487],
        [-0.3065412242, -0.7399930487, 5.4671438083],
    ];
    let fields = vec![(0, 2.3286334e6), (1, 1.6106250e6), (2, 0.6794162e6)];
    for (name, facets) in [("regular", shapes::icosphere(8)), ("meridians", shapes::meridian_sphere(16, 32))]
    {
        let ball = |radius, z| shapes::moved(&shapes::scaled(&odd(&facets), radius), [0.0, 0.0, z]);
        cases.push(Case {
            name: format!("stack of three balls over a plane, {name}"),
            bodies: solving::solids([ball(0.05, 0.4), ball(0.03, 0.27), ball(0.04, 0.13)]),
            images: floor().into(),
            matrix: c.iter().map(|row| row.iter().map(|c| Some(c * 1e-12)).collect()).collect(),
            maxima: vec![(vec![1e5, 31159.93895, 0.0], fields.clone())],
            uncertainty: 1e-7,
        });
    }
    cases
}

/// Cells of each face crowded towards the edges, or towards one side: slivers there.
fn warped(facets: &[Facet], power: f64) -> Vec<Facet> {
    shapes::mapped(facets, |p| p.map(|x| 0.5 - (0.5 - x).max(0.0).powf(power)))
}

fn boxes() -> Vec<Case> {
    // Helsing and Perfekt 2013.
    let c = 0.66067815409957 * COULOMB;
    let cube = |n| shapes::cuboid([1.0; 3], n);
    [
        ("12 facets", cube(1)),
        ("12 facets, turned", odd(&cube(1))),
        ("300 facets", cube(5)),
        ("300 facets, turned", odd(&cube(5))),
        ("1200 facets, turned", odd(&cube(10))),
        ("432 facets, crowded to one side", warped(&cube(6), 3.0)),
        ("768 facets, crowded to one side, turned", odd(&warped(&cube(8), 2.0))),
    ]
    .into_iter()
    .map(|(name, facets)| single(format!("cube, {name}"), facets, c, None))
    .collect()
}

fn sheet(name: String, facets: Vec<Facet>, c: f64) -> Case {
    Case { bodies: solving::sheets([facets]), uncertainty: 1e-8, ..single(name, Vec::new(), c, None) }
}

fn discs() -> Vec<Case> {
    let mut cases: Vec<Case> = [4, 5, 6]
        .map(|k| sheet(format!("disc of {} sides", 3 << k), odd(&shapes::polygon_sheet(k)), 8.0 * EPS0))
        .into();
    cases.extend([10, 16].map(|k| {
        sheet(format!("disc of {} sides, {} facets", 6 * k, 6 * k * k), shapes::disc_sheet(k), 8.0 * EPS0)
    }));
    // `iso.plate.1` of the table.
    cases.extend([(1, 1), (5, 5), (2, 12)].map(|(nx, ny)| {
        let facets = odd(&shapes::rect_sheet(1.0, 1.0, nx, ny));
        sheet(format!("square sheet, {nx} x {ny} cells, turned"), facets, 0.36678800404 * COULOMB)
    }));
    cases
}

/// The half of a body above z = 0, closed by a flat cap about the origin.
fn half(facets: &[Facet]) -> Vec<Facet> {
    let snapped = shapes::mapped(facets, |x| x.map(|c| if c.abs() < 1e-12 { 0.0 } else { c }));
    let mut upper: Vec<Facet> = snapped.into_iter().filter(|f| f.iter().all(|x| 0.0 <= x.z)).collect();
    let low = |x: &Vec3| x.z <= 0.0;
    let rim: Vec<[Vec3; 2]> = upper
        .iter()
        .flat_map(|f| [0, 1, 2].map(|k| [f[k], f[(k + 1) % 3]]))
        .filter(|[a, b]| low(a) && low(b))
        .collect();
    upper.extend(rim.into_iter().map(|[a, b]| [Vec3::zeros(), b, a]));
    upper
}

fn half_models() -> Vec<Case> {
    let mirror = |kind| {
        let plane = Plane { through: Vec3::zeros(), facing: Vec3::z() };
        Images::new(vec![ImagePlane { plane, kind }]).expect("one plane")
    };
    let halves = [
        ("ball", shapes::meridian_sphere(16, 32), COULOMB, Some(1.0)),
        ("ball, sliver", shapes::meridian_sphere(10, 60), COULOMB, Some(1.0)),
        (
            "spheroid 1:2",
            shapes::spheroid(1.0, 2.0, 20, 32),
            ellipsoid([1.0, 1.0, 2.0]).0,
            Some(ellipsoid([1.0, 1.0, 2.0]).1),
        ),
        ("cube of 8 cells", shapes::cuboid([1.0; 3], 2), 0.66067815409957 * COULOMB, None),
        ("cube of 64 cells", shapes::cuboid([1.0; 3], 4), 0.66067815409957 * COULOMB, None),
    ];
    let mut cases: Vec<Case> = halves
        .into_iter()
        .map(|(name, facets, c, field)| {
            let case = single(format!("half of a {name} on an even mirror"), half(&facets), c, field);
            Case { images: mirror(PlaneKind::Even), ..case }
        })
        .collect();
    // One of two balls with an even or an odd mirror between them.
    for (kind, sign, gap) in
        [(PlaneKind::Even, 1.0, 0.5), (PlaneKind::Odd, -1.0, 0.3), (PlaneKind::Even, 1.0, 0.2)]
    {
        let balls = [(Vec3::z() * (1.0 + 0.5 * gap), 1.0), (-Vec3::z() * (1.0 + 0.5 * gap), 1.0)];
        let c = kelvin::matrix(&balls);
        let copies = if kind == PlaneKind::Even { 2.0 } else { 1.0 };
        let field = kelvin::highest(&balls, &[1.0, sign])[0];
        let facets = shapes::moved(&odd(&shapes::icosphere(8)), [0.0, 0.0, 1.0 + 0.5 * gap]);
        let name = format!("ball before {} at {}", kind.word(), 0.5 * gap);
        let case = single(name, facets, copies * (c[0][0] + sign * c[0][1]), Some(field));
        cases.push(Case { images: mirror(kind), ..case });
    }
    cases
}

/// Rows of the reference table whose bodies stand in none of the lists above.
const FROM_TABLE: [&str; 9] = [
    "box",
    "rect_plate",
    "disc_over_ground",
    "square_plate_over_ground",
    "concentric_spheres",
    "sphere_in_spherical_shell",
    "two_coaxial_discs",
    "two_square_plates",
    "two_coplanar_square_plates",
];

/// Name of the bodies of a row, without potentials.
fn geometry(row: &Row) -> String {
    let lengths = row.keys.iter().filter(|(key, _)| !key.starts_with('V') && *key != "thickness");
    let keys: Vec<String> = lengths.map(|(k, v)| format!("{k}={v}")).collect();
    format!("{} {}", row.shape, keys.join(" "))
}

fn rows() -> Vec<Case> {
    let mut groups: BTreeMap<String, Vec<Row>> = BTreeMap::new();
    for row in reference::rows().into_iter().filter(|row| FROM_TABLE.contains(&row.shape.as_str())) {
        groups.entry(geometry(&row)).or_default().push(row);
    }
    groups.into_iter().map(|(name, rows)| of_rows(name, &rows)).collect()
}

fn of_rows(name: String, rows: &[Row]) -> Case {
    let first = reference::assembly(&rows[0]);
    let n = first.bodies.len();
    let mut case = Case {
        name,
        images: first.plane.into(),
        bodies: first.bodies,
        matrix: vec![vec![None; n]; n],
        maxima: Vec::new(),
        uncertainty: rows.iter().map(|row| row.rel_uncertainty).fold(1e-9, f64::max),
    };
    for row in rows {
        let known = reference::assembly(row);
        match known.wanted {
            Wanted::Entry(i, j) => {
                case.matrix[i][j] = Some(known.expected);
                case.matrix[j][i] = Some(known.expected);
            }
            Wanted::SurfaceField { body, .. } if !case.bodies[body].sheet => {
                case.maxima.push((known.potentials, vec![(body, known.expected)]));
            }
            _ => {}
        }
    }
    // Two equal bodies have equal entries.
    if n == 2 && case.matrix[1][1].is_none() && !case.name.contains("inner_R") {
        case.matrix[1][1] = case.matrix[0][0];
    }
    case
}

/// Facets of a drawing in millimetres [m].
fn drawing(name: &str) -> Vec<Facet> {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("meshes/cad").join(format!("{name}.stl"));
    let bytes = fs::read(&path).unwrap_or_else(|e| panic!("{}: {e}", path.display()));
    let soup = stl::parse(&bytes, name).expect("a drawing of this project");
    let facets: Vec<Facet> = soup.solids.into_iter().flat_map(|solid| solid.facets).collect();
    shapes::scaled(&facets, 1e-3)
}

/// `tests/reference/cad.csv`: id and quantity to value.
fn cad_table() -> BTreeMap<(String, String), f64> {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/reference/cad.csv");
    let mut table = csv::Reader::from_path(path).expect("the table is there");
    let record = |r: csv::StringRecord| ((r[0].to_owned(), r[2].to_owned()), r[4].parse().expect("a number"));
    table.records().map(|r| record(r.expect("a row"))).collect()
}

fn drawings() -> Vec<Case> {
    let table = cad_table();
    let value = |id: &str, quantity: &str| table[&(format!("cad.{id}"), quantity.to_owned())];
    let mut cases = Vec::new();
    for id in ["torus", "capsule", "cylinder", "bowl", "spheroid", "dimpled", "dented", "block"] {
        for origin in ["scad", "occ"] {
            let name = format!("{origin}_{id}_coarse");
            let case = single(name.clone(), drawing(&name), value(id, "C"), Some(value(id, "E_max")));
            cases.push(Case { uncertainty: 1e-6, ..case });
        }
    }
    let drives = [("V1 = 1 V, V2 = 0 V", vec![1.0, 0.0]), ("V1 = 0.5 V, V2 = -0.5 V", vec![0.5, -0.5])];
    for origin in ["scad", "occ"] {
        let [c11, c12, c22] = ["C11", "C12", "C22"].map(|q| Some(value("plates", q)));
        let of = |(text, v): &(&str, Vec<f64>)| {
            let on = |n: usize| (n - 1, value("plates", &format!("E_max on {n}; {text}")));
            (v.clone(), vec![on(1), on(2)])
        };
        let plates = ["low", "high"].map(|side| drawing(&format!("{origin}_plate_{side}_coarse")));
        cases.push(Case {
            name: format!("{origin}_plates_coarse"),
            bodies: solving::solids(plates),
            images: Images::none(),
            matrix: vec![vec![c11, c12], vec![c12, c22]],
            maxima: drives.iter().map(of).collect(),
            uncertainty: 1e-6,
        });
    }
    cases
}
