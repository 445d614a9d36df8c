//! The surface file: VTK XML unstructured grid, binary, compressed.
//!
//! Layout as in "VTK XML Formats" (docs.vtk.org): inline base64 arrays, little endian, 64-bit
//! headers, zlib blocks.  The same table gives the same bytes.
//!
//! Every triangle has its own three points.  Cell data, one value a panel: `electrode` and `row`
//! (−1: the 0 V reference), `unit_charge_<row>_C_per_m2_per_V`, `residual_<row>` (six components:
//! unit potential minus computed potential at the six points of the panel), and for each voltage
//! case `field_<case>_V_per_m` (crest).  Field data: `electrode_is_<name>` and `row_is_<name>`, each
//! holding the index that stands for the name.

use crate::record::SurfaceTable;
use flate2::Compression;
use flate2::write::ZlibEncoder;
use std::io;
use std::io::Write;

/// Bytes in a compressed block [B].
///
/// A file of 8,192 panels and two rows (1.38 MB) is 2.8 % larger with 4 KiB and 0.4 % smaller with
/// 256 KiB.
const BLOCK: usize = 1 << 15;

/// VTK's number for a triangle.
const TRIANGLE: u8 = 5;

/// A contradiction in a [`SurfaceTable`].
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
pub enum TableProblem {
    /// An array has another length than there are panels (or rows).
    #[error("`{array}` has {found} entries, {expected} are needed")]
    Length {
        /// Which.
        array: String,
        /// Its length.
        found: usize,
        /// What it should be.
        expected: usize,
    },
    /// A panel names an electrode or row that does not exist.
    #[error("panel {panel} names an electrode or a row that does not exist")]
    Index {
        /// Which.
        panel: usize,
    },
    /// A number is infinite or not a number.
    #[error("`{array}` of panel {panel} is not a finite number")]
    NotFinite {
        /// Which array.
        array: String,
        /// Which panel.
        panel: usize,
    },
}

/// Checks that all arrays fit each other and hold finite numbers.
///
/// # Errors
/// The first [`TableProblem`].
pub fn check(table: &SurfaceTable) -> Result<(), TableProblem> {
    let panels = table.corners.len();
    let length = |array: &str, found: usize, expected: usize| {
        let array = array.to_owned();
        if found == expected { Ok(()) } else { Err(TableProblem::Length { array, found, expected }) }
    };
    length("electrode", table.electrode.len(), panels)?;
    length("row", table.row.len(), panels)?;
    length("density", table.density.len(), table.rows.len())?;
    length("residual", table.residual.len(), table.rows.len())?;
    for panel in 0..panels {
        let row = table.row[panel];
        let row_exists = row == -1 || usize::try_from(row).is_ok_and(|row| row < table.rows.len());
        if table.bodies.len() <= table.electrode[panel] as usize || !row_exists {
            return Err(TableProblem::Index { panel });
        }
    }
    let finite = |array: &str, bad: Option<usize>| match bad {
        Some(panel) => Err(TableProblem::NotFinite { array: array.to_owned(), panel }),
        None => Ok(()),
    };
    let wild = |x: &[f64]| x.iter().any(|v| !v.is_finite());
    finite("corners", table.corners.iter().position(|c| c.iter().any(|x| wild(x))))?;
    for (density, residual) in table.density.iter().zip(&table.residual) {
        length("density", density.len(), panels)?;
        length("residual", residual.len(), panels)?;
        finite("density", density.iter().position(|v| !v.is_finite()))?;
        finite("residual", residual.iter().position(|r| wild(r)))?;
    }
    for (name, field) in &table.field {
        length(name, field.len(), panels)?;
        finite(name, field.iter().position(|v| !v.is_finite()))?;
    }
    Ok(())
}

/// Writes the table; the caller has [`check`]ed it.
///
/// # Errors
/// Those of `out`.
pub fn write(table: &SurfaceTable, out: &mut dyn Write) -> io::Result<()> {
    let panels = table.corners.len();
    writeln!(out, r#"<?xml version="1.0"?>"#)?;
    writeln!(
        out,
        r#"<VTKFile type="UnstructuredGrid" version="1.0" byte_order="LittleEndian" header_type="UInt64" compressor="vtkZLibDataCompressor">"#
    )?;
    writeln!(out, "<UnstructuredGrid>")?;
    legend(table, out)?;
    writeln!(out, r#"<Piece NumberOfPoints="{}" NumberOfCells="{panels}">"#, 3 * panels)?;
    writeln!(out, "<Points>")?;
    floats("points_m", 3, table.corners.iter().flatten().flatten().copied(), out)?;
    writeln!(out, "</Points>")?;
    cells(panels, out)?;
    cell_data(table, out)?;
    writeln!(out, "</Piece>\n</UnstructuredGrid>\n</VTKFile>")
}

fn legend(table: &SurfaceTable, out: &mut dyn Write) -> io::Result<()> {
    writeln!(out, "<FieldData>")?;
    for (kind, names) in [("electrode", &table.bodies), ("row", &table.rows)] {
        for (index, name) in names.iter().enumerate() {
            let name = format!("{kind}_is_{name}");
            let tag = format!(r#"type="Int32" Name="{}" NumberOfTuples="1" format="binary""#, escaped(&name));
            array(&tag, &(index as i32).to_le_bytes(), out)?;
        }
    }
    writeln!(out, "</FieldData>")
}

fn cells(panels: usize, out: &mut dyn Write) -> io::Result<()> {
    let points: Vec<u8> = (0..3 * panels as i64).flat_map(i64::to_le_bytes).collect();
    let ends: Vec<u8> = (1..=panels as i64).flat_map(|cell| (3 * cell).to_le_bytes()).collect();
    writeln!(out, "<Cells>")?;
    array(r#"type="Int64" Name="connectivity" format="binary""#, &points, out)?;
    array(r#"type="Int64" Name="offsets" format="binary""#, &ends, out)?;
    array(r#"type="UInt8" Name="types" format="binary""#, &vec![TRIANGLE; panels], out)?;
    writeln!(out, "</Cells>")
}

fn cell_data(table: &SurfaceTable, out: &mut dyn Write) -> io::Result<()> {
    let electrode: Vec<u8> = table.electrode.iter().flat_map(|e| e.to_le_bytes()).collect();
    let row: Vec<u8> = table.row.iter().flat_map(|r| r.to_le_bytes()).collect();
    writeln!(out, "<CellData>")?;
    array(r#"type="UInt32" Name="electrode" format="binary""#, &electrode, out)?;
    array(r#"type="Int32" Name="row" format="binary""#, &row, out)?;
    for (name, density) in table.rows.iter().zip(&table.density) {
        floats(&format!("unit_charge_{name}_C_per_m2_per_V"), 1, density.iter().copied(), out)?;
    }
    for (name, residual) in table.rows.iter().zip(&table.residual) {
        floats(&format!("residual_{name}"), 6, residual.iter().flatten().copied(), out)?;
    }
    for (name, field) in &table.field {
        floats(&format!("field_{name}_V_per_m"), 1, field.iter().copied(), out)?;
    }
    writeln!(out, "</CellData>")
}

fn floats(
    name: &str,
    components: usize,
    values: impl Iterator<Item = f64>,
    out: &mut dyn Write,
) -> io::Result<()> {
    let bytes: Vec<u8> = values.flat_map(f64::to_le_bytes).collect();
    let name = escaped(name);
    let shape =
        if components == 1 { String::new() } else { format!(r#" NumberOfComponents="{components}""#) };
    array(&format!(r#"type="Float64" Name="{name}"{shape} format="binary""#), &bytes, out)
}

/// One array: base64 of the header (block count, block size, size of a partial last block, sizes
/// after compression), then base64 of the blocks.
fn array(tag: &str, bytes: &[u8], out: &mut dyn Write) -> io::Result<()> {
    let (mut header, mut packed) = (Vec::new(), Vec::new());
    for value in [bytes.len().div_ceil(BLOCK), BLOCK, bytes.len() % BLOCK] {
        header.extend((value as u64).to_le_bytes());
    }
    for block in bytes.chunks(BLOCK) {
        let mut encoder = ZlibEncoder::new(Vec::new(), Compression::default());
        encoder.write_all(block)?;
        let block = encoder.finish()?;
        header.extend((block.len() as u64).to_le_bytes());
        packed.extend(block);
    }
    writeln!(out, "<DataArray {tag}>{}{}</DataArray>", base64(&header), base64(&packed))
}

/// Base64 with padding (RFC 4648, section 4).
fn base64(bytes: &[u8]) -> String {
    const LETTERS: &[u8; 64] = b"ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz0123456789+/";
    let mut text = String::with_capacity(bytes.len().div_ceil(3) * 4);
    for three in bytes.chunks(3) {
        let byte = |k: usize| u32::from(three.get(k).copied().unwrap_or(0));
        let bits = byte(0) << 16 | byte(1) << 8 | byte(2);
        for k in 0..4 {
            let letter = LETTERS[(bits >> (18 - 6 * k)) as usize & 63];
            text.push(if k <= three.len() { char::from(letter) } else { '=' });
        }
    }
    text
}

/// A name as the value of an XML attribute; characters XML cannot hold become `_`.
fn escaped(name: &str) -> String {
    let mut text = String::new();
    for c in name.chars() {
        match c {
            '&' => text.push_str("&amp;"),
            '<' => text.push_str("&lt;"),
            '>' => text.push_str("&gt;"),
            '"' => text.push_str("&quot;"),
            '\'' => text.push_str("&apos;"),
            c if c.is_control() || c == '\u{fffe}' || c == '\u{ffff}' => text.push('_'),
            c => text.push(c),
        }
    }
    text
}
