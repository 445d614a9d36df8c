//! The case file: words, units and names to SI.
#![allow(clippy::float_cmp, reason = "conversions by one factor are exact to the last bit")]

use amberskin::base::Vec3;
use amberskin::case;
use amberskin::case::Case;
use amberskin::case::CaseError;
use amberskin::case::Role;
use amberskin::case::Shell;
use amberskin::case::SurfaceKind;
use amberskin::case::ValueIs;
use std::fs;
use std::path::Path;

/// A small case in order, to which lines can be added.
const SMALL: &str = r#"
[units]
length = "mm"
[[electrode]]
name = "a"
shape = "a.stl"
role = "live"
[[electrode]]
name = "b"
shape = "b.stl"
role = "floating"
"#;

const THREE_BALLS: &str = r#"
[study]
number   = "ST-014"
title    = "Three-ball stack over an earthed floor"
left_out = ["supports", "lead to the ball"]

[units]
length      = "mm"
capacitance = "pF"
field       = "kV/mm"

[surroundings]
relative_permittivity = 1.0

[[earth_plane]]
name    = "floor"
through = [0.0, 0.0, 0.0]
facing  = [0.0, 0.0, 1.0]

[[electrode]]
name        = "ball"
shape       = "../meshes/ball.stl"
role        = "live"
size_check  = [100, 100, 100]
field_limit = "2.6 kV/mm peak"

[[electrode]]
name       = "tap"
shape      = "../meshes/tap.stl"
role       = "floating"
size_check = [60, 60, 60]

[[electrode]]
name       = "foot"
shape      = "../meshes/foot.stl"
role       = "earthed"
size_check = [80, 80, 80]

[[voltage_case]]
name       = "100 kV peak applied"
value_is   = "peak"
potentials = { ball = "100 kV" }
charges  = { tap = "1 nC" }

[[look]]
name = "between ball and tap"
line = { from = [0, 0, 300], to = [0, 0, 350], points = 51 }

[accuracy]
capacitance = "0.5 %"
time_limit  = "10 min"
max_field   = "2 %"

[deliver]
folder  = "out/three_ball_stack"
answers = "answers.txt"
matrix  = "matrix.csv"
netlist = "netlist.cir"
record  = "record.json"
"#;

fn parsed(text: &str) -> Case {
    case::parse(text, Path::new("demo/some.toml")).unwrap_or_else(|error| panic!("{error}"))
}

fn refused(text: &str) -> String {
    match case::parse(text, Path::new("demo/some.toml")) {
        Ok(_) => panic!("accepted: {text}"),
        Err(error) => error.to_string(),
    }
}

#[test]
fn the_three_ball_layout_is_read_to_si() {
    let case = parsed(THREE_BALLS);
    assert_eq!(case.length_unit, 1e-3);
    assert_eq!(case.relative_permittivity, 1.0);
    assert_eq!(case.earth_plane.as_ref().unwrap().plane.facing, Vec3::z());
    let names: Vec<&str> = case.electrodes.iter().map(|e| e.name.as_str()).collect();
    assert_eq!(names, ["ball", "tap", "foot"]);
    assert_eq!(case.shape_paths, ["../meshes/ball.stl", "../meshes/tap.stl", "../meshes/foot.stl"]);
    assert_eq!(case.electrodes[0].field_limit, Some((2.6e6, ValueIs::Peak)));
    assert_eq!(case.electrodes[0].size_check, Some(Vec3::new(0.1, 0.1, 0.1)));
    assert_eq!(case.electrodes[1].role, Role::Floating);
    assert_eq!(case.voltage_cases[0].potentials, [("ball".to_owned(), 1e5)]);
    assert_eq!(case.voltage_cases[0].charges, [("tap".to_owned(), 1e-9)]);
    assert_eq!(case.looks[0].points.len(), 51);
    assert!((case.looks[0].points[50] - Vec3::new(0.0, 0.0, 0.35)).norm() < 1e-15);
    assert_eq!(case.accuracy.capacitance, 0.005);
    assert_eq!(case.accuracy.max_field, Some(0.02));
    assert_eq!(case.accuracy.time_limit, Some(600.0));
    assert_eq!(case.deliver.record, Path::new("demo/out/three_ball_stack/record.json"));
    assert_eq!(case.deliver.surface, Path::new("demo/out/three_ball_stack/surface.vtu"));
    assert_eq!(case.deliver.answers.as_deref(), Some(Path::new("demo/out/three_ball_stack/answers.txt")));
}

#[test]
fn defaults_are_used_and_listed() {
    let case = parsed(SMALL);
    assert_eq!(case.deliver.record, Path::new("demo/out/some/record.json"));
    assert_eq!(case.accuracy.capacitance, 0.005);
    assert_eq!(case.electrodes[0].surface, SurfaceKind::Rebuilt);
    assert!(case.voltage_cases.is_empty());
    for line in [
        "accuracy.capacitance = 0.5 %",
        "accuracy.threads = all cores",
        "electrode.a.surface = rebuilt",
        "electrode.a.crease_angle = 35.0 deg",
        "units.field = kV/mm",
        "surroundings.relative_permittivity = 1",
        "deliver.folder = out/some",
    ] {
        assert!(case.defaults.iter().any(|default| default == line), "{line}: {:?}", case.defaults);
    }
}

#[test]
fn the_listing_has_unique_keys_and_every_electrode() {
    let list = case::resolved(&parsed(THREE_BALLS));
    let mut keys: Vec<&String> = list.iter().map(|(key, _)| key).collect();
    keys.sort();
    keys.dedup();
    assert_eq!(keys.len(), list.len());
    let value = |key: &str| list.iter().find(|(k, _)| k == key).map(|(_, v)| v.as_str());
    assert_eq!(value("electrode.foot.role"), Some("earthed"));
    assert_eq!(value("electrode.ball.field_limit"), Some("2600000 V/m peak, given as peak"));
}

/// Crest of a sine is √2 times its root mean square.
#[test]
fn rms_values_become_crests() {
    let text = SMALL.replace("role = \"live\"", "role = \"live\"\nfield_limit = \"2 kV/mm rms\"");
    let case = parsed(&format!(
        "{text}[[voltage_case]]\nname = \"v\"\nvalue_is = \"rms\"\npotentials = {{ a = \"10 kV\" }}\ncharges = {{ b = \"1 nC\" }}\n"
    ));
    let root = 2f64.sqrt();
    assert_eq!(case.voltage_cases[0].potentials[0].1, 1e4 * root);
    assert_eq!(case.voltage_cases[0].charges[0].1, 1e-9 * root);
    assert_eq!(case.electrodes[0].field_limit, Some((2e6 * root, ValueIs::Rms)));
}

#[test]
fn places_shells_sheets_and_planes_are_read() {
    let text = SMALL.replace(
        "role = \"live\"",
        r#"role = "guard"
follows = "b"
shell = [1, 2, 3]
sheet = true
surface = "as_drawn"
crease_angle = "30 deg"
place = { shift = [10, 0, 0], rotate = { axis = [0, 0, 2], angle = "90 deg" }, scale = 2 }"#,
    );
    let case = parsed(&text);
    let a = &case.electrodes[0];
    assert_eq!(a.role, Role::Guard { follows: "b".to_owned() });
    assert_eq!(a.shell, Some(Shell::Holding(Vec3::new(1.0, 2.0, 3.0) * 1e-3)));
    assert!(a.sheet && a.surface == SurfaceKind::AsDrawn);
    let place = a.place.as_ref().unwrap();
    assert_eq!(place.scale, 2.0);
    assert_eq!(place.shift, Vec3::new(10.0, 0.0, 0.0) * 1e-3);
    assert_eq!(place.rotate, [(Vec3::z(), 90.0 * std::f64::consts::PI / 180.0)]);

    let list = "place = { rotate = [{ axis = [1, 0, 0], angle = \"1 rad\" }, { axis = [0, 1, 0], angle = \"2 rad\" }] }\nshell = 3\nrole = \"live\"";
    let case = parsed(&SMALL.replace("role = \"live\"", list));
    assert_eq!(case.electrodes[0].place.as_ref().unwrap().rotate, [(Vec3::x(), 1.0), (Vec3::y(), 2.0)]);
    assert_eq!(case.electrodes[0].shell, Some(Shell::Index(3)));
}

#[test]
fn a_sheet_of_points_runs_along_first() {
    let text = format!(
        "{SMALL}[[look]]\nname = \"s\"\nsheet = {{ corner = [0, 0, 1], along = [2, 0, 0], across = [0, 4, 0], points = [3, 2] }}\n\
         [[look]]\nname = \"p\"\npoint = [5, 6, 7]\n"
    );
    let case = parsed(&text);
    let mm = |x: f64, y: f64, z: f64| Vec3::new(x, y, z) * 1e-3;
    let expected =
        [mm(0., 0., 1.), mm(1., 0., 1.), mm(2., 0., 1.), mm(0., 4., 1.), mm(1., 4., 1.), mm(2., 4., 1.)];
    assert_eq!(case.looks[0].points, expected);
    assert_eq!(case.looks[1].points, [mm(5., 6., 7.)]);
}

#[test]
fn byte_order_marks_and_windows_line_ends_change_nothing() {
    let plain = parsed(SMALL);
    let dressed = parsed(&format!("\u{feff}{}", SMALL.replace('\n', "\r\n")));
    assert_eq!(dressed.electrodes, plain.electrodes);
    let bad = format!("\u{feff}{}", SMALL.replace('\n', "\r\n").replace("b.stl\"", "b.stl\"\r\nshap = 1"));
    assert!(refused(&bad).contains("line 11, column 1"), "{}", refused(&bad));
}

#[test]
fn a_bonded_live_electrode_needs_one_value_a_bond() {
    let text = SMALL.replace("floating", "live");
    let case = "[[voltage_case]]\nname = \"v\"\nvalue_is = \"dc\"\n";
    let bond = "[[bond]]\nmembers = [\"a\", \"b\"]\n";
    assert!(refused(&format!("{text}{case}")).contains("live electrodes `a`, `b`"));
    assert!(refused(&format!("{text}{case}potentials = {{ a = \"1 V\" }}")).contains("live electrode `b`"));
    parsed(&format!("{text}{bond}{case}potentials = {{ a = \"1 V\" }}"));
    parsed(&format!("{text}{bond}{case}potentials = {{ a = \"1 V\", b = \"1 V\" }}"));
    let split = refused(&format!("{text}{bond}{case}potentials = {{ a = \"1 V\", b = \"2 V\" }}"));
    assert!(split.contains("different potentials for `a`, `b`"), "{split}");
    let both =
        refused(&format!("{text}{bond}{case}potentials = {{ a = \"1 V\" }}\ncharges = {{ b = \"1 C\" }}"));
    assert!(both.contains("both a potential and a charge"), "{both}");
    let earth = bond.replace("\"b\"", "\"b\", \"earth\"");
    parsed(&format!("{text}{earth}{case}"));
    let held = refused(&format!("{text}{earth}{case}potentials = {{ b = \"2 V\" }}"));
    assert!(held.contains("bonded with earth"), "{held}");
}

#[test]
fn files_are_read_once_and_missing_ones_are_all_told() {
    let dir = tempfile::tempdir().unwrap();
    let path = dir.path().join("case.toml");
    let text = SMALL.replace("\"b.stl\"", "[\"a.stl\", \"b.stl\"]");
    fs::write(&path, &text).unwrap();
    match case::load(&path) {
        Err(error @ CaseError::UnreadShapes(_)) => {
            assert!(error.is_unread());
            let text = error.to_string();
            assert!(text.contains("a.stl") && text.contains("b.stl"), "{text}");
        }
        other => panic!("{other:?}"),
    }
    fs::write(dir.path().join("a.stl"), "A").unwrap();
    fs::write(dir.path().join("b.stl"), "B").unwrap();
    let (case, shapes) = case::load(&path).unwrap();
    assert_eq!(shapes.files.len(), 2);
    assert_eq!(case.electrodes[1].files, [0, 1]);
    assert_eq!(shapes.files[1].bytes, b"B");

    let missing = case::load(&dir.path().join("none.toml")).unwrap_err();
    assert!(missing.is_unread() && missing.to_string().contains("none.toml"), "{missing}");
}

#[test]
fn a_plus_in_the_name_of_an_electrode_is_refused() {
    let text = SMALL.replace("name = \"a\"", "name = \"a+b\"");
    let said = case::parse(&text, Path::new("c.toml")).unwrap_err().to_string();
    assert!(said.contains("line 5") && said.contains("a name without `+`"), "{said}");
}
