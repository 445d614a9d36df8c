//! The reference values, worked out apart from this program, and the bodies each of them speaks of.
//!
//! `tests/reference/references.csv` holds one number a row.  The open length of a row (`a`, `b`, …) is
//! 1 m here.  Curved bodies get about 2,500 facets with corners on the true surface, two equal ones half of
//! that each, flat ones as few as a drawing would have.
use crate::shapes;
use crate::shapes::Facet;
use amberskin::base::Plane;
use amberskin::base::Vec3;
use amberskin::base::si::EPS0;
use std::collections::BTreeMap;
use std::f64::consts::PI;
use std::fs;
use std::path::Path;

/// One row of the table.
#[derive(Clone, Debug)]
pub(crate) struct Row {
    /// Unique name.
    pub(crate) id: String,
    /// Name of the arrangement.
    pub(crate) shape: String,
    /// What is given with it: lengths in units of the open length [1], potentials as text.
    pub(crate) keys: BTreeMap<String, String>,
    /// What the number is, as a formula.
    pub(crate) quantity: String,
    /// The number, in the unit of the quantity.
    pub(crate) value: f64,
    /// Its own relative uncertainty [1].
    pub(crate) rel_uncertainty: f64,
    /// Where it comes from.
    pub(crate) source: String,
    /// Relative deviation allowed to the program [1].
    pub(crate) our_rel_tol: f64,
}

/// A conductor to be drawn.
#[derive(Clone, Debug)]
pub(crate) struct TestBody {
    /// Electrode name.
    pub(crate) name: String,
    /// Its facets [m].
    pub(crate) facets: Vec<Facet>,
    /// Open sheet or closed body.
    pub(crate) sheet: bool,
}

/// Which number of a solution the row speaks of.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) enum Wanted {
    /// Entry of the Maxwell matrix [F].
    Entry(usize, usize),
    /// (C11 − C12)/2: two equal bodies at +V/2 and −V/2 [F].
    BetweenEqualBodies,
    /// Field on the surface of body `body` at `place` [m], magnitude [V/m].
    SurfaceField { body: usize, place: Vec3 },
    /// Field at a place in space, on the plane, magnitude [V/m].
    SpaceField { place: Vec3 },
}

/// An arrangement to be solved.
#[derive(Clone, Debug)]
pub(crate) struct TestCase {
    /// Conductors in the order of the matrix rows.
    pub(crate) bodies: Vec<TestBody>,
    /// Earth plane.
    pub(crate) plane: Option<Plane>,
    /// Potential of each body for the field rows [V].
    pub(crate) potentials: Vec<f64>,
    /// What to compare.
    pub(crate) wanted: Wanted,
    /// The value of the row in SI [F] or [V/m].
    pub(crate) expected: f64,
}

/// Frequency of the icosphere that stands for a ball: 2,420 facets; for each of two equal balls and for
/// the wall of a cavity: 1,280; for the outer wall of a vessel, which no value speaks of: 320.
const BALL: usize = 11;
const PAIR: usize = 8;
const OUTSIDE: usize = 4;

/// Halvings of a round sheet: 192 sides, 190 facets, 1.8e-4 less area than the disc.
const DISC: u32 = 6;

/// All rows of the table.
pub(crate) fn rows() -> Vec<Row> {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/reference/references.csv");
    let text = fs::read_to_string(&path).unwrap_or_else(|e| panic!("{}: {e}", path.display()));
    parse(&text)
}

/// The rows of a table as text.
pub(crate) fn parse(text: &str) -> Vec<Row> {
    let mut table = csv::Reader::from_reader(text.as_bytes());
    let expected = ["case", "quantity", "unit", "value", "rel_uncertainty", "source", "our_rel_tol"];
    assert_eq!(table.headers().unwrap(), expected.as_slice(), "columns of the table");
    table.records().map(|record| row(&record.unwrap())).collect()
}

fn row(record: &csv::StringRecord) -> Row {
    let (id, geometry) = record[0].split_once(' ').unwrap_or_else(|| panic!("no geometry in {record:?}"));
    let mut keys: BTreeMap<String, String> = geometry
        .split(';')
        .map(|pair| pair.split_once('=').unwrap_or_else(|| panic!("{id}: `{pair}` is not key=value")))
        .map(|(key, value)| (key.to_owned(), value.to_owned()))
        .collect();
    let number = |n: usize| {
        let value: f64 = record[n].parse().unwrap_or_else(|e| panic!("{id}: `{}`: {e}", &record[n]));
        assert!(value.is_finite(), "{id}: column {n}");
        value
    };
    Row {
        id: id.to_owned(),
        shape: keys.remove("shape").unwrap_or_else(|| panic!("{id}: no shape")),
        keys,
        quantity: record[1].to_owned(),
        value: number(3),
        rel_uncertainty: number(4),
        source: record[5].to_owned(),
        our_rel_tol: number(6),
    }
}

impl Row {
    /// A length of the row [m]: `2a`, `a`, `a/1.5` and `3` are understood.
    pub(crate) fn length(&self, key: &str) -> f64 {
        let text = self.keys.get(key).unwrap_or_else(|| panic!("{}: no key `{key}`", self.id));
        let (head, divisor) = text.split_once('/').unwrap_or((text, "1"));
        let factor = head.trim_end_matches(['a', 'b', 'd', 'r', 'R', 'w']);
        let number =
            |s: &str| -> f64 { s.parse().unwrap_or_else(|e| panic!("{}: {key}={text}: {e}", self.id)) };
        (if factor.is_empty() { 1.0 } else { number(factor) }) / number(divisor)
    }

    /// [`Row::length`], or `fallback` where the row has no such key.
    fn length_or(&self, key: &str, fallback: f64) -> f64 {
        if self.keys.contains_key(key) { self.length(key) } else { fallback }
    }

    /// Potential of body `n` (from 1) at V = 1 V, or `fallback`.
    fn potential(&self, n: usize, fallback: f64) -> f64 {
        match self.keys.get(&format!("V{n}")).map(String::as_str) {
            None => fallback,
            Some("V" | "1") => 1.0,
            Some("0") => 0.0,
            Some("+V/2") => 0.5,
            Some("-V/2") => -0.5,
            Some(other) => panic!("{}: potential `{other}` is not understood", self.id),
        }
    }
}

/// The bodies of a row, what is to be compared, and the value in SI.
pub(crate) fn assembly(row: &Row) -> TestCase {
    let (bodies, plane) = bodies(row);
    let potentials = (1..=bodies.len()).map(|n| row.potential(n, if n == 1 { 1.0 } else { 0.0 })).collect();
    let (wanted, unit) =
        if row.quantity.starts_with('E') { field(row) } else { (entry(row), capacitance_unit(row)) };
    TestCase { bodies, plane, potentials, wanted, expected: row.value * unit }
}

fn bodies(row: &Row) -> (Vec<TestBody>, Option<Plane>) {
    let floor = Some(Plane { through: Vec3::zeros(), facing: Vec3::z() });
    let ball = |radius: f64, z: f64, frequency: usize| {
        let odd = shapes::turned(&shapes::icosphere(frequency), [1.0, 2.0, 3.0], 0.7);
        shapes::moved(&shapes::scaled(&odd, radius), [0.0, 0.0, z])
    };
    let disc = |radius: f64, z: f64| {
        shapes::moved(&shapes::scaled(&shapes::polygon_sheet(DISC), radius), [0.0, 0.0, z])
    };
    let square = |side: f64, at: [f64; 3]| shapes::moved(&shapes::rect_sheet(side, side, 1, 1), at);
    let len = |key: &str| row.length(key);
    match row.shape.as_str() {
        "sphere" => (solids([ball(len("R"), 0.0, BALL)]), None),
        "prolate_spheroid" | "oblate_spheroid" => {
            (solids([shapes::spheroid(len("equatorial"), len("polar"), 30, 42)]), None)
        }
        "ellipsoid" => (solids([general_ellipsoid(row)]), None),
        "cube" => (solids([shapes::cuboid([len("edge"); 3], 1)]), None),
        "box" => (solids([shapes::cuboid([len("Lx"), len("Ly"), len("Lz")], 1)]), None),
        "disc" => (sheets([disc(len("R"), 0.0)]), None),
        "rect_plate" => (sheets([shapes::rect_sheet(len("Lx"), len("Ly"), 1, 1)]), None),
        "two_spheres" => {
            let (r1, r2) = (len("R1"), len("R2"));
            // Unequal balls stand closer, and the large one needs its facets there.
            let frequency = if r1.to_bits() == r2.to_bits() { PAIR } else { BALL };
            (solids([ball(r1, 0.0, frequency), ball(r2, -(r1 + len("gap") + r2), frequency)]), None)
        }
        "sphere_over_ground" => (solids([ball(len("R"), len("R") + len("gap"), BALL)]), floor),
        "disc_over_ground" => (sheets([disc(len("R"), len("height"))]), floor),
        "square_plate_over_ground" => (sheets([square(len("L"), [0.0, 0.0, len("height")])]), floor),
        "sphere_in_spherical_shell" | "concentric_spheres" => {
            let mut wall = shapes::scaled(&shapes::icosphere(OUTSIDE), 1.2);
            wall.extend(shapes::flipped(&shapes::icosphere(PAIR)));
            let wall = shapes::turned(&wall, [3.0, 1.0, 2.0], 0.9);
            let offset = row.length_or("offset", 0.0);
            (solids([ball(len("inner_R"), -offset, BALL), shapes::scaled(&wall, len("outer_R"))]), None)
        }
        "two_coaxial_discs" => {
            let radius = |n: usize| row.length_or(&format!("R{n}"), row.length_or("R", 1.0));
            (sheets([disc(radius(1), 0.0), disc(radius(2), len("gap"))]), None)
        }
        "two_square_plates" => {
            (sheets([square(len("L"), [0.0; 3]), square(len("L"), [0.0, 0.0, len("gap")])]), None)
        }
        "two_coplanar_square_plates" => {
            let pitch = len("L") + len("gap");
            (sheets([square(len("L"), [0.0; 3]), square(len("L"), [pitch, 0.0, 0.0])]), None)
        }
        other => panic!("{}: shape `{other}` is not drawn here", row.id),
    }
}

/// Half axes `ax`, `ay`, `az`; a body of revolution about x is drawn with parallels about x.
fn general_ellipsoid(row: &Row) -> Vec<Facet> {
    let axes = ["ax", "ay", "az"].map(|key| row.length(key));
    if axes[1].to_bits() == axes[2].to_bits() {
        let upright = shapes::spheroid(axes[1], axes[0], 30, 42);
        return shapes::turned(&upright, [0.0, 1.0, 0.0], 0.5 * PI);
    }
    let odd = shapes::turned(&shapes::icosphere(BALL), [1.0, 2.0, 3.0], 0.7);
    shapes::mapped(&odd, |p| p.component_mul(&Vec3::from(axes)))
}

fn solids<const N: usize>(facets: [Vec<Facet>; N]) -> Vec<TestBody> {
    named(facets, false)
}

fn sheets<const N: usize>(facets: [Vec<Facet>; N]) -> Vec<TestBody> {
    named(facets, true)
}

fn named<const N: usize>(facets: [Vec<Facet>; N], sheet: bool) -> Vec<TestBody> {
    let name = |n: usize| format!("body {}", n + 1);
    facets.into_iter().enumerate().map(|(n, facets)| TestBody { name: name(n), facets, sheet }).collect()
}

fn entry(row: &Row) -> Wanted {
    let digits: Vec<usize> =
        row.quantity[1..].chars().map_while(|c| c.to_digit(10)).map(|d| d as usize).collect();
    match digits.as_slice() {
        [i, j] => Wanted::Entry(i - 1, j - 1),
        _ if row.quantity.starts_with("C_mutual") => Wanted::BetweenEqualBodies,
        _ => Wanted::Entry(0, 0),
    }
}

/// What the value is to be multiplied by [F].
fn capacitance_unit(row: &Row) -> f64 {
    if row.quantity.ends_with("*d/(eps0*pi*a^2)") {
        EPS0 * PI * row.length("R").powi(2) / row.length("gap")
    } else if row.quantity.ends_with("*d/(eps0*L^2)") {
        EPS0 * row.length("L").powi(2) / row.length("gap")
    } else {
        assert!(row.quantity.contains("/(4*pi*eps0*"), "{}: quantity `{}`", row.id, row.quantity);
        4.0 * PI * EPS0
    }
}

/// Where the field of the row is, and what its value is to be multiplied by [V/m].
fn field(row: &Row) -> (Wanted, f64) {
    let len = |key: &str| row.length(key);
    let on = |body: usize, x: f64, z: f64| Wanted::SurfaceField { body, place: Vec3::new(x, 0.0, z) };
    let wanted = match row.shape.as_str() {
        "disc" => on(0, 0.0, 0.0),
        "ellipsoid" => on(0, len("ax"), 0.0),
        "oblate_spheroid" => on(0, len("equatorial"), 0.0),
        "concentric_spheres" | "sphere_in_spherical_shell" => {
            on(0, 0.0, -row.length_or("offset", 0.0) - len("inner_R"))
        }
        "sphere_over_ground" if row.quantity.contains("plane") => Wanted::SpaceField { place: Vec3::zeros() },
        "sphere_over_ground" => on(0, 0.0, len("gap")),
        "two_spheres" if row.quantity.contains("grounded") || row.quantity.contains("small") => {
            on(1, 0.0, -len("R1") - len("gap"))
        }
        "two_spheres" => on(0, 0.0, -len("R1")),
        other => panic!("{}: no place for the field of `{other}`", row.id),
    };
    let length = if row.quantity.contains("*gap/V") { gap(row) } else { 1.0 };
    (wanted, 1.0 / length)
}

fn gap(row: &Row) -> f64 {
    match row.shape.as_str() {
        "sphere_in_spherical_shell" => row.length("outer_R") - row.length("inner_R") - row.length("offset"),
        _ => row.length("gap"),
    }
}

/// Value of a row by its closed form, where it has one of a few lines: Landau and Lifshitz,
/// Electrodynamics of Continuous Media, section 4 (spheroids, disc); Smythe, Static and Dynamic
/// Electricity, chapter 5 (sphere over plane, by image charges); Gauss's law (balls).
fn closed_form(row: &Row) -> Option<f64> {
    let len = |key: &str| row.length(key);
    let value = match (row.shape.as_str(), row.quantity.starts_with("C/")) {
        ("sphere", true) => len("R"),
        ("disc", _) => 2.0 / PI,
        ("prolate_spheroid", true) => {
            let (a, c) = (len("equatorial"), len("polar"));
            (c * c - a * a).sqrt() / (c / a).acosh()
        }
        ("oblate_spheroid", true) => {
            let (a, c) = (len("equatorial"), len("polar"));
            (a * a - c * c).sqrt() / (c / a).acos()
        }
        ("sphere_over_ground", true) => {
            let al = (1.0 + len("gap")).acosh();
            al.sinh() * (1..200).map(|n| 1.0 / (f64::from(n) * al).sinh()).sum::<f64>()
        }
        ("sphere_in_spherical_shell", true) if len("offset") <= 0.0 => {
            len("inner_R") * len("outer_R") / (len("outer_R") - len("inner_R"))
        }
        ("concentric_spheres", false) => len("outer_R") / (len("outer_R") - len("inner_R")),
        _ => return None,
    };
    Some(value)
}

#[test]
fn the_table_holds_its_rows_once_each_with_source_and_tolerance() {
    let rows = rows();
    assert!(100 < rows.len(), "{} rows", rows.len());
    let mut ids: Vec<&str> = rows.iter().map(|row| row.id.as_str()).collect();
    ids.sort_unstable();
    assert!(ids.windows(2).all(|pair| pair[0] != pair[1]), "a row stands twice");
    for row in &rows {
        assert!(!row.source.is_empty(), "{}: no source", row.id);
        assert!(row.rel_uncertainty < row.our_rel_tol, "{}: looser than its tolerance", row.id);
    }
}

#[test]
fn values_of_the_table_agree_with_closed_forms() {
    let mut n = 0;
    for row in rows() {
        if let Some(exact) = closed_form(&row) {
            assert!((row.value - exact).abs() < 1e-13 * exact, "{}: {} and {exact}", row.id, row.value);
            n += 1;
        }
    }
    assert!(14 <= n, "only {n} rows had a closed form");
}

#[test]
fn bodies_of_every_row_stand_as_the_row_says() {
    for row in rows() {
        let case = assembly(&row);
        assert!(case.expected.is_finite(), "{}", row.id);
        assert_eq!(case.potentials.len(), case.bodies.len(), "{}", row.id);
        for body in &case.bodies {
            let open = shapes::open_edges(&body.facets);
            assert_eq!(0 < open, body.sheet, "{}: {} has {open} open edges", row.id, body.name);
            assert!(body.sheet || 0.0 < shapes::volume(&body.facets), "{}: {}", row.id, body.name);
            assert!(body.facets.len() <= 5000, "{}: {} facets", row.id, body.facets.len());
        }
        let lowest = |facets: &[Facet]| facets.iter().flatten().map(|p| p.z).fold(f64::INFINITY, f64::min);
        if let Some(plane) = case.plane {
            let height = lowest(&case.bodies[0].facets) - plane.through.z;
            let stated = row.length_or("gap", row.length_or("height", 0.0));
            assert!((height - stated).abs() < 5e-3, "{}: {height} over the plane", row.id);
        }
        if let Wanted::SurfaceField { body, place } = case.wanted {
            let nearest = case.bodies[body].facets.iter().flatten().map(|p| (p - place).norm());
            let nearest = nearest.fold(f64::INFINITY, f64::min);
            // The middle of a round sheet is far from its corners, all of them on the rim.
            let reach = if case.bodies[body].sheet { 1.0 + 1e-12 } else { 0.1 };
            assert!(nearest <= reach, "{}: place is {nearest} from the nearest corner", row.id);
        }
    }
}

#[test]
fn rows_are_turned_into_si() {
    let rows = rows();
    let find = |id: &str| rows.iter().find(|row| row.id == id).unwrap();
    let cube = assembly(find("iso.cube"));
    // 0.660678 of a cube of 1 m is 73.51 pF.
    assert!((cube.expected - 73.51e-12).abs() < 5e-15);
    assert_eq!(cube.wanted, Wanted::Entry(0, 0));
    assert_eq!(assembly(find("mc.plates.0.05.C12")).wanted, Wanted::Entry(0, 1));
    // The ratio row and the entries of the same plates say the same: (C11 − C12)/2.
    let [c11, c12, ratio] =
        ["C11", "C12", "ratio"].map(|q| assembly(find(&format!("mc.plates.0.05.{q}"))).expected);
    assert!((0.5 * (c11 - c12) / ratio - 1.0).abs() < 1e-6);
    let pole = assembly(find("fld.spheres.gnd.0.2"));
    assert_eq!(pole.wanted, Wanted::SurfaceField { body: 1, place: Vec3::new(0.0, 0.0, -1.2) });
    assert!((pole.expected - 1.0668806679773604 / 0.2).abs() < 1e-12);
}
