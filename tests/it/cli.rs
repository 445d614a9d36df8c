//! The built program: arguments, exit codes, what goes to which stream.

use std::fs;
use std::path::Path;
use std::process::Command;
use std::process::Output;

const CASE: &str = r#"
[units]
length = "mm"
[[electrode]]
name = "ball"
shape = "ball.stl"
"#;

/// A ball without facets: refused, but only once it is read.
const EMPTY: &str = "solid x\nendsolid x\n";

/// A folder with `case.toml` and the ball of it.
fn laid_out(case: &str, ball: &str) -> tempfile::TempDir {
    let dir = tempfile::tempdir().unwrap();
    fs::write(dir.path().join("case.toml"), case).unwrap();
    fs::write(dir.path().join("ball.stl"), ball).unwrap();
    dir
}

/// A record of one sphere of radius 1 m: 4πε₀ · 1 m, CODATA 2022.
const RECORD: &str = r#"{
  "schema": 1,
  "program": { "name": "amberskin", "version": "0.1.0" },
  "cautions": ["estimate"],
  "verdict": { "word": "not_met", "codes": [4, 3], "reasons": ["a limit is exceeded", "the bar is too wide"] },
  "case": { "text": "", "sha256": "00", "resolved": { "units.length": "m", "units.capacitance": "pF" } },
  "shapes": [],
  "surface_file": { "path": "surface.vtu", "sha256": "00" },
  "electrodes": ["Ball 1"],
  "rows": [{ "members": ["Ball 1"], "role": "floating" }],
  "accuracy": { "asked": 0.005, "reached": 0.006 },
  "capacitance_farad": [[1.1126500562e-10]],
  "capacitance_bar_farad": [[6e-13]],
  "mutual_farad": [[0.0]],
  "mutual_bar_farad": [[0.0]],
  "earth_farad": [1.1126500562e-10],
  "earth_bar_farad": [6e-13],
  "earth_share": [1.0],
  "potential_coefficients_per_farad": [[8987551787.0]],
  "potential_coefficients_bar_per_farad": [[5e7]],
  "checks": [],
  "findings": [],
  "parts": [],
  "edges": [],
  "looks": [],
  "voltage_cases": [],
  "budget": { "entries": [] },
  "effort": {
    "panels": 60, "unknowns": 60, "rounds": 1, "method": "dense", "seconds": {},
    "peak_memory_bytes": 0, "threads": 1, "history": []
  }
}"#;

fn run(folder: &Path, words: &[&str]) -> Output {
    Command::new(env!("CARGO_BIN_EXE_amberskin")).current_dir(folder).args(words).output().unwrap()
}

/// Runs in an empty folder.
fn alone(words: &[&str]) -> (i32, String, String) {
    told(run(tempfile::tempdir().unwrap().path(), words))
}

fn told(output: Output) -> (i32, String, String) {
    let text = |bytes| String::from_utf8(bytes).unwrap();
    (output.status.code().unwrap(), text(output.stdout), text(output.stderr))
}

#[test]
fn help_and_version_are_results_and_end_with_0() {
    for words in [&["--help"][..], &["-h"], &["--version"], &["solve", "--help"], &["inspect", "--help"]] {
        let (code, out, err) = alone(words);
        assert_eq!((code, err.as_str()), (0, ""), "{words:?}");
        assert!(!out.is_empty(), "{words:?}");
    }
    let (_, help, _) = alone(&["--help"]);
    for word in ["[[electrode]]", "size_check", "\"100 kV\"", "EXIT CODES", "130", "not a rating"] {
        assert!(help.contains(word), "{word}: {help}");
    }
}

#[test]
fn usage_errors_end_with_1_and_go_to_standard_error() {
    let wrong: [&[&str]; 8] = [
        &[],
        &["slove", "x.toml"],
        &["solve"],
        &["solve", "a.toml", "b.toml"],
        &["solve", "a.toml", "--fast"],
        &["matrix", "r.json", "--form", "square"],
        &["matrix", "r.json", "--csv", "--json"],
        &["netlist", "r.json", "--overwrite"],
    ];
    for words in wrong {
        let (code, out, err) = alone(words);
        assert_eq!((code, out.as_str()), (1, ""), "{words:?}");
        assert!(err.contains("--help"), "{words:?}: {err}");
    }
    assert!(alone(&["slove", "x.toml"]).2.contains("'solve'"));
}

#[test]
fn files_that_are_not_there_end_with_6() {
    for words in
        [&["solve", "no.toml"][..], &["matrix", "no.json"], &["inspect", "no.toml"], &["inspect", "no.stl"]]
    {
        let (code, out, err) = alone(words);
        assert_eq!((code, out.as_str()), (6, ""), "{words:?}: {err}");
        assert!(err.contains("error: ") && err.contains(words[1]), "{err}");
    }
}

#[test]
fn a_shape_that_is_not_there_ends_with_6_and_names_it() {
    let dir = tempfile::tempdir().unwrap();
    fs::write(dir.path().join("case.toml"), CASE).unwrap();
    let (code, _, err) = told(run(dir.path(), &["solve", "case.toml"]));
    assert_eq!(code, 6, "{err}");
    assert!(err.contains("ball.stl"), "{err}");
}

#[test]
fn a_case_that_makes_no_sense_ends_with_1_and_its_line() {
    let dir = tempfile::tempdir().unwrap();
    fs::write(dir.path().join("case.toml"), CASE.replace("shape", "shap")).unwrap();
    let (code, out, err) = told(run(dir.path(), &["solve", "case.toml", "--quiet"]));
    assert_eq!((code, out.as_str()), (1, ""), "{err}");
    assert!(err.contains("line 6, column 1") && err.contains("did you mean `shape`?"), "{err}");
    let (code, out, _) = told(run(dir.path(), &["solve", "case.toml", "--json"]));
    let value: serde_json::Value = serde_json::from_str(&out).unwrap();
    assert_eq!((code, value["error"]["exit_code"].as_i64()), (1, Some(1)));
}

#[test]
fn case_and_stl_files_do_not_mix() {
    let (code, _, err) = alone(&["inspect", "a.toml", "b.stl"]);
    assert_eq!(code, 1, "{err}");
    assert!(err.contains("not both"), "{err}");
}

#[test]
fn a_record_of_another_case_stays_unless_told_otherwise() {
    let dir = laid_out(CASE, EMPTY);
    let folder = dir.path().join("out/case");
    fs::create_dir_all(&folder).unwrap();
    for (text, words) in [(RECORD, "another case"), ("mine", "no record of this program")] {
        fs::write(folder.join("record.json"), text).unwrap();
        let (code, _, err) = told(run(dir.path(), &["solve", "case.toml"]));
        assert_eq!(code, 1, "{err}");
        assert!(err.contains(words) && err.contains("--overwrite"), "{err}");
        assert_eq!(fs::read_to_string(folder.join("record.json")).unwrap(), text);
    }
    let (code, _, err) = told(run(dir.path(), &["solve", "case.toml", "--overwrite"]));
    assert_ne!(code, 1, "{err}");
}

#[test]
fn a_file_that_is_no_earlier_result_stays_unless_told_otherwise() {
    let case = CASE.to_owned() + "[deliver]\nanswers = \"a.txt\"\nmatrix = \"m.csv\"\nnetlist = \"n.cir\"\n";
    let dir = laid_out(&case, EMPTY);
    let folder = dir.path().join("out/case");
    fs::create_dir_all(&folder).unwrap();
    for name in ["surface.vtu", "a.txt", "m.csv", "m_long.csv", "n.cir"] {
        let path = folder.join(name);
        fs::write(&path, "mine").unwrap();
        let (code, _, err) = told(run(dir.path(), &["solve", "case.toml"]));
        assert_eq!(code, 1, "{name}: {err}");
        assert!(err.contains(name) && err.contains("--overwrite"), "{name}: {err}");
        assert_eq!(fs::read_to_string(&path).unwrap(), "mine", "{name}");
        let (code, _, err) = told(run(dir.path(), &["solve", "case.toml", "--overwrite"]));
        assert_eq!(code, 2, "{name}: the empty ball is refused now: {err}");
        fs::remove_file(&path).unwrap();
    }
}

#[test]
fn a_shape_is_never_written_over() {
    let case = CASE.to_owned() + "[deliver]\nfolder = \".\"\nanswers = \"ball.stl\"\n";
    let dir = laid_out(&case, EMPTY);
    let (code, _, err) = told(run(dir.path(), &["solve", "case.toml", "--overwrite"]));
    assert_eq!(code, 1, "{err}");
    assert!(err.contains("ball.stl: read by this case"), "{err}");
}

#[test]
fn refusals_alone_are_counted_as_problems() {
    // A tetrahedron without its last facet, and a facet given twice: one refusal, one repair told.
    let corners = ["0 0 0", "10 0 0", "0 10 0", "0 0 10"];
    let facets = [[0, 2, 1], [0, 1, 3], [0, 3, 2], [0, 3, 2]].map(|facet| {
        let lines = facet.map(|k| format!("vertex {}\n", corners[k])).concat();
        format!("facet normal 0 0 0\nouter loop\n{lines}endloop\nendfacet\n")
    });
    let dir = laid_out(CASE, &format!("solid x\n{}endsolid x\n", facets.concat()));
    let (code, _, err) = told(run(dir.path(), &["solve", "case.toml"]));
    assert_eq!(code, 2, "{err}");
    assert!(err.contains("note: ") && err.contains("geometry refused: 1 problem\n"), "{err}");
}

#[test]
fn a_record_or_case_in_the_wrong_place_is_recognised() {
    let dir = tempfile::tempdir().unwrap();
    fs::write(dir.path().join("r.json"), RECORD).unwrap();
    fs::write(dir.path().join("case.txt"), CASE).unwrap();
    for (words, said) in [
        (["solve", "r.json"], "this is a record"),
        (["inspect", "r.json"], "this is a record"),
        (["inspect", "case.txt"], "this looks like a case"),
    ] {
        let (code, _, err) = told(run(dir.path(), &words));
        assert_eq!(code, 1, "{err}");
        assert!(err.contains(said), "{err}");
    }
}

#[test]
fn a_record_answers_in_text_csv_and_json() {
    let dir = tempfile::tempdir().unwrap();
    fs::write(dir.path().join("r.json"), RECORD).unwrap();
    let (code, out, err) = told(run(dir.path(), &["matrix", "r.json"]));
    assert_eq!(code, 0, "{err}");
    assert!(out.contains("Maxwell capacitance matrix (charge per volt)") && out.contains("111."), "{out}");
    assert!(err.is_empty(), "the cautions stand in the text: {err}");
    for words in
        ["Untitled study", "Verdict: not met: estimate for", "asked 0.5 %, reached 0.6 %", "case sha256 00"]
    {
        assert!(out.contains(words), "{words}: {out}");
    }
    let (_, out, err) = told(run(dir.path(), &["matrix", "r.json", "--csv", "--form", "mutual", "--quiet"]));
    assert!(out.contains("earth_farad") && err.is_empty(), "{out}{err}");
    let (_, out, _) = told(run(dir.path(), &["matrix", "r.json", "--json", "--form", "charge-per-volt"]));
    let value: serde_json::Value = serde_json::from_str(&out).unwrap();
    assert_eq!(value["value_farad"][0][0].as_f64(), Some(1.1126500562e-10));
    let (_, out, _) = told(run(dir.path(), &["matrix", "r.json", "--json"]));
    let value: serde_json::Value = serde_json::from_str(&out).unwrap();
    assert_eq!(value.as_array().map(Vec::len), Some(3));
    let (code, out, _) = told(run(dir.path(), &["stress", "r.json"]));
    assert_eq!(code, 4, "codes of the record: 4 before 3");
    assert!(out.contains("Verdict: not met") && out.contains("No voltage case"), "{out}");
    let (_, out, _) = told(run(dir.path(), &["stress", "r.json", "--json"]));
    let value: serde_json::Value = serde_json::from_str(&out).unwrap();
    assert_eq!(
        (value["verdict"]["word"].as_str(), value["accuracy"]["asked"].as_f64()),
        (Some("not_met"), Some(0.005))
    );
    fs::write(
        dir.path().join("r.json"),
        RECORD.replace("\"mutual_farad\": [[0.0]]", "\"mutual_farad\": [[1e-12]]"),
    )
    .unwrap();
    let (code, out, err) = told(run(dir.path(), &["matrix", "r.json"]));
    assert_eq!((code, out.as_str()), (6, ""), "a record that contradicts itself");
    assert!(err.contains("at `mutual_farad`"), "{err}");
}

#[test]
fn a_netlist_goes_to_the_terminal_or_to_a_new_file() {
    let dir = tempfile::tempdir().unwrap();
    fs::write(dir.path().join("r.json"), RECORD).unwrap();
    let (code, out, _) = told(run(dir.path(), &["netlist", "r.json"]));
    assert_eq!(code, 0);
    assert!(out.contains(".subckt") && out.contains("Rbleed"), "{out}");
    let (_, out, _) = told(run(dir.path(), &["netlist", "r.json", "--no-bleed"]));
    assert!(!out.contains("\nRbleed"), "{out}");
    let (_, out, _) = told(run(dir.path(), &["netlist", "r.json", "--json"]));
    let value: serde_json::Value = serde_json::from_str(&out).unwrap();
    assert_eq!(value["pins"], serde_json::json!(["ball_1", "earth"]));
    let titled = RECORD.replace("\"resolved\": {", "\"resolved\": { \"study.title\": \"Ball, 1 m (test)\",");
    fs::write(dir.path().join("t.json"), titled).unwrap();
    let (_, out, _) = told(run(dir.path(), &["netlist", "t.json"]));
    assert!(out.contains(".subckt ball_1_m_test ball_1 earth"), "{out}");
    let words = ["netlist", "r.json", "-o", "new/n.cir"];
    let (code, out, err) = told(run(dir.path(), &words));
    assert_eq!((code, out.as_str()), (0, ""), "{err}");
    let (code, _, err) = told(run(dir.path(), &words));
    assert_eq!(code, 1, "{err}");
    let (code, _, err) = told(run(dir.path(), &["netlist", "r.json", "-o", "r.json/n.cir"]));
    assert_eq!(code, 6, "{err}");
}

#[test]
fn the_key_is_told_in_text_and_json() {
    let (code, out, err) = alone(&["key"]);
    assert_eq!((code, err.as_str()), (0, ""));
    assert!(out.contains("c_ij = -C_ij") && out.contains("0 V"), "{out}");
    let (_, out, _) = alone(&["key", "--json"]);
    assert!(serde_json::from_str::<serde_json::Value>(&out).is_ok(), "{out}");
}

/// The program waits for a case from a pipe that nobody writes to.
#[cfg(unix)]
#[test]
fn an_interrupt_ends_with_130_within_a_second() {
    let dir = tempfile::tempdir().unwrap();
    let shell = |line: &str| Command::new("sh").current_dir(dir.path()).args(["-c", line]).status().unwrap();
    assert!(shell("mkfifo case.toml").success());
    let mut child = Command::new(env!("CARGO_BIN_EXE_amberskin"))
        .current_dir(dir.path())
        .args(["solve", "case.toml"])
        .stderr(std::process::Stdio::piped())
        .spawn()
        .unwrap();
    // Time to start and to set its handler, also on a busy machine.
    std::thread::sleep(std::time::Duration::from_millis(700));
    assert!(shell(&format!("kill -INT {}", child.id())).success());
    let start = std::time::Instant::now();
    let code = child.wait().unwrap().code();
    assert_eq!(code, Some(130));
    assert!(start.elapsed().as_secs_f64() < 1.0, "{:?}", start.elapsed());
    let mut err = String::new();
    std::io::Read::read_to_string(&mut child.stderr.take().unwrap(), &mut err).unwrap();
    assert!(err.contains("interrupted"), "{err}");
}
