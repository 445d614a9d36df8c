//! Texts of `--help` and of `key`.

/// Below the verbs, for `-h`.
pub(super) const SHORT: &str = "\
Start:  amberskin inspect part1.stl part2.stl --write-case my.toml
Then fill in units, sizes and voltages in my.toml, and:  amberskin solve my.toml

`amberskin --help` shows a whole case file, the rule for units and the exit codes.";

/// Below the verbs, for `--help`.
pub(super) const LONG: &str = "\
A CASE FILE, whole (TOML; paths are relative to the file; dimensions invented):

    [units]
    length = \"mm\"                      # of the STL files and of bare numbers; no default

    [[earth_plane]]                    # optional: infinite plane at 0 V, one at most
    name = \"floor\"
    through = [0, 0, 0]
    facing = [0, 0, 1]                 # to the side on which the electrodes stand

    [[electrode]]
    name = \"ball\"
    shape = \"ball.stl\"                 # or a list of files; shell = 0 picks a shell of one
    role = \"live\"                      # live, earthed, floating, guard (with follows = \"name\")
    size_check = [100, 100, 100]       # overall size on the drawing; over 2 % off stops the run
    field_limit = \"2.6 kV/mm peak\"     # peak, rms or dc: the word is compulsory

    [[electrode]]
    name = \"tap\"
    shape = \"tap.stl\"
    role = \"floating\"                  # potential is found; net charge zero unless given

    [[voltage_case]]                   # none at all: matrices only
    name = \"test voltage\"
    value_is = \"peak\"                  # peak, rms or dc
    potentials = { ball = \"100 kV\" }   # charges = { tap = \"1 nC\" }

    [[look]]                           # optional: potential and field at places
    name = \"gap\"
    line = { from = [0, 0, 300], to = [0, 0, 350], points = 51 }

    [accuracy]                         # default: capacitance = \"0.5 %\"
    capacitance = \"0.5 %\"
    time_limit = \"10 min\"              # also max_panels, memory_limit, threads

    [deliver]                          # record and surface file are always written
    folder = \"out/my\"                  # default: out/ and the name of the case file
    answers = \"answers.txt\"
    matrix = \"matrix.csv\"
    netlist = \"netlist.cir\"

Further words: [study] number, issue, title, question, prepared, checked, approved, organisation,
left_out; [units] capacitance, field (for printing); [surroundings] relative_permittivity;
[[electrode]] sheet = true (open or thin-walled), surface = \"rebuilt\" or \"as_drawn\",
crease_angle = \"30 deg\", shell = 0 or a point it holds, drawing,
place = { shift = [x, y, z], rotate = { axis = [0, 0, 1], angle = \"30 deg\" }, scale = 1 };
[[bond]] members = [\"a\", \"b\"], one of which may be \"earth\";
[[look]] point = [x, y, z], or sheet = { corner = [x, y, z], along = [x, y, z],
across = [x, y, z], points = [m, n] } with the two sides as vectors.

UNITS: a quantity is a text with a number and a unit: \"100 kV\", \"0.5 %\", \"10 min\", \"4 GB\",
\"1 nC\", \"30 deg\", \"2.6 kV/mm peak\". Bare numbers stand only for coordinates and sizes in the
declared length unit, for counts and for factors. Upper and lower case differ; micro is \u{b5} or u.
rms values are stored and printed as crests, that is times 1.414.

STREAMS: results go to standard output, progress and remarks to standard error.

EXIT CODES
    0  done and every demand met          1  bad request (arguments or case file)
    2  geometry refused                   3  accuracy not reached; outputs are written
    4  a field limit exceeded, or not decided; outputs are written
    5  an internal check failed beyond its bar      6  a file could not be read or written
  130  interrupted
If several hold: 5, then 4, then 3; the record lists all.

CAUTION: estimate for comparing designs; not a rating, certificate or proof of compliance; local
codes and licensed practice decide.";

/// Exit codes, short.
pub(super) const CODES: &str = "\
Exit codes: 0 done and every demand met, 1 bad request, 2 geometry refused, 3 accuracy not reached,
4 a field limit exceeded or not decided, 5 an internal check failed, 6 a file could not be read or
written, 130 interrupted. `amberskin --help` shows a case file.";

/// Below `solve --help`.
pub(super) const SOLVE: &str = "\
Prints the answer sheet (with --json the record) and writes record.json, the surface file for a
field viewer, and what [deliver] names. Refines until the bar asked for is reached, or until
max_panels, time_limit or memory_limit ends the run: then the exit code is 3 and the bar reached is
printed. A record of the same case and shapes is replaced, one of another case or of other shapes
only with --overwrite.

Exit codes: 0 done and every demand met, 1 bad request, 2 geometry refused, 3 accuracy not reached,
4 a field limit exceeded or not decided (the limit lies inside the bar, or the field is unbounded at
a sharp edge), 5 an internal check failed beyond its bar, 6 a file could not be read or written,
130 interrupted. If several hold: 5, then 4, then 3. `amberskin --help` shows a whole case file.";

/// Below `inspect --help`.
pub(super) const INSPECT: &str = "\
Each finding is a note, a warning or a refusal, with its place in the length unit of the case, or in
the unit of the drawing for bare STL files. Exit code 2 if there is a refusal.

    amberskin inspect ball.stl tap.stl
    amberskin inspect ball.stl --repair repaired
    amberskin inspect *.stl --write-case my.toml     then fill in the blanks and solve
    amberskin inspect my.toml                        contacts, gaps, effort of the whole assembly";

/// Below `matrix --help`.
pub(super) const MATRIX: &str = "\
charge-per-volt: row i is the charge on electrode i for 1 V on each electrode in turn, the others at
0 V. mutual: the capacitor one would draw between two electrodes, and each one's to earth; what a
two-terminal circuit needs. potential-coefficients: the inverse. `amberskin key` explains the signs.

    amberskin matrix out/my/record.json
    amberskin matrix out/my/record.json --form mutual --csv > mutual.csv";

/// Below `stress --help`.
pub(super) const STRESS: &str = "\
Fields are crest (or steady) values. Where a limit is given: margin = limit / field - 1.
Exit code as for solve, of limits and checks: 0, 4 or 5.
CAUTION: estimate for comparing designs; not a rating, certificate or proof of compliance; local
codes and licensed practice decide.";

/// Below `netlist --help`.
pub(super) const NETLIST: &str = "\
One subcircuit with the electrodes as pins in the order of the record and `earth` last. Entries
below their bar are left out and listed in a comment; no element is negative.

    amberskin netlist out/my/record.json -o divider.cir";

/// Below `prove --help`.
pub(super) const PROVE: &str = "\
Sphere, two spheres, sphere over a plane, cube and disc are solved and held against their exact
values. Exit code 5 if a value lies outside its bar.";

/// What `key` prints.
pub(super) const KEY: &[(&str, &str)] = &[
    (
        "Maxwell capacitance matrix (charge per volt)",
        "Q_i = sum over j of C_ij V_j. Row i carries the charge Q_i; column j is the electrode at V_j. \
         C_ii > 0: all the charge that 1 V on electrode i alone draws onto it. C_ij <= 0 for i not j: \
         the charge it draws onto the others, which are at 0 V, has the other sign. The matrix is symmetric.",
    ),
    (
        "Mutual (two-terminal) capacitances",
        "c_ij = -C_ij >= 0: the capacitor one would draw between electrodes i and j. The diagonal is 0. \
         A bridge with a guard terminal reads this one.",
    ),
    (
        "Capacitance to earth and surroundings",
        "c_i0 = sum over j of C_ij >= 0: the row sum. C_ii is c_i0 plus all c_ij of its row. The earth \
         share is c_i0 / C_ii.",
    ),
    (
        "Potential coefficients",
        "V_i = sum over j of p_ij Q_j: the inverse of the Maxwell capacitance matrix. p_ij >= 0.",
    ),
    ("Reference", "Earth planes and infinity are one node at 0 V, named `earth`."),
    (
        "Rows",
        "Rows and columns stand in the order of the case file. Bonded electrodes that touch are one row, \
         named by its members joined with +; bonded ones apart keep their rows. An electrode bonded with \
         `earth` that meets the earth plane has no row.",
    ),
    (
        "Bars",
        "value ± bar: the value is expected within the bar. It holds the errors of panels, of solving and \
         a share of the facets' deviation from the shape meant; not what the case leaves out or draws \
         wrongly. Digits are cut to the bar. A value smaller than its bar is printed as `< bar`.",
    ),
    (
        "Roles",
        "live: needs a potential or charge in every voltage case. earthed: 0 V. floating: net charge 0 \
         unless given, its potential is found. guard: driven to the potential of another electrode, or 0 V. \
         A voltage case may give any electrode a potential or a charge instead. Roles never change the matrix.",
    ),
    (
        "Maximum and peak",
        "Maximum: the highest place on a surface. Peak or crest: the highest value in time. Potentials, \
         charges and fields are crest values, for dc steady ones; an rms value of the case file is \
         multiplied by the square root of 2.",
    ),
    (
        "Field units",
        "1 kV/mm = 10 kV/cm = 1 MV/m. Field on metal points along the normal, outward \
         where the charge is positive. Maxima and limits are magnitudes, printed without a sign; the surface \
         file holds the field along the outward normal with its sign.",
    ),
    (
        "Unbounded at edge",
        "At a sharp edge the ideal field has no maximum: E = K s^exponent with s the distance from the edge \
         on the face. Such a place is reported with K and the field at stated distances, never as a number \
         of one mesh. A limit on such an electrode is not decided.",
    ),
    (
        "Judgement",
        "met: field plus bar below the limit. not_met: field minus bar above it. not_decided: the limit lies \
         inside the bar, or the field is unbounded. margin = limit / field - 1.",
    ),
];

#[cfg(test)]
mod tests {
    use super::*;
    use crate::case;
    use std::path::Path;

    #[test]
    fn the_case_in_the_help_is_a_case() {
        let start = LONG.find("    [units]").unwrap();
        let end = LONG.find("Further words").unwrap();
        let case =
            case::parse(&LONG[start..end], Path::new("my.toml")).unwrap_or_else(|error| panic!("{error}"));
        assert_eq!(case.electrodes.len(), 2);
        assert_eq!(case.looks[0].points.len(), 51);
    }

    #[test]
    fn every_help_line_fits_a_terminal() {
        for text in [SHORT, LONG, CODES, SOLVE, INSPECT, MATRIX, STRESS, NETLIST, PROVE] {
            let longest = text.lines().map(|line| line.chars().count()).max();
            assert!(longest <= Some(100), "{longest:?}: {text}");
        }
    }
}
