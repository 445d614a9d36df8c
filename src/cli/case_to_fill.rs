//! A case to fill in, started from inspected STL files.

use crate::report::digits;
use crate::study::BodyLine;
use std::collections::BTreeSet;
use std::path::Component;
use std::path::Path;
use std::path::PathBuf;

/// What stands between the file and the number of a shell in the name of a body.
const SHELL_MARK: &str = " shell ";

const HEAD: &str = r#"# A case to fill in: it is refused until the blanks are filled.
# `amberskin --help` explains every word.

[study]
title    = ""
question = ""
left_out = []                 # what is not modelled: supports, leads, …

[units]
length = ""                   # of the numbers inside the STL files and of bare numbers here: "mm", "m", "in", …

# [[earth_plane]]             # an infinite plane at 0 V, if there is one
# name    = "floor"
# through = [0, 0, 0]
# facing  = [0, 0, 1]         # to the side on which the electrodes stand
"#;

/// Beside an open surface: whether a hole or a sheet was meant, only the user knows.
const OPEN: &str = "# sheet    = true             # the surface is open: close the hole, or uncomment if the metal is a thin sheet\n";

const TAIL: &str = r#"
# [[voltage_case]]            # one for each set of applied potentials; without any: matrices only
# name       = "test voltage"
# value_is   = "peak"         # peak, rms or dc
# potentials = { NAME = "100 kV" }

[accuracy]
capacitance = "0.5 %"
time_limit  = "10 min"

[deliver]
answers = "answers.txt"
matrix  = "matrix.csv"
netlist = "netlist.cir"
"#;

/// The text of a case at `path` with one electrode a body; units and sizes are left blank.
pub(super) fn text(bodies: &[BodyLine], path: &Path) -> String {
    let names: Vec<&str> = bodies.iter().map(|body| body.name.as_str()).collect();
    let mut text = HEAD.to_owned();
    for (body, name) in bodies.iter().zip(file_names(&names)) {
        let (file, shell) = split(&body.name);
        let [x, y, z] = body.size.map(|side| digits::significant(side, 5));
        let shape = quoted(&relative(Path::new(file), path).to_string_lossy());
        text.push_str(&format!("\n[[electrode]]\nname       = \"{name}\"\nshape      = {shape}\n"));
        if let Some(shell) = shell {
            text.push_str(&format!("shell      = {shell}\n"));
        }
        text.push_str(
            "role       = \"live\"           # live, earthed, floating, or guard with follows = \"NAME\"\n",
        );
        if !body.closed {
            text.push_str(OPEN);
        }
        text.push_str(&format!(
            "size_check = []               # overall size on the drawing; the file has {x} x {y} x {z} of its unit\n"
        ));
        text.push_str("# field_limit = \"2.6 kV/mm peak\"\n");
    }
    text + TAIL
}

/// The file and the shell that the name of a body tells.
fn split(name: &str) -> (&str, Option<usize>) {
    let parts = name.rsplit_once(SHELL_MARK);
    match parts.and_then(|(file, shell)| Some((file, shell.parse().ok()?))) {
        Some((file, shell)) => (file, Some(shell)),
        None => (name, None),
    }
}

/// Names for bodies, fit for electrodes and files: letters of the file's own name, each one different.
pub(super) fn file_names(bodies: &[&str]) -> Vec<String> {
    let mut taken: BTreeSet<String> = ["0", "gnd", "earth"].map(str::to_owned).into();
    let mut names = Vec::new();
    for body in bodies {
        let (file, shell) = split(body);
        let stem = Path::new(file).file_stem().unwrap_or_default().to_string_lossy();
        let letter = |c: char| if c.is_alphanumeric() || c == '-' { c } else { '_' };
        let mut plain: String = stem.chars().map(letter).collect();
        if let Some(shell) = shell {
            plain.push_str(&format!("_{shell}"));
        }
        if plain.is_empty() {
            plain.push_str("body");
        }
        let mut name = plain.clone();
        let mut count = 2;
        // Some file systems hold upper and lower case for the same.
        while !taken.insert(name.to_lowercase()) {
            name = format!("{plain}_{count}");
            count += 1;
        }
        names.push(name);
    }
    names
}

/// `file` as seen from the folder of `case`, both given as seen from the working folder.
fn relative(file: &Path, case: &Path) -> PathBuf {
    let folder = case.parent().unwrap_or(Path::new(""));
    if file.is_absolute() || folder.as_os_str().is_empty() {
        return file.to_owned();
    }
    let (Ok(from), Ok(to)) = (std::path::absolute(folder), std::path::absolute(file)) else {
        return file.to_owned();
    };
    let (from, to): (Vec<Component<'_>>, Vec<Component<'_>>) =
        (from.components().collect(), to.components().collect());
    // A path that climbs cannot be followed without the disk; the whole path says the same.
    if from.iter().chain(&to).any(|part| *part == Component::ParentDir) {
        return to.iter().collect();
    }
    let shared = from.iter().zip(&to).take_while(|(a, b)| a == b).count();
    let up = from[shared..].iter().map(|_| Component::ParentDir);
    up.chain(to[shared..].iter().copied()).collect()
}

/// `text` as a TOML string.
fn quoted(text: &str) -> String {
    if !text.contains('\'') && !text.chars().any(char::is_control) {
        return format!("'{text}'");
    }
    let escaped: String = text
        .chars()
        .map(|c| match c {
            '"' | '\\' => format!("\\{c}"),
            c if c.is_control() => format!("\\u{:04x}", c as u32),
            c => c.to_string(),
        })
        .collect();
    format!("\"{escaped}\"")
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::case;

    fn body(name: &str, closed: bool) -> BodyLine {
        BodyLine { name: name.to_owned(), facets: 12, closed, size: [1.0; 3], area: 6.0, volume: 1.0 }
    }

    #[test]
    fn a_started_case_is_refused_until_it_is_filled_in() {
        let bodies =
            [body("m/a b.stl shell 0", true), body("m/a b.stl shell 1", true), body("o'x\\y.stl", false)];
        let blank = text(&bodies, Path::new("c.toml"));
        let message = case::parse(&blank, Path::new("c.toml")).unwrap_err().to_string();
        assert!(message.contains("4 problems") && message.contains("size_check"), "{message}");
        let filled = blank
            .replace("length = \"\"", "length = \"mm\"")
            .replace("size_check = []", "size_check = [1, 1, 1]");
        let case = case::parse(&filled, Path::new("c.toml")).unwrap_or_else(|error| panic!("{error}"));
        let names: Vec<&str> = case.electrodes.iter().map(|e| e.name.as_str()).collect();
        assert_eq!(names, ["a_b_0", "a_b_1", "o_x_y"]);
        assert_eq!(case.shape_paths, ["m/a b.stl", "o'x\\y.stl"]);
        assert_eq!(case.electrodes[1].shell, Some(case::Shell::Index(1)));
        assert!(case.electrodes.iter().all(|electrode| !electrode.sheet), "a hole is not made a sheet");
        let sheet = filled.replace("# sheet ", "sheet ");
        assert_eq!(sheet.matches("sheet    = true").count(), 1, "only the open surface is asked about");
        let case = case::parse(&sheet, Path::new("c.toml")).unwrap_or_else(|error| panic!("{error}"));
        assert!(case.electrodes[2].sheet, "uncommented, it is a sheet");
    }

    #[test]
    fn shapes_are_named_as_seen_from_the_case() {
        let seen = |file: &str, case: &str| relative(Path::new(file), Path::new(case));
        assert_eq!(seen("m/a.stl", "new.toml"), Path::new("m/a.stl"));
        assert_eq!(seen("m/a.stl", "demo/new.toml"), Path::new("../m/a.stl"));
        assert_eq!(seen("demo/a.stl", "demo/new.toml"), Path::new("a.stl"));
        assert_eq!(seen("/x/a.stl", "demo/new.toml"), Path::new("/x/a.stl"));
    }

    #[test]
    fn names_are_different_and_none_is_reserved() {
        assert_eq!(file_names(&["x/earth.stl", "A.stl", "a.stl", ".stl"]), ["earth_2", "A", "a_2", "_stl"]);
    }
}
