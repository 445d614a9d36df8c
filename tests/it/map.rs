//! The map of the crate, held against its source.
use std::{
    fs,
    path::{Path, PathBuf},
};

/// Every room, lowest first, with the rooms it may import.
const MAP: &[(&str, &[&str])] = &[
    ("base", &[]),
    ("geom", &["base"]),
    ("kernel", &["base", "geom"]),
    ("mesh", &["base", "geom"]),
    ("panel", &["base", "geom", "kernel", "mesh"]),
    ("operator", &["base", "geom", "kernel", "panel"]),
    ("solve", &["base", "operator"]),
    ("physics", &["base", "geom", "kernel", "mesh", "panel", "operator", "solve"]),
    ("adapt", &["base", "geom", "mesh", "panel", "operator", "solve", "physics"]),
    ("circuit", &["base", "physics"]),
    ("case", &["base", "mesh", "operator", "solve", "physics", "adapt", "circuit"]),
    ("record", &["base", "mesh", "panel", "physics", "circuit"]),
    (
        "study",
        &[
            "base", "geom", "kernel", "mesh", "panel", "operator", "solve", "physics", "adapt", "circuit",
            "case", "record",
        ],
    ),
    ("report", &["base", "mesh", "panel", "physics", "circuit", "record"]),
    ("cli", &["base", "case", "record", "study", "report"]),
];

/// Words that may stand only in the places named.
const ONLY_IN: &[(&str, &[&str])] = &[
    ("EPS0", &["base/si.rs", "physics/"]),
    ("std::fs", &["case/", "record/", "report/"]),
    ("serde::", &["case/wire.rs", "record/", "report/"]),
    ("faer::", &["operator/", "solve/"]),
    ("clap::", &["cli/"]),
    ("println!", &["cli/"]),
];

/// Longest file; files of tables are named in `TABLES`.
const MAX_LINES: usize = 800;
const TABLES: &[&str] = &["kernel/rules.rs"];

#[test]
fn the_map_runs_one_way() {
    for (rank, (room, imports)) in MAP.iter().enumerate() {
        for import in *imports {
            assert!(
                MAP[..rank].iter().any(|(lower, _)| lower == import),
                "{room} imports {import} from above"
            );
        }
    }
}

#[test]
fn rooms_import_by_the_map() {
    let mut bad = Vec::new();
    for (file, text) in sources() {
        let Some((room, imports)) = MAP.iter().find(|(room, _)| file.starts_with(&format!("{room}/"))) else {
            continue;
        };
        for (n, line) in text.lines().enumerate() {
            let hidden = line.contains("crate::{") || line.contains("super::super");
            let foreign = line
                .split("crate::")
                .skip(1)
                .map(first_word)
                .any(|to| to != *room && MAP.iter().any(|(r, _)| *r == to) && !imports.contains(&to));
            if hidden || foreign {
                bad.push(format!("src/{file}:{}: {}", n + 1, line.trim()));
            }
        }
    }
    assert!(bad.is_empty(), "imports against the map:\n{}", bad.join("\n"));
}

#[test]
fn the_map_is_whole_and_described() {
    let developers = fs::read_to_string(root().join("DEVELOPERS.md")).unwrap();
    for entry in fs::read_dir(root().join("src")).unwrap() {
        let name = entry.unwrap().file_name().into_string().unwrap();
        let known = ["lib.rs", "main.rs"].contains(&&*name) || MAP.iter().any(|(room, _)| *room == name);
        assert!(known, "src/{name} is not on the map");
    }
    for (room, _) in MAP {
        assert!(developers.contains(&format!("`{room}`")), "DEVELOPERS.md does not describe `{room}`");
    }
}

#[test]
fn words_and_lengths_stay_in_bounds() {
    let mut bad = Vec::new();
    for (file, text) in sources() {
        for (word, places) in ONLY_IN {
            if text.contains(word) && !places.iter().any(|place| file.starts_with(place)) {
                bad.push(format!("src/{file}: `{word}` belongs in {places:?}"));
            }
        }
        if text.lines().count() > MAX_LINES && !TABLES.contains(&&*file) {
            bad.push(format!("src/{file}: over {MAX_LINES} lines"));
        }
    }
    assert!(bad.is_empty(), "{}", bad.join("\n"));
}

#[test]
fn public_numbers_name_their_unit() {
    let mut bad = Vec::new();
    for (file, text) in sources().into_iter().filter(|(file, _)| !file.starts_with("base/")) {
        let lines: Vec<&str> = text.lines().map(str::trim).collect();
        for n in 1..lines.len() {
            let is_number = lines[n].starts_with("pub ")
                && (lines[n].contains(": f64") || lines[n].contains("<f64>"))
                && !lines[n].contains("fn ")
                && !lines[n].contains("const ");
            let doc: String = lines[..n]
                .iter()
                .rev()
                .take_while(|l| l.starts_with("//") || l.starts_with("#["))
                .copied()
                .collect();
            if is_number && !doc.contains(" [") {
                bad.push(format!("src/{file}:{}: {}", n + 1, lines[n]));
            }
        }
    }
    assert!(bad.is_empty(), "no `[unit]` in the doc of:\n{}", bad.join("\n"));
}

fn first_word(rest: &str) -> &str {
    rest.split(|c: char| !c.is_alphanumeric() && c != '_').next().unwrap()
}

fn root() -> &'static Path {
    Path::new(env!("CARGO_MANIFEST_DIR"))
}

/// Every source file as (path below src, text above its unit tests).
fn sources() -> Vec<(String, String)> {
    let src = root().join("src");
    let (mut todo, mut found) = (vec![src.clone()], Vec::new());
    while let Some(dir) = todo.pop() {
        for entry in fs::read_dir(dir).unwrap() {
            let path: PathBuf = entry.unwrap().path();
            if path.is_dir() {
                todo.push(path);
            } else if path.extension().is_some_and(|x| x == "rs") {
                let text = fs::read_to_string(&path).unwrap();
                let text = text.split("#[cfg(test)]").next().unwrap().to_owned();
                found.push((path.strip_prefix(&src).unwrap().to_str().unwrap().to_owned(), text));
            }
        }
    }
    found.sort();
    found
}
