//! The stored result: schema, write, read back.
//!
//! In: numbers of a finished study, SI.  Out: `record.json`, schema 1.
//! Not here: any computation; the surface file (`report`).
//! Symbols: as in the crate's table; matrices are nested row by row in the order of `electrodes`.

mod agree;
pub mod cautions;
mod hash;
pub mod store;

pub use cautions::CAUTIONS;
pub use hash::sha256;
pub use store::RecordError;

use serde::Deserialize;
use serde::Serialize;
use std::collections::BTreeMap;

/// Version of the layout of `record.json`; keys are only added within a number.
pub const SCHEMA: u32 = 1;

/// A matrix, nested row by row [unit in the name of the key].
pub type Matrix = Vec<Vec<f64>>;

/// All that a study found.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct Record {
    /// [`SCHEMA`].
    pub schema: u32,
    /// What wrote it.
    pub program: Program,
    /// Cautions that go with every number.
    pub cautions: Vec<String>,
    /// Whether every demand was met.
    pub verdict: Verdict,
    /// What was asked.
    pub case: CaseText,
    /// The shape files.
    pub shapes: Vec<FileHash>,
    /// The surface file beside the record.
    pub surface_file: FileHash,
    /// Names of the rows.
    pub electrodes: Vec<String>,
    /// What each row is made of and its state.
    pub rows: Vec<RowInfo>,
    /// Relative bar asked and reached [1].
    pub accuracy: Accuracy,
    /// `c[i][j]`: charge of row i per volt on row j, the rest at 0 V [F].
    pub capacitance_farad: Matrix,
    /// Its bars [F].
    pub capacitance_bar_farad: Matrix,
    /// Two-terminal capacitances, diagonal 0 [F].
    pub mutual_farad: Matrix,
    /// Their bars [F].
    pub mutual_bar_farad: Matrix,
    /// To earth and surroundings: row sums [F].
    pub earth_farad: Vec<f64>,
    /// Their bars [F].
    pub earth_bar_farad: Vec<f64>,
    /// Earth capacitance over the diagonal entry [1].
    pub earth_share: Vec<f64>,
    /// Inverse of the matrix [1/F].
    pub potential_coefficients_per_farad: Matrix,
    /// Its bars [1/F].
    pub potential_coefficients_bar_per_farad: Matrix,
    /// What was checked at run time.
    pub checks: Vec<Check>,
    /// What was noticed.
    pub findings: Vec<FindingRecord>,
    /// Sizes of the parts.
    pub parts: Vec<Part>,
    /// Creases and rims, those with an unbounded field.
    pub edges: Vec<Edge>,
    /// Potential and field at the places asked for.
    pub looks: Vec<Look>,
    /// Results for each set of applied potentials.
    pub voltage_cases: Vec<VoltageCase>,
    /// Where the bar comes from.
    pub budget: Budget,
    /// What it took.
    pub effort: Effort,
}

/// Name and version of the program.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct Program {
    /// `amberskin`.
    pub name: String,
    /// Version of the package.
    pub version: String,
}

/// The verdict over all demands.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct Verdict {
    /// `met`, `not_met` or `not_decided`.
    pub word: String,
    /// All exit codes that hold, most severe first (5, 4, 3); empty if met.
    pub codes: Vec<i32>,
    /// A sentence for each.
    pub reasons: Vec<String>,
}

/// The case as given and as understood.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct CaseText {
    /// Text of the case file.
    pub text: String,
    /// SHA-256 of it, hexadecimal.
    pub sha256: String,
    /// Every word with its value, defaults filled in, as text.
    pub resolved: BTreeMap<String, String>,
}

/// A file and its SHA-256.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct FileHash {
    /// Path as written in the case; for the surface file, its name beside the record.
    pub path: String,
    /// Hexadecimal.
    pub sha256: String,
}

/// A row of the matrices.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct RowInfo {
    /// Electrodes that make it up.
    pub members: Vec<String>,
    /// `live`, `earthed`, `floating` or `guard`.
    pub role: String,
}

/// Accuracy asked and reached.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct Accuracy {
    /// Relative bar asked [1].
    pub asked: f64,
    /// Largest relative bar of the entries under the demand [1].
    pub reached: f64,
}

/// One run-time check.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct Check {
    /// What.
    pub name: String,
    /// Measured [unit stated in the name].
    pub value: f64,
    /// Allowed [unit stated in the name].
    pub limit: f64,
    /// Whether it holds.
    pub pass: bool,
}

/// A finding.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct FindingRecord {
    /// `note`, `warning` or `refusal`.
    pub severity: String,
    /// Short stable name.
    pub code: String,
    /// The sentence.
    pub text: String,
    /// Place [m].
    pub where_metre: Option<[f64; 3]>,
}

/// A part.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct Part {
    /// Electrode name.
    pub name: String,
    /// `electrode`.
    pub kind: String,
    /// `rebuilt` or `as_drawn`.
    pub surface: String,
    /// Facets read.
    pub facets: usize,
    /// Panels at the end.
    pub panels: usize,
    /// Exposed area [m²].
    pub area_m2: f64,
    /// Overall size [m].
    pub size_metre: [f64; 3],
}

/// A run of crease or rim along which the field is unbounded.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct Edge {
    /// Electrode name.
    pub part: String,
    /// Angle through the metal [degrees].
    pub angle_deg: f64,
    /// Exponent of distance in the field law, π/(2π−w) − 1 [1].
    pub exponent: f64,
    /// Voltage case.
    pub case: String,
    /// K of E = K·s^exponent where it is highest along the edge [V·m^(−1−exponent)].
    pub strength: f64,
    /// One end [m].
    pub from_metre: [f64; 3],
    /// Other end [m].
    pub to_metre: [f64; 3],
    /// The field law at stated distances.
    pub field_at: Vec<FieldAt>,
}

/// Field at a distance from an edge.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct FieldAt {
    /// Distance on the face from the edge [m].
    pub distance_metre: f64,
    /// Field there [V/m].
    pub field_v_per_m: f64,
}

/// Potential and field along a look.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct Look {
    /// Name.
    pub name: String,
    /// Points [m].
    pub points_metre: Vec<[f64; 3]>,
    /// `surroundings`, the name of the electrode that holds the point, or `behind earth`.
    pub medium: Vec<String>,
    /// By voltage case: potential at each point [V].
    pub potential_volt: BTreeMap<String, Vec<f64>>,
    /// By voltage case: field at each point [V/m].
    pub field_v_per_m: BTreeMap<String, Vec<[f64; 3]>>,
}

/// Results of one voltage case; crest (or steady) values.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct VoltageCase {
    /// Name.
    pub name: String,
    /// `peak`, `rms` or `dc`: what was typed.
    pub value_is: String,
    /// By row [V].
    pub potentials_volt: BTreeMap<String, f64>,
    /// Bars; 0 where the potential is given [V].
    pub potentials_bar_volt: BTreeMap<String, f64>,
    /// Rows that float in this case.
    pub floating: Vec<String>,
    /// By row [C].
    pub charges_coulomb: BTreeMap<String, f64>,
    /// Bars; 0 where the charge is given [C].
    pub charges_bar_coulomb: BTreeMap<String, f64>,
    /// Field energy [J].
    pub energy_joule: f64,
    /// Its bar [J].
    pub energy_bar_joule: f64,
    /// The highest surface field of each electrode.
    pub maxima: Vec<Maximum>,
    /// Forces; empty until they are computed.
    pub forces: Vec<Force>,
}

/// The highest field on one electrode.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct Maximum {
    /// Electrode name.
    pub electrode: String,
    /// `smooth`, `edge`, `corner`, `seam` or `wire`.
    pub kind: String,
    /// Highest field; none where it is unbounded at an edge [V/m].
    pub field_v_per_m: Option<f64>,
    /// Its bar [V/m].
    pub bar_v_per_m: Option<f64>,
    /// Highest panel value [V/m].
    pub raw_v_per_m: f64,
    /// Highest fitted field away from unbounded edges [V/m].
    pub smooth_v_per_m: Option<f64>,
    /// Place [m].
    pub at_metre: [f64; 3],
    /// Principal curvatures there [1/m].
    pub curvature_per_metre: Option<[f64; 2]>,
    /// Limit, as a crest (or steady) value [V/m].
    pub limit_v_per_m: Option<f64>,
    /// `peak`, `rms` or `dc`: how the limit was given.
    pub limit_is: Option<String>,
    /// Limit over field, minus 1 [1].
    pub margin: Option<f64>,
    /// `met`, `not_met`, `not_decided` or `no_limit`.
    pub judged: String,
}

/// Force on an electrode.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct Force {
    /// Electrode name.
    pub electrode: String,
    /// Force [N].
    pub newton: [f64; 3],
    /// Its bar [N].
    pub bar_newton: [f64; 3],
    /// Point of the torque [m].
    pub about_metre: [f64; 3],
    /// Torque [N·m].
    pub torque_newton_metre: [f64; 3],
}

/// Where the bar of each headline entry comes from, relative to the entry.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct Budget {
    /// One line for each diagonal entry and each mutual and earth entry under the relative demand.
    pub entries: Vec<BudgetLine>,
}

/// One headline entry.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct BudgetLine {
    /// `C a a`, `c a b`, `c a earth`.
    pub entry: String,
    /// Bar of the flat panels' solution [1].
    pub discretisation: f64,
    /// First-order share of the facets, signed: rebuilt minus flat [1].
    pub faceting: f64,
    /// Part of the bar that faceting gives [1].
    pub faceting_bar: f64,
    /// Rounding and solver [1].
    pub solver: f64,
}

/// What the run took.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct Effort {
    /// Panels of the last round.
    pub panels: usize,
    /// Unknowns of the last round.
    pub unknowns: usize,
    /// Rounds.
    pub rounds: usize,
    /// `dense`.
    pub method: String,
    /// Seconds by phase [s].
    pub seconds: BTreeMap<String, f64>,
    /// Highest resident memory [B]; 0 where the system does not tell.
    pub peak_memory_bytes: u64,
    /// Threads used.
    pub threads: usize,
    /// Each round: panels and reached bar [1].
    pub history: Vec<(usize, f64)>,
}

/// The panels of the last round with all unit solutions: what the surface file holds.
#[derive(Clone, Debug, PartialEq)]
pub struct SurfaceTable {
    /// Electrode names; `electrode` indexes them.
    pub bodies: Vec<String>,
    /// Row names; `row` indexes them.
    pub rows: Vec<String>,
    /// Corners of each panel [m].
    pub corners: Vec<[[f64; 3]; 3]>,
    /// Index of the electrode of each panel.
    pub electrode: Vec<u32>,
    /// Row of each panel, −1 for the 0 V reference.
    pub row: Vec<i32>,
    /// `density[j][p]`: charge density of panel p at 1 V on row j, the rest at 0 V [C/(m²·V)].
    pub density: Vec<Vec<f64>>,
    /// `residual[j][p]`: unit potential minus computed potential at the six points of panel p [1].
    pub residual: Vec<Vec<[f64; 6]>>,
    /// By voltage case: name, and normal field of each panel, crest, outward positive [V/m].
    pub field: Vec<(String, Vec<f64>)>,
}
