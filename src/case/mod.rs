//! The case file: TOML wire types, names and units resolved to SI; reads case and shape files.
//!
//! In: a path.  Out: `Case` in SI, names checked, and the bytes of the shapes.
//! Not here: any computation, any STL parsing (`mesh`), any output (`report`).
//! Symbols: as in the crate's table.

mod fault;
mod listing;

mod load;
pub mod machine;
mod resolve;
mod resolve_electrode;
mod resolve_value;
mod resolve_voltage;
mod wire;
mod words;

pub use fault::CaseError;
pub use fault::Fault;
pub use fault::Problem;
pub use fault::UnreadShape;
pub use listing::resolved;
pub use load::load;
pub use load::parse;
pub use load::read_shapes;

use crate::base::Plane;
use crate::base::Vec3;
use std::path::PathBuf;

/// A case file with every name and unit resolved; SI.
#[derive(Clone, Debug, PartialEq)]
pub struct Case {
    /// Path of the case file as given.
    pub path: PathBuf,
    /// Its text.
    pub text: String,
    /// The paper trail.
    pub study: Study,
    /// Metres per unit of length of the shapes and bare coordinates [m].
    pub length_unit: f64,
    /// Name of that unit.
    pub length_name: String,
    /// Units for printing.
    pub printing: Printing,
    /// Relative permittivity of the surroundings [1].
    pub relative_permittivity: f64,
    /// The earth plane.
    pub earth_plane: Option<EarthPlane>,
    /// Electrodes in file order.
    pub electrodes: Vec<Electrode>,
    /// Bonds: names of electrodes, possibly with `earth`.
    pub bonds: Vec<Vec<String>>,
    /// Voltage cases in file order.
    pub voltage_cases: Vec<VoltageCase>,
    /// Places at which potential and field are wanted.
    pub looks: Vec<Look>,
    /// What is good enough.
    pub accuracy: Accuracy,
    /// What to write.
    pub deliver: Deliver,
    /// Paths of the shape files as written, each once, in order of first mention.
    pub shape_paths: Vec<String>,
    /// Each default that was used, as `key = value` for printing.
    pub defaults: Vec<String>,
}

/// `[study]`: the paper trail.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Study {
    /// Each given field as (word, text), in the order of DESIGN's table.
    pub fields: Vec<(String, String)>,
    /// What was not modelled.
    pub left_out: Vec<String>,
}

/// Units of printed numbers.
#[derive(Clone, Debug, PartialEq)]
pub struct Printing {
    /// Name of the capacitance unit.
    pub capacitance_name: String,
    /// Farads per unit [F].
    pub capacitance: f64,
    /// Name of the field unit.
    pub field_name: String,
    /// Volts per metre per unit [V/m].
    pub field: f64,
}

/// `[[earth_plane]]`.
#[derive(Clone, Debug, PartialEq)]
pub struct EarthPlane {
    /// Name.
    pub name: String,
    /// The plane [m].
    pub plane: Plane,
}

/// State of an electrode in a voltage case unless the case says otherwise.
#[derive(Clone, Debug, PartialEq)]
pub enum Role {
    /// Needs a potential (or charge) in every voltage case.
    Live,
    /// At 0 V.
    Earthed,
    /// Net charge zero unless a charge is given.
    Floating,
    /// At the potential of another electrode, or at 0 V.
    Guard {
        /// Name of the electrode followed, or `earth`.
        follows: String,
    },
}

/// Which facets of its files an electrode consists of.
#[derive(Clone, Debug, PartialEq)]
pub enum Shell {
    /// The n-th shell of the file, counted from 0 in file order.
    Index(usize),
    /// The innermost shell that holds the point [m].
    Holding(Vec3),
}

/// How a shape is moved into place: scaled, then rotated, then shifted.
#[derive(Clone, Debug, PartialEq)]
pub struct Place {
    /// Factor [1].
    pub scale: f64,
    /// Turns in order: axis (unit) and angle [rad], about the origin.
    pub rotate: Vec<(Vec3, f64)>,
    /// Shift [m].
    pub shift: Vec3,
}

/// How the facets are understood.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum SurfaceKind {
    /// Stands for the smooth shape behind the facets.
    Rebuilt,
    /// The facets are the shape.
    AsDrawn,
}

/// Meaning of a voltage or field value in time.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum ValueIs {
    /// Crest value.
    Peak,
    /// Root mean square of a sine; crest is √2 times it.
    Rms,
    /// Steady.
    Dc,
}

/// `[[electrode]]`.
#[derive(Clone, Debug, PartialEq)]
pub struct Electrode {
    /// Name.
    pub name: String,
    /// Shape files: indices into [`Shapes::files`].
    pub files: Vec<usize>,
    /// Which shell of the file, if not all.
    pub shell: Option<Shell>,
    /// State.
    pub role: Role,
    /// Open or thin-walled.
    pub sheet: bool,
    /// Angle between facet normals from which an edge is a crease [rad]; `None`: the default.
    pub crease_angle: Option<f64>,
    /// How the facets are understood.
    pub surface: SurfaceKind,
    /// Highest field allowed, as a crest (or steady) value [V/m], and the word it was given with.
    pub field_limit: Option<(f64, ValueIs)>,
    /// Overall size on the drawing [m].
    pub size_check: Option<Vec3>,
    /// Where it stands.
    pub place: Option<Place>,
    /// Drawing number.
    pub drawing: Option<String>,
}

/// `[[voltage_case]]`; values as crest (or steady) values.
#[derive(Clone, Debug, PartialEq)]
pub struct VoltageCase {
    /// Name.
    pub name: String,
    /// What was typed.
    pub value_is: ValueIs,
    /// Electrode and crest potential [V].
    pub potentials: Vec<(String, f64)>,
    /// Electrode and crest charge [C].
    pub charges: Vec<(String, f64)>,
}

/// `[[look]]`.
#[derive(Clone, Debug, PartialEq)]
pub struct Look {
    /// Name.
    pub name: String,
    /// Points [m].
    pub points: Vec<Vec3>,
}

/// `[accuracy]`.
#[derive(Clone, Debug, PartialEq)]
pub struct Accuracy {
    /// Relative bar demanded of capacitances [1].
    pub capacitance: f64,
    /// Relative bar demanded of maxima [1]; read, not steered yet.
    pub max_field: Option<f64>,
    /// Most panels.
    pub max_panels: Option<usize>,
    /// Longest run [s].
    pub time_limit: Option<f64>,
    /// Most memory [B]; `None`: 70 % of what is free.
    pub memory_limit: Option<f64>,
    /// Threads; `None`: all.
    pub threads: Option<usize>,
}

/// `[deliver]`, paths resolved against the folder of the case file.
#[derive(Clone, Debug, PartialEq)]
pub struct Deliver {
    /// Folder of the outputs.
    pub folder: PathBuf,
    /// The record.
    pub record: PathBuf,
    /// The surface file, always beside the record.
    pub surface: PathBuf,
    /// The answer sheet.
    pub answers: Option<PathBuf>,
    /// The matrices: square at this path, long form beside it with `_long` before the ending.
    pub matrix: Option<PathBuf>,
    /// The subcircuit.
    pub netlist: Option<PathBuf>,
}

/// The shape files of a case, each read once.
#[derive(Clone, Debug, PartialEq)]
pub struct Shapes {
    /// In order of first mention.
    pub files: Vec<ShapeFile>,
}

/// One shape file.
#[derive(Clone, Debug, PartialEq)]
pub struct ShapeFile {
    /// Path as written in the case.
    pub path: String,
    /// Its bytes.
    pub bytes: Vec<u8>,
}
