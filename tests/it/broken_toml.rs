//! Broken case files: each is refused with the line, the key and what would be accepted.

use amberskin::case;
use std::fs;
use std::path::Path;

const SOUND: &str = r#"[units]
length = "mm"
[[electrode]]
name = "ball"
shape = "ball.stl"
role = "live"
[[electrode]]
name = "tap"
shape = "tap.stl"
role = "floating"
[[voltage_case]]
name = "case"
value_is = "peak"
potentials = { ball = "100 kV" }
"#;

/// A line of `SOUND`, what replaces it, and what the message must hold.
const BROKEN: &[(&str, &str, &[&str])] = &[
    // Not TOML, or not the right tables.
    ("length = \"mm\"", "length = mm", &["line 2", "length = mm"]),
    ("name = \"tap\"", "name = \"tap", &["line 8", "tap"]),
    ("role = \"live\"", "role = \"live\"\nrole = \"live\"", &["line 7", "duplicate key"]),
    ("[[electrode]]", "[[electrode]", &["line 3"]),
    ("[units]", "units = 5", &["line 1", "`units` takes"]),
    ("[units]", "[[units]]", &["`units` takes", "a table of its own"]),
    ("[[voltage_case]]", "[voltage_case]", &["line 11", "`voltage_case` takes", "double brackets"]),
    // Words.
    ("length = \"mm\"", "lenght = \"mm\"", &["line 2, column 1", "`lenght`", "did you mean `length`?"]),
    ("potentials = ", "potental = ", &["line 14", "`potental`", "`potentials`"]),
    ("[[electrode]]", "[[electrod]]", &["line 3", "`electrod`", "`electrode`"]),
    ("role = \"live\"", "edge_radius = \"1 mm\"", &["line 6", "`edge_radius`", "planned but not available"]),
    ("[units]", "[[dielectric]]\nname = \"x\"\n[units]", &["line 1", "`dielectric`", "planned"]),
    ("role = \"live\"", "quux = 1", &["line 6", "`quux`", "accepted are `name`, `shape`"]),
    ("role = \"live\"", "place = { shfit = [1, 2, 3] }", &["line 6", "`shfit` in place", "`shift`"]),
    // Units.
    ("length = \"mm\"", "", &["line 1", "`length`", "\"mm\""]),
    ("length = \"mm\"", "length = \"\"", &["line 2", "`length`", "`m`, `cm`, `mm`"]),
    ("length = \"mm\"", "length = \"MM\"", &["line 2", "`MM`", "`mm`"]),
    ("length = \"mm\"", "length = 1", &["line 2", "`length` takes the name of a unit"]),
    ("\"100 kV\"", "100e3", &["line 14", "`potentials.ball`", "\"100 kV\""]),
    ("\"100 kV\"", "\"100\"", &["line 14", "`potentials.ball`", "has no unit", "`kV`"]),
    ("\"100 kV\"", "\"100 KV\"", &["line 14", "`KV` is no unit of potential", "`kV`"]),
    ("\"100 kV\"", "\"0,1 kV\"", &["line 14", "comma"]),
    ("\"100 kV\"", "\"1e400 kV\"", &["line 14", "not a finite number"]),
    ("\"100 kV\"", "true", &["line 14", "`potentials.ball` takes"]),
    // Names.
    ("name = \"tap\"", "name = \"GND\"", &["line 8", "`GND`", "0 V reference"]),
    ("name = \"tap\"", "name = \"Earth\"", &["line 8", "`Earth`", "0 V reference"]),
    ("name = \"tap\"", "name = \"0\"", &["line 8", "`0` cannot name an electrode"]),
    ("name = \"tap\"", "name = \"ball\"", &["line 8", "`ball` is there twice"]),
    ("name = \"tap\"", "", &["line 7", "has no `name`"]),
    ("name = \"tap\"", "name = \" tap\"", &["line 8", "blanks before or after"]),
    ("name = \"tap\"", "name = 5", &["line 8", "`name` takes a text"]),
    ("ball = \"100", "bal = \"100", &["line 14", "no electrode is called `bal`", "`ball`"]),
    ("ball = \"100", "earth = \"100", &["line 14", "`earth`", "0 V reference"]),
    // Shapes and places.
    ("shape = \"tap.stl\"", "", &["line 7", "the electrode `tap` has no `shape`"]),
    ("shape = \"tap.stl\"", "shape = []", &["line 9", "`shape` takes the path"]),
    ("shape = \"tap.stl\"", "shape = [\"t.stl\", \"t.stl\"]", &["line 9", "`t.stl` is there twice"]),
    (
        "shape = \"tap.stl\"",
        "shape = [\"t.stl\", \"u.stl\"]\nshell = 1",
        &["line 10", "`shell`", "one shape file"],
    ),
    ("role = \"live\"", "shell = -1", &["line 6", "`shell` cannot be -1", "from 0"]),
    ("role = \"live\"", "size_check = [100, 100]", &["line 6", "`size_check`", "three bare numbers"]),
    ("role = \"live\"", "size_check = [100, nan, 100]", &["line 6", "`size_check`", "three bare numbers"]),
    ("role = \"live\"", "size_check = [\"1 mm\", 1, 1]", &["line 6", "`size_check`", "declared length unit"]),
    ("role = \"live\"", "size_check = [-1, 1, 1]", &["line 6", "`size_check`"]),
    ("role = \"live\"", "place = { scale = 0 }", &["line 6", "`scale` cannot be 0"]),
    (
        "role = \"live\"",
        "place = { rotate = { axis = [0, 0, 0], angle = \"1 rad\" } }",
        &["`axis`", "not [0, 0, 0]"],
    ),
    ("role = \"live\"", "place = { rotate = { axis = [0, 0, 1], angle = 30 } }", &["`angle`", "\"30 deg\""]),
    ("role = \"live\"", "place = { rotate = 5 }", &["line 6", "`rotate` takes"]),
    ("role = \"live\"", "crease_angle = \"200 deg\"", &["line 6", "`crease_angle`", "180 deg"]),
    ("role = \"live\"", "sheet = \"yes\"", &["line 6", "`sheet` takes true or false"]),
    ("role = \"live\"", "surface = \"as drawn\"", &["line 6", "did you mean `as_drawn`?"]),
    // Roles and limits.
    ("role = \"live\"", "role = \"grounded\"", &["line 6", "use `earthed`"]),
    ("role = \"live\"", "role = \"lieve\"", &["line 6", "did you mean `live`?"]),
    ("role = \"live\"", "role = \"guard\"", &["line 3", "has no `follows`"]),
    ("role = \"live\"", "role = \"guard\"\nfollows = \"tip\"", &["line 7", "called `tip`"]),
    ("role = \"live\"", "role = \"guard\"\nfollows = \"ball\"", &["line 7", "in a ring: ball → ball"]),
    ("role = \"live\"", "role = \"live\"\nfollows = \"tap\"", &["line 7", "`follows` belongs to"]),
    ("role = \"live\"", "field_limit = \"2.6 kV/mm\"", &["line 6", "`peak`, `rms` or `dc`"]),
    ("role = \"live\"", "field_limit = \"2.6 kV peak\"", &["line 6", "`kV` is no unit of field"]),
    ("role = \"live\"", "field_limit = \"-2 kV/mm dc\"", &["line 6", "above zero"]),
    // Voltage cases.
    ("value_is = \"peak\"", "", &["line 11", "has no `value_is`"]),
    ("value_is = \"peak\"", "value_is = \"crest\"", &["line 13", "`value_is` cannot be `crest`", "`peak`"]),
    (
        "potentials = { ball = \"100 kV\" }",
        "",
        &["line 12", "no potential or charge for the live electrode `ball`"],
    ),
    (
        "\"100 kV\" }",
        "\"1 kV\" }\ncharges = { ball = \"1 nC\" }",
        &["both a potential and a charge for `ball`"],
    ),
    ("\"100 kV\" }", "\"1 kV\" }\ncharges = { tap = \"1 F\" }", &["line 15", "`F` is no unit of charge"]),
    (
        "potentials = { ball = \"100 kV\" }",
        "potentials = \"100 kV\"",
        &["line 14", "`potentials` takes a table"],
    ),
    ("\"100 kV\" }", "\"1 kV\" }\nphases = { ball = \"0 deg\" }", &["line 15", "`phases`", "planned"]),
];

/// Tables put before the sound case, and what the message must hold.
const ADDED: &[(&str, &[&str])] = &[
    ("[[bond]]\nmembers = [\"ball\"]", &["line 2", "`members`", "at least two"]),
    ("[[bond]]\nmembers = [\"ball\", \"tab\"]", &["line 2", "called `tab`", "`tap`"]),
    ("[[bond]]", &["line 1", "has no `members`"]),
    ("[[earth_plane]]\nthrough = [0, 0, 0]", &["line 1", "has no `facing`"]),
    ("[[earth_plane]]\nthrough = [0, 0, 0]\nfacing = [0, 0, 0]", &["line 3", "`facing`", "direction"]),
    (
        "[[earth_plane]]\nthrough = [0, 0, 0]\nfacing = [0, 0, 1]\n[[earth_plane]]\nthrough = [0, 0, 0]\nfacing = [0, 1, 0]",
        &["line 4", "only one [[earth_plane]]"],
    ),
    ("[[look]]\nname = \"l\"", &["line 2", "exactly one of `point`, `line` and `sheet`"]),
    ("[[look]]\nname = \"l\"\nline = { from = [0, 0, 0], to = [1, 0, 0] }", &["line 3", "has no `points`"]),
    (
        "[[look]]\nname = \"l\"\nline = { from = [0, 0, 0], to = [1, 0, 0], points = 1e9 }",
        &["line 3", "`points`", "from 2 to 100000"],
    ),
    (
        "[[look]]\nname = \"l\"\nsheet = { corner = [0, 0, 0], along = [1, 0, 0], across = [0, 1, 0], points = [9999, 9999] }",
        &["line 3", "`points`", "at most 100000"],
    ),
    ("[accuracy]\ncapacitance = 0.005", &["line 2", "`capacitance`", "\"0.5 %\""]),
    ("[accuracy]\ncapacitance = \"0 %\"", &["line 2", "`capacitance`", "above zero"]),
    ("[accuracy]\ncapacitance = \"200 %\"", &["line 2", "`capacitance`", "below 100 %"]),
    ("[accuracy]\nmax_panels = -4", &["line 2", "`max_panels` cannot be -4"]),
    ("[accuracy]\ntime_limit = \"10 minutes\"", &["line 2", "`minutes`", "`min`"]),
    ("[accuracy]\nthreads = 0", &["line 2", "`threads` cannot be 0"]),
    ("[surroundings]\nrelative_permittivity = 0", &["line 2", "`relative_permittivity`", "from 1"]),
    ("[surroundings]\nrelative_permittivity = inf", &["line 2", "`relative_permittivity`"]),
    ("[surroundings]\nmedium = \"air\"", &["line 2", "`medium`", "planned"]),
    ("[deliver]\nrecord = \"x\"\nmatrix = \"./x\"", &["line 3", "`matrix`", "also the record"]),
    ("[deliver]\nfolder = \".\"\nnetlist = \"broken.toml\"", &["line 3", "`netlist`", "the case file"]),
    ("[deliver]\nanswers = \"\"", &["line 2", "`answers` takes a text"]),
    ("[study]\ntitle = 5", &["line 2", "`title` takes a text"]),
];

fn message(text: &str) -> String {
    match case::parse(text, Path::new("broken.toml")) {
        Ok(_) => panic!("accepted:\n{text}"),
        Err(error) => error.to_string(),
    }
}

fn holds(text: &str, words: &[&str]) {
    let message = message(text);
    for word in words.iter().chain(&["broken.toml", "^"]) {
        assert!(message.contains(word), "`{word}` is not in the message about\n{text}\n\n{message}");
    }
}

#[test]
fn the_sound_case_is_accepted() {
    case::parse(SOUND, Path::new("sound.toml")).unwrap();
}

#[test]
fn broken_lines_are_told_with_place_and_remedy() {
    for (line, broken, words) in BROKEN {
        assert!(SOUND.contains(line), "{line}");
        holds(&SOUND.replacen(line, broken, 1), words);
    }
}

#[test]
fn broken_tables_are_told_with_place_and_remedy() {
    for (table, words) in ADDED {
        holds(&format!("{table}\n{SOUND}"), words);
    }
}

#[test]
fn all_that_is_wrong_is_told_at_once() {
    let text = SOUND
        .replace("length = \"mm\"", "length = \"furlong\"")
        .replace("role = \"live\"", "rolle = \"live\"")
        .replace("\"tap.stl\"", "7")
        .replace("100 kV", "100 kW");
    let message = message(&text);
    for word in ["4 problems", "line 2,", "line 6,", "line 9,", "line 14,"] {
        assert!(message.contains(word), "{word}:\n{message}");
    }
}

#[test]
fn an_empty_case_says_what_it_needs() {
    holds("", &["`length`"]);
    holds("[units]\nlength = \"m\"\n", &["`electrode`"]);
}

#[test]
fn hostile_texts_are_refused_shortly() {
    let deep = format!("x = {}", "[".repeat(100_000));
    let dotted = format!("{}x = 1", "a.".repeat(100_000));
    let long = format!("x = \"{}\"", "y".repeat(1_000_000));
    let word = format!("{} = 1", "z".repeat(1_000_000));
    for text in [deep, dotted, long, word, "\0".to_owned(), "\u{1b}[31m = 1".to_owned()] {
        let message = message(&text);
        assert!(message.len() < 20_000, "{} bytes", message.len());
        assert!(!message.contains('\u{1b}'), "{message:?}");
    }
}

#[test]
fn files_that_are_no_text_are_refused() {
    let dir = tempfile::tempdir().unwrap();
    let path = dir.path().join("case.toml");
    let utf16: Vec<u8> = [0xff, 0xfe].into_iter().chain(SOUND.bytes().flat_map(|b| [b, 0])).collect();
    fs::write(&path, utf16).unwrap();
    let message = case::load(&path).unwrap_err().to_string();
    assert!(message.contains("UTF-16") && message.contains("line 1"), "{message}");
    fs::write(&path, b"[units]\nlength = \"\xb5m\"\n").unwrap();
    let message = case::load(&path).unwrap_err().to_string();
    assert!(message.contains("not UTF-8") && message.contains("line 2, column 11"), "{message}");
    let folder = case::load(dir.path()).unwrap_err();
    assert!(folder.is_unread(), "{folder}");
}

/// Bytes, lines and words cut, doubled and swapped at random places, the same every time.
#[test]
fn mutated_cases_are_read_or_refused_and_never_panic() {
    let mut state = 0x9e37_79b9_7f4a_7c15_u64;
    let mut below = |n: usize| {
        // Marsaglia, Xorshift RNGs, J. Stat. Softw. 8 (2003), the triple 13, 7, 17.
        state ^= state << 13;
        state ^= state >> 7;
        state ^= state << 17;
        (state % n as u64) as usize
    };
    const PARTS: [&str; 12] = [
        "[[",
        "]]",
        "\"",
        "=",
        "{",
        "}",
        "nan",
        "-1e308",
        "\u{e9}",
        "[[look]]\nline = 1\n",
        "earth",
        "99999999999999999999",
    ];
    let (mut read, mut refused) = (0, 0);
    for _ in 0..3000 {
        let mut text: Vec<char> = SOUND.chars().collect();
        for _ in 0..=below(3) {
            let at = below(text.len());
            match below(4) {
                0 => drop(text.remove(at)),
                1 => text.swap(at, SOUND.len() / 2),
                2 => drop(text.splice(at..at, PARTS[below(PARTS.len())].chars())),
                _ => drop(text.drain(at..(at + below(20)).min(text.len()))),
            }
        }
        let text: String = text.into_iter().collect();
        match case::parse(&text, Path::new("mutated.toml")) {
            Ok(_) => read += 1,
            Err(error) => {
                refused += 1;
                assert!(error.to_string().contains("line "), "{error}");
            }
        }
    }
    assert!(0 < read && read < refused, "{read} read, {refused} refused");
}
