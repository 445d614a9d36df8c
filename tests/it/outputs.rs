//! What is written from a record: whole files, exact numbers, honest digits.
use crate::fixtures;
use crate::golden;
use amberskin::base::Vec3;
use amberskin::record::cautions::ESTIMATE;
use amberskin::record::{Record, RecordError, SurfaceTable, store};
use amberskin::report::vtu::TableProblem;
use amberskin::report::{Form, Printing, ReportError, Targets};
use amberskin::report::{answers, case_file, csv, deliver, json, netlist, printing, stl, tables, vtu};
use std::collections::BTreeMap;
use std::fs;
use std::io::Read;
use std::path::{Path, PathBuf};

fn text_of(write: impl FnOnce(&mut dyn std::io::Write) -> std::io::Result<()>) -> String {
    let mut bytes = Vec::new();
    write(&mut bytes).unwrap();
    String::from_utf8(bytes).unwrap()
}

fn stored(record: &Record) -> String {
    let mut bytes = Vec::new();
    store::write(record, &mut bytes).unwrap();
    String::from_utf8(bytes).unwrap()
}

/// Reads a record from `text` put into a file.
fn read_back(text: &str) -> Result<Record, RecordError> {
    let folder = fixtures::folder();
    let path = folder.path().join("record.json");
    fs::write(&path, text).unwrap();
    store::read(&path)
}

#[test]
fn a_record_reads_back_to_the_same_bits() {
    let mut record = fixtures::record();
    let mut bits = 0x9E37_79B9_7F4A_7C15_u64;
    for _ in 0..200 {
        for value in record.capacitance_bar_farad.iter_mut().flatten() {
            bits = bits.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1);
            let any = f64::from_bits(bits);
            *value = if any.is_finite() { any } else { 5e-324 };
        }
        let back = read_back(&stored(&record)).unwrap();
        assert_eq!(back, record, "the record read back");
    }
}

#[test]
fn what_cannot_be_read_back_is_never_written() {
    let refused = |change: &dyn Fn(&mut Record)| {
        let mut record = fixtures::record();
        change(&mut record);
        let mut bytes = Vec::new();
        let error = store::write(&record, &mut bytes).unwrap_err();
        assert!(bytes.is_empty(), "nothing is written");
        error.to_string()
    };
    let text = refused(&|r| r.capacitance_farad[1][2] = f64::NAN);
    assert!(text.contains("`capacitance_farad[1][2]`"), "{text}");
    let text = refused(&|r| r.mutual_farad[1].truncate(2));
    assert!(text.contains("does not fit its 3 electrodes, at `mutual_farad`"), "{text}");
    let text = refused(&|r| r.voltage_cases[0].energy_joule = f64::INFINITY);
    assert!(text.contains("`voltage_cases[0].energy_joule`"), "{text}");
    let text = refused(&|r| r.voltage_cases[1].maxima[0].margin = Some(f64::NAN));
    assert!(text.contains("`voltage_cases[1].maxima[0].margin`"), "{text}");
}

#[test]
fn complaints_about_a_record_name_line_and_key() {
    let text = stored(&fixtures::record());
    let complaint = |text: &str| read_back(text).unwrap_err().to_string();
    let said = complaint(&text.replace("\"schema\": 1", "\"schema\": 7"));
    assert!(said.contains("line 2, at `schema`: schema 7; schema 1 is accepted"), "{said}");
    let said = complaint(&text.replace("\"asked\": 0.005", "\"asked\": \"much\""));
    assert!(said.contains("at `accuracy.asked`: invalid type: string \"much\", expected f64"), "{said}");
    let line = 1 + text.lines().position(|line| line.contains("\"asked\"")).unwrap();
    assert!(said.contains(&format!("line {line}, ")), "{said}");
    let said = complaint(&text.replace("\"facets\": 2500,", ""));
    assert!(said.contains("at `parts[0]") && said.contains("missing field `facets`"), "{said}");
    let said = complaint(&text[..text.len() / 2]);
    assert!(said.contains("record.json: line ") && said.contains("EOF"), "{said}");
    let said = complaint("{}");
    assert!(said.contains("missing field `schema`"), "{said}");
    let mut short: serde_json::Value = serde_json::from_str(&text).unwrap();
    short["mutual_farad"][1].as_array_mut().unwrap().pop();
    let said = complaint(&short.to_string());
    assert!(said.contains("at `mutual_farad`: does not fit the 3 electrodes"), "{said}");
    let said = complaint(&"[".repeat(100_000));
    assert!(said.contains("recursion limit"), "{said}");
    assert!(
        matches!(store::read(Path::new("/nowhere/record.json")), Err(RecordError::Read { .. })),
        "no file"
    );
}

#[test]
fn a_record_that_contradicts_itself_is_not_read() {
    let text = stored(&fixtures::record());
    let complaint = |change: &dyn Fn(&mut serde_json::Value)| {
        let mut value: serde_json::Value = serde_json::from_str(&text).unwrap();
        change(&mut value);
        read_back(&serde_json::to_string_pretty(&value).unwrap()).unwrap_err().to_string()
    };
    let said = complaint(&|v| v["mutual_farad"][0][1] = 1.3e-12.into());
    assert!(said.contains("at `mutual_farad`: `ball` and `tap` have 1.3e-12 F, but 1.237"), "{said}");
    let said = complaint(&|v| v["capacitance_farad"][2][2] = 5.4e-12.into());
    assert!(said.contains("at `earth_farad`: `foot` has 4.42"), "{said}");
    let said = complaint(&|v| v["earth_share"][0] = 0.5.into());
    assert!(said.contains("at `earth_share`: `ball` has 5e-1, but 7.59"), "{said}");
    let said = complaint(&|v| v["verdict"]["word"] = "met".into());
    assert!(said.contains("the verdict `met` does not fit the codes [4]"), "{said}");
    let said = complaint(&|v| v["verdict"]["word"] = "fine".into());
    assert!(said.contains("`fine` is no verdict; met, not_met or not_decided is"), "{said}");
    let said = complaint(&|v| {
        v["verdict"]["word"] = "met".into();
        v["verdict"]["codes"] = serde_json::json!([]);
    });
    assert!(said.contains("at `codes`: a field limit is not met or not decided, but 4"), "{said}");
    let said = complaint(&|v| v["checks"][0]["pass"] = false.into());
    assert!(said.contains("a check failed, but 5 is not among [4]"), "{said}");
    let said = complaint(&|v| v["accuracy"]["reached"] = 0.02.into());
    assert!(said.contains("wider than the one asked, but 3"), "{said}");
}

#[test]
fn keys_of_later_versions_are_passed_over() {
    let text = stored(&fixtures::record()).replacen('{', "{\n  \"torsion\": {\"a\": [1, 2]},", 1);
    assert_eq!(read_back(&text).unwrap(), fixtures::record(), "the rest of the record");
}

fn targets(folder: &Path) -> Targets {
    Targets {
        record: folder.join("out/record.json"),
        surface: folder.join("out/surface.vtu"),
        answers: Some(folder.join("out/answers.txt")),
        matrix: Some(folder.join("out/matrix.csv")),
        netlist: Some(folder.join("out/netlist.cir")),
    }
}

fn names_in(folder: &Path) -> Vec<String> {
    let mut names: Vec<String> =
        fs::read_dir(folder).unwrap().map(|e| e.unwrap().file_name().into_string().unwrap()).collect();
    names.sort();
    names
}

#[test]
fn every_file_asked_for_is_delivered_the_record_last() {
    let folder = fixtures::folder();
    let targets = targets(folder.path());
    let mut record = fixtures::record();
    let written = deliver(&mut record, &fixtures::surface(), &targets, &Printing::default()).unwrap();
    let names: Vec<_> = written.iter().map(|p| p.file_name().unwrap().to_str().unwrap()).collect();
    let expected =
        ["surface.vtu", "answers.txt", "matrix.csv", "matrix_long.csv", "netlist.cir", "record.json"];
    assert_eq!(names, expected, "in the order written");
    assert_eq!(names_in(&folder.path().join("out")).len(), 6, "and nothing beside them");
    assert_eq!(store::read(&targets.record).unwrap(), record, "the record given back is the one written");
    let surface = fs::read(&targets.surface).unwrap();
    assert_eq!(record.surface_file.path, "surface.vtu", "its name beside the record");
    assert_eq!(record.surface_file.sha256, amberskin::record::sha256(&surface), "its hash");
    let sheet = fs::read_to_string(targets.answers.unwrap()).unwrap();
    assert!(sheet.contains(&record.surface_file.sha256), "the hash stands on the sheet");
    let again: Vec<Vec<u8>> = written.iter().map(|path| fs::read(path).unwrap()).collect();
    deliver(&mut record, &fixtures::surface(), &self::targets(folder.path()), &Printing::default()).unwrap();
    for (path, bytes) in written.iter().zip(again) {
        assert!(fs::read(path).unwrap() == bytes, "{}: the same bytes twice", path.display());
    }
}

/// `FIPS 180-4` test vector.
#[test]
fn the_hash_is_sha_256() {
    let abc = "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad";
    assert_eq!(amberskin::record::sha256(b"abc"), abc);
}

#[cfg(unix)]
#[test]
fn delivered_files_have_the_permissions_of_any_new_file() {
    use std::os::unix::fs::PermissionsExt;
    let folder = fixtures::folder();
    let targets = targets(folder.path());
    deliver(&mut fixtures::record(), &fixtures::surface(), &targets, &Printing::default()).unwrap();
    let plain = folder.path().join("plain");
    fs::write(&plain, "").unwrap();
    let mode = |path: &Path| fs::metadata(path).unwrap().permissions().mode();
    assert_eq!(mode(&targets.record), mode(&plain), "not the 0600 of a temporary file");
}

#[test]
fn what_cannot_be_delivered_leaves_nothing_behind() {
    let folder = fixtures::folder();
    let tried = |change: &dyn Fn(&mut Record, &mut SurfaceTable, &mut Targets)| {
        let mut targets = targets(folder.path());
        let (mut record, mut surface) = (fixtures::record(), fixtures::surface());
        change(&mut record, &mut surface, &mut targets);
        let error = deliver(&mut record, &surface, &targets, &Printing::default()).unwrap_err();
        assert!(!folder.path().join("out").exists(), "nothing was written: {error}");
        error
    };
    let error = tried(&|r, _, _| r.earth_farad[0] = f64::NAN);
    assert!(matches!(&error, ReportError::Record { path, .. } if path.ends_with("record.json")), "{error}");
    let error = tried(&|_, s, _| s.residual[1][3][5] = f64::NAN);
    let problem = TableProblem::NotFinite { array: "residual".into(), panel: 3 };
    assert!(matches!(&error, ReportError::Table { problem: p, .. } if *p == problem), "{error}");
    let error = tried(&|_, s, _| s.row[2] = 2);
    assert!(matches!(error, ReportError::Table { problem: TableProblem::Index { panel: 2 }, .. }), "{error}");
    let error = tried(&|_, _, t| t.netlist = Some(t.record.with_file_name("matrix_long.csv")));
    assert!(matches!(error, ReportError::SameName { .. }), "{error}");
    fs::write(folder.path().join("file"), "").unwrap();
    let error = tried(&|_, _, t| t.surface = folder_in_the_way(t));
    assert!(matches!(&error, ReportError::Folder { path, .. } if path.ends_with("file")), "{error}");
}

/// A path below a plain file.
fn folder_in_the_way(targets: &Targets) -> PathBuf {
    targets.record.parent().unwrap().with_file_name("file").join("surface.vtu")
}

#[test]
fn the_answer_sheet_reads_as_agreed() {
    let mut record = fixtures::record();
    record.surface_file.path = "surface.vtu".into();
    record.surface_file.sha256 = "cd".repeat(32);
    let sheet = answers::sheet(&record, &printing::of_record(&record));
    golden::check("answers.txt", &sheet, 0.0);
}

#[test]
fn the_units_of_the_case_are_kept_with_the_record() {
    let mut record = fixtures::record();
    for (key, name) in [("length", "in"), ("capacitance", "fF"), ("field", "kV/cm")] {
        record.case.resolved.insert(format!("units.{key}"), name.into());
    }
    let found = printing::of_record(&record);
    assert_eq!((found.length, found.capacitance, found.field), (0.0254, 1e-15, 1e5), "{found:?}");
    record.case.resolved.clear();
    assert_eq!(printing::of_record(&record), Printing::default(), "where it names none");
}

#[test]
fn cautions_stand_where_they_belong() {
    let record = fixtures::record();
    let sheet = answers::sheet(&record, &Printing::default());
    for line in sheet.lines() {
        let judges = ["limit ", "margin", "Verdict:"].iter().any(|word| line.contains(word));
        assert!(!judges || line.contains(ESTIMATE), "no caution on: {line}");
        let alive = line.contains("Charges:") || line.contains("energy");
        assert!(!alive || line.contains("may stay charged after switch-off"), "no caution on: {line}");
    }
    let floats = "tap: floats at 31.160 ± 0.046 kV peak: treat as live until earthed.";
    assert!(sheet.contains(floats), "{sheet}");
    for text in [json::matrix_json(&record, Form::Mutual), json::stress_json(&record)] {
        let value: serde_json::Value = serde_json::from_str(&text).unwrap();
        assert_eq!(value["cautions"].as_array().unwrap().len(), 3, "{text}");
        assert_eq!(value["verdict"]["caution"], ESTIMATE, "{text}");
    }
    let table = text_of(|out| csv::square(&record, Form::Maxwell, out));
    assert!(table.contains("# caution: estimate for comparing designs"), "{table}");
}

#[test]
fn the_bare_words_are_never_printed() {
    let record = fixtures::record();
    let mut texts = vec![answers::sheet(&record, &Printing::default())];
    texts.extend(Form::ALL.map(|form| tables::matrix_text(&record, form, &Printing::default())));
    texts.extend(Form::ALL.map(|form| text_of(|out| csv::square(&record, form, out))));
    for text in texts {
        let spelt_out = text.replace("Maxwell capacitance matrix (charge per volt)", "");
        assert!(!spelt_out.contains("Maxwell"), "{spelt_out}");
        assert!(!text.contains("self capacitance") && !text.contains("self-capacitance"), "{text}");
        assert!(!text.contains("-0.0 ") && !text.contains("NaN"), "{text}");
    }
}

#[test]
fn names_with_line_breaks_cannot_forge_lines() {
    let mut record = fixtures::record();
    record.case.resolved.insert("study.title".into(), "A\nV1 ball 0 1\r.include x".into());
    let options = netlist::Options { name: "x".into(), bleeds: true };
    for text in [
        text_of(|out| netlist::write(&record, &options, out)),
        text_of(|out| csv::square(&record, Form::Maxwell, out)),
        answers::sheet(&record, &Printing::default()),
    ] {
        assert!(!text.contains("\nV1") && !text.contains("\n.include") && !text.contains('\r'), "{text}");
    }
}

#[test]
fn many_slivers_and_edges_are_counted_and_few_printed() {
    let mut record = fixtures::record();
    let edge = record.edges[0].clone();
    record.edges.extend(vec![edge; 6]);
    let mut sliver = record.findings[0].clone();
    (sliver.code, sliver.text) =
        ("sliver".into(), "`tap`: sliver at (0, 0.03, 1e-5) m: 2000 times as long".into());
    record.findings.extend(vec![sliver; 9]);
    record.case.resolved.insert("electrode.tap.turn".into(), "0.6108652381980153 rad about 0.25".into());
    let text = answers::sheet(&record, &Printing::default());
    assert_eq!(text.matches("unbounded at edge, 90 degrees").count(), 3, "{text}");
    assert!(text.contains("foot: 4 more unbounded edges stand in the record"), "{text}");
    assert_eq!(text.matches("`tap`: sliver at (0, 30, 0.01) mm: 2000 times").count(), 5, "{text}");
    assert!(text.contains("`tap`: 4 more lines on slivers stand in the record"), "{text}");
    assert!(text.contains("turn = 0.610865 rad about 0.25\n"), "{text}");
}

#[test]
fn the_square_matrix_has_its_unit_in_the_header() {
    golden::check("matrix.csv", &text_of(|out| csv::square(&fixtures::record(), Form::Mutual, out)), 1e-12);
}

#[test]
fn the_long_form_holds_every_entry_with_its_bar() {
    let record = fixtures::record();
    let text = text_of(|out| csv::long(&record, out));
    let mut reader = ::csv::ReaderBuilder::new().comment(Some(b'#')).from_reader(text.as_bytes());
    assert_eq!(&reader.headers().unwrap()[3], "value_farad");
    let lines: Vec<Vec<String>> =
        reader.records().map(|line| line.unwrap().iter().map(str::to_owned).collect()).collect();
    assert_eq!(lines.len(), 9 + 6 + 3 + 9, "per volt, mutual, earth, potential");
    let find = |row: &str, column: &str, kind: &str| -> &Vec<String> {
        lines.iter().find(|l| l[0] == row && l[1] == column && l[2] == kind).unwrap()
    };
    let exactly = |text: &str, value: f64| {
        assert_eq!(text.parse::<f64>().unwrap().to_bits(), value.to_bits(), "{text} for {value}");
    };
    exactly(&find("tap", "ball", "charge_per_volt")[3], record.capacitance_farad[1][0]);
    exactly(&find("foot", "earth", "earth")[4], record.earth_bar_farad[2]);
    let p = find("ball", "foot", "potential");
    assert_eq!(p[3], "", "another unit");
    exactly(&p[5], record.potential_coefficients_per_farad[0][2]);
}

/// A netlist read the way a simulator does: pins, capacitors, resistors.
struct Circuit {
    pins: Vec<String>,
    capacitors: Vec<(String, String, f64)>,
    resistors: usize,
}

/// `with_dropped` also takes the elements listed in comments.
fn parse_netlist(text: &str, with_dropped: bool) -> Circuit {
    let joined = text.replace("\n+", " ");
    let mut circuit = Circuit { pins: vec![], capacitors: vec![], resistors: 0 };
    for line in joined.lines() {
        let line = match line.strip_prefix("* left out: ") {
            Some(rest) if with_dropped => rest,
            _ => line,
        };
        let words: Vec<&str> = line.split_whitespace().collect();
        match line.chars().next() {
            Some('.') if words[0] == ".subckt" => {
                circuit.pins = words[2..].iter().map(|w| (*w).to_owned()).collect();
            }
            Some('C') => {
                circuit.capacitors.push((words[1].into(), words[2].into(), words[3].parse().unwrap()));
            }
            Some('R') => circuit.resistors += 1,
            _ => assert!(line.starts_with(['*', '.']), "unknown element: {line}"),
        }
    }
    circuit
}

/// Charge per volt of the pins, by nodal analysis.
fn reassemble(circuit: &Circuit) -> Vec<Vec<f64>> {
    let n = circuit.pins.len() - 1;
    let index = |name: &String| circuit.pins.iter().position(|pin| pin == name).unwrap();
    let mut c = vec![vec![0.0; n]; n];
    for (a, b, value) in &circuit.capacitors {
        let (a, b) = (index(a), index(b));
        for (i, j, sign) in [(a, a, 1.0), (b, b, 1.0), (a, b, -1.0), (b, a, -1.0)] {
            if i < n && j < n {
                c[i][j] += sign * value;
            }
        }
    }
    c
}

/// The fixture with one mutual under its bar, one negative within it, one negative beyond it.
fn awkward() -> Record {
    let mut record = fixtures::record();
    record.electrodes = ["Ball", "ball", "0 é"].map(str::to_owned).to_vec();
    let mut set = |i: usize, j: usize, value: f64, bar: f64| {
        for (i, j) in [(i, j), (j, i)] {
            let old = record.mutual_farad[i][j];
            record.mutual_farad[i][j] = value;
            record.mutual_bar_farad[i][j] = bar;
            record.capacitance_farad[i][j] = -value;
            record.capacitance_farad[i][i] += value - old;
        }
    };
    set(0, 1, 1e-16, 2e-15);
    set(0, 2, -1e-16, 2e-15);
    set(1, 2, -5e-15, 2e-15);
    record
}

#[test]
fn the_netlist_reassembles_to_the_matrix() {
    let options = netlist::Options { name: "three ball".into(), bleeds: true };
    for record in [fixtures::record(), awkward()] {
        let text = text_of(|out| netlist::write(&record, &options, out));
        let kept = parse_netlist(&text, false);
        assert!(kept.capacitors.iter().all(|(_, _, value)| 0.0 < *value), "no negative element\n{text}");
        assert_eq!(kept.pins.last().unwrap(), "earth", "earth is the last pin");
        assert_eq!(kept.resistors, 1, "one bleed for the floating tap\n{text}");
        let c = reassemble(&parse_netlist(&text, true));
        for (i, (found, expected)) in c.iter().zip(&record.capacitance_farad).enumerate() {
            for (found, expected) in found.iter().zip(expected) {
                assert!((found - expected).abs() <= 1e-9 * c[i][i], "{found:e} for {expected:e}\n{text}");
            }
        }
    }
}

#[test]
fn the_netlist_reads_as_agreed() {
    let options = netlist::Options { name: "three ball".into(), bleeds: true };
    golden::check("netlist.cir", &text_of(|out| netlist::write(&awkward(), &options, out)), 1e-12);
}

#[test]
fn bleeds_are_optional() {
    let options = netlist::Options { name: "x".into(), bleeds: false };
    let text = text_of(|out| netlist::write(&fixtures::record(), &options, out));
    assert_eq!(parse_netlist(&text, false).resistors, 0, "{text}");
    assert!(text.contains("* tap floats and has no bleed resistor"), "{text}");
    let caution =
        "* tap in `100 kV peak applied`: floats at 31.160 ± 0.046 kV peak: treat as live until earthed.";
    assert!(text.contains(caution), "{text}");
}

#[test]
fn pins_are_plain_and_never_clash() {
    let names = ["Ball", "ball", "BALL", "ball_2", "ä b", "0", "gnd", "earth", "", "12", "_"];
    let pins = netlist::pins(&names.map(str::to_owned));
    let expected = ["ball", "ball_2", "ball_3", "ball_2_2", "__b", "n0", "gnd_2", "earth_2", "n", "n12", "_"];
    assert_eq!(pins, expected);
}

#[test]
fn a_wide_subcircuit_line_is_continued() {
    let mut record = fixtures::record();
    record.electrodes = (0..3).map(|n| format!("{}{n}", "long_name_of_an_electrode_".repeat(2))).collect();
    let text =
        text_of(|out| netlist::write(&record, &netlist::Options { name: "x".into(), bleeds: true }, out));
    let line = text.lines().find(|line| line.starts_with(".subckt")).unwrap();
    assert!(line.len() <= 80, "{line}");
    assert_eq!(parse_netlist(&text, false).pins.len(), 4, "{text}");
}

/// Arrays of a surface file, decoded from its text by nothing of ours.
fn decode_vtu(text: &str) -> BTreeMap<String, Vec<u8>> {
    let mut arrays = BTreeMap::new();
    for piece in text.split("<DataArray ").skip(1) {
        let (tag, rest) = piece.split_once('>').unwrap();
        let name = tag.split("Name=\"").nth(1).unwrap().split('"').next().unwrap();
        let coded = rest.split_once('<').unwrap().0;
        // The header is coded apart from the blocks: block count first.
        let count = u64::from_le_bytes(from_base64(&coded[..12])[..8].try_into().unwrap()) as usize;
        let header_len = (8 * (3 + count)).div_ceil(3) * 4;
        let header: Vec<usize> = from_base64(&coded[..header_len])
            .chunks_exact(8)
            .map(|b| u64::from_le_bytes(b.try_into().unwrap()) as usize)
            .collect();
        let packed = from_base64(&coded[header_len..]);
        let (mut bytes, mut at) = (Vec::new(), 0);
        for size in &header[3..] {
            flate2::read::ZlibDecoder::new(&packed[at..at + size]).read_to_end(&mut bytes).unwrap();
            at += size;
        }
        assert_eq!(bytes.len() % header[1], header[2], "{name}: size of the partial block");
        arrays.insert(name.to_owned(), bytes);
    }
    arrays
}

fn from_base64(text: &str) -> Vec<u8> {
    let letters = "ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz0123456789+/";
    let (mut bytes, mut bits, mut held) = (Vec::new(), 0u32, 0);
    for c in text.chars().filter(|c| *c != '=') {
        (bits, held) = ((bits << 6) | letters.find(c).unwrap() as u32, held + 6);
        if 8 <= held {
            held -= 8;
            bytes.push((bits >> held) as u8);
            bits &= (1 << held) - 1;
        }
    }
    bytes
}

fn floats(bytes: &[u8]) -> Vec<f64> {
    bytes.chunks_exact(8).map(|b| f64::from_le_bytes(b.try_into().unwrap())).collect()
}

#[test]
fn the_surface_file_holds_every_number_of_the_table() {
    let table = fixtures::surface();
    let arrays = decode_vtu(&text_of(|out| vtu::write(&table, out)));
    let of = |name: &str| floats(&arrays[name]);
    assert_eq!(of("points_m"), table.corners.as_flattened().as_flattened(), "corners");
    assert_eq!(of("unit_charge_ball_C_per_m2_per_V"), table.density[0], "densities");
    assert_eq!(of("residual_tap &amp; &lt;ring&gt;"), table.residual[1].as_flattened(), "residuals");
    assert_eq!(of("field_100 kV &quot;peak&quot; applied_V_per_m"), table.field[0].1, "fields");
    let whole = |name: &str| -> Vec<i32> {
        arrays[name].chunks_exact(4).map(|b| i32::from_le_bytes(b.try_into().unwrap())).collect()
    };
    assert_eq!(whole("row"), table.row, "rows");
    assert_eq!(whole("electrode_is_skirt"), [2], "the legend");
    assert_eq!(arrays["types"], [5; 5], "triangles");
}

#[test]
fn a_surface_of_many_blocks_decodes() {
    let mut table = fixtures::surface();
    let n = 3000;
    table.corners = (0..n).map(|p| [[p as f64; 3]; 3]).collect();
    (table.electrode, table.row) = (vec![0; n], vec![0; n]);
    table.density = vec![(0..n).map(|p| (p as f64).sin()).collect(); 2];
    table.residual = vec![vec![[0.5; 6]; n]; 2];
    table.field.clear();
    assert_eq!(vtu::check(&table), Ok(()));
    let arrays = decode_vtu(&text_of(|out| vtu::write(&table, out)));
    assert_eq!(floats(&arrays["unit_charge_ball_C_per_m2_per_V"]), table.density[0], "densities");
    assert_eq!(floats(&arrays["points_m"]).len(), 9 * n, "corners");
}

#[test]
fn repaired_bodies_are_written_as_stl() {
    let folder = fixtures::folder();
    let path = folder.path().join("new/body.stl");
    let facet = [Vec3::zeros(), Vec3::new(2.0, 0.0, 0.0), Vec3::new(0.0, 3.0, 0.0)];
    stl::write(&path, &[facet]).unwrap();
    let mesh = stl_io::read_stl(&mut fs::File::open(&path).unwrap()).unwrap();
    assert_eq!(mesh.faces.len(), 1, "one facet");
    assert_eq!(mesh.faces[0].normal, stl_io::Normal::new([0.0, 0.0, 1.0]), "right-handed");
    assert_eq!(fs::metadata(&path).unwrap().len(), 84 + 50, "the size law of binary files");
    assert!(stl::write(&path, &[[Vec3::new(1e39, 0.0, 0.0); 3]]).is_err(), "beyond single precision");
}

#[test]
fn a_case_somebody_filled_in_is_not_overwritten() {
    let folder = fixtures::folder();
    let path = folder.path().join("new.toml");
    case_file::write(&path, "[units]\n").unwrap();
    assert!(matches!(case_file::write(&path, ""), Err(ReportError::Write { .. })), "it stands there");
    assert_eq!(fs::read_to_string(&path).unwrap(), "[units]\n");
}

#[test]
fn a_record_without_voltage_cases_or_looks_prints() {
    let mut record = fixtures::record();
    record.voltage_cases.clear();
    record.looks.clear();
    record.edges.clear();
    record.findings.clear();
    record.budget.entries.clear();
    assert!(answers::sheet(&record, &Printing::default()).contains("Findings\n  none"));
    assert!(tables::stress_text(&record, &Printing::default()).contains("No voltage case"));
}
