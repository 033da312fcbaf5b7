//! The field as a VTK XML structured grid, an open format that general viewers read: potential at the nodes of the fitted
//! grid, field strength in its cells, SI units.
//!
//! Arrays are zlib-compressed and base64-encoded: a header of four 64-bit numbers (blocks, bytes of a block, bytes of a
//! last partial block, compressed bytes) and the data, each encoded for itself.

use std::fmt::Write as _;
use std::io::Write as _;

use base64::engine::general_purpose::STANDARD;
use base64::Engine;
use flate2::write::ZlibEncoder;
use flate2::Compression;
use tiltgap_solver::{cell_field, Level};

use super::caption;
use super::render::escaped;
use crate::assess::Setup;
use crate::error::Error;

/// The numbers of a grid, doubled at y < 0 where only the half at y > 0 was solved. x runs fastest, z slowest.
#[derive(Clone, Debug, PartialEq)]
pub struct Whole {
    /// Nodes along x, y, z.
    pub shape: [usize; 3],
    /// Positions of the nodes, in m.
    pub points: Vec<[f64; 3]>,
    /// Potentials of the nodes, in V.
    pub potential: Vec<f64>,
    /// Field strength in the cells, in V/m.
    pub field: Vec<[f64; 3]>,
}

impl Whole {
    /// All of a solved level.
    pub fn new(setup: &Setup, level: &Level) -> Whole {
        let question = &setup.question;
        let size_m = question.arrangement.size_m();
        let plates_v = question.connection.potentials(level).map(|u| u * question.voltage_v);
        let grid = &level.grid;
        let [nx, ny, nz] = grid.shape();
        let cells = cell_field(level, plates_v);
        // Rows along y with the sign of y: the mirrored ones first, the plane y = 0 once.
        let mirrored = if grid.half { ny - 1 } else { 0 };
        let rows: Vec<(usize, f64)> =
            (1..=mirrored).rev().map(|j| (j, -1.0)).chain((0..ny).map(|j| (j, 1.0))).collect();
        let cell_rows: Vec<(usize, f64)> =
            (0..mirrored).rev().map(|j| (j, -1.0)).chain((0..ny - 1).map(|j| (j, 1.0))).collect();
        let mut whole = Whole {
            shape: [nx, rows.len(), nz],
            points: Vec::with_capacity(nx * rows.len() * nz),
            potential: Vec::with_capacity(nx * rows.len() * nz),
            field: Vec::with_capacity((nx - 1) * cell_rows.len() * (nz - 1)),
        };
        for k in 0..nz {
            for &(j, sign) in &rows {
                for i in 0..nx {
                    let [x, y, z] = grid.position(i, j, k);
                    whole.points.push([size_m * x, sign * size_m * y, size_m * z]);
                    let phi = level.phi[grid.index(i, j, k)];
                    whole.potential.push(phi[0] * plates_v[0] + phi[1] * plates_v[1]);
                }
            }
        }
        for k in 0..nz - 1 {
            for &(j, sign) in &cell_rows {
                for i in 0..nx - 1 {
                    let [x, y, z] = cells[(i * (ny - 1) + j) * (nz - 1) + k];
                    whole.field.push([x / size_m, sign * y / size_m, z / size_m]);
                }
            }
        }
        whole
    }
}

/// Numbers as the format wants them.
fn encoded(values: impl Iterator<Item = f64>) -> std::io::Result<String> {
    let bytes: Vec<u8> = values.flat_map(f64::to_le_bytes).collect();
    let mut encoder = ZlibEncoder::new(Vec::new(), Compression::default());
    encoder.write_all(&bytes)?;
    let packed = encoder.finish()?;
    let header = [1, bytes.len() as u64, 0, packed.len() as u64];
    let header: Vec<u8> = header.into_iter().flat_map(u64::to_le_bytes).collect();
    Ok(STANDARD.encode(header) + &STANDARD.encode(packed))
}

fn array(name: &str, components: usize, values: impl Iterator<Item = f64>) -> std::io::Result<String> {
    let data = encoded(values)?;
    Ok(format!(
        "<DataArray type=\"Float64\" Name=\"{name}\" NumberOfComponents=\"{components}\" format=\"binary\">\n{data}\n\
         </DataArray>\n"
    ))
}

/// The file.
///
/// # Errors
/// No memory for the compressor.
pub fn vts(setup: &Setup, level: &Level) -> Result<Vec<u8>, Error> {
    let whole = Whole::new(setup, level);
    let [nx, ny, nz] = whole.shape.map(|n| n - 1);
    let extent = format!("0 {nx} 0 {ny} 0 {nz}");
    // A comment of XML must not hold two hyphens.
    let title = escaped(&caption::plain(&setup.bench.title)).replace('-', "‐");
    let mut text = format!(
        "<?xml version=\"1.0\" encoding=\"UTF-8\"?>\n<!-- tiltgap {}: {title}; ",
        env!("CARGO_PKG_VERSION")
    );
    writeln!(
        text,
        "{}; level {}; metres, V, V/m -->",
        caption::circumstances(setup).replace('-', "‐"),
        level.grid.q
    )
    .map_err(std::io::Error::other)?;
    text.push_str(
        "<VTKFile type=\"StructuredGrid\" version=\"1.0\" byte_order=\"LittleEndian\" header_type=\"UInt64\" \
         compressor=\"vtkZLibDataCompressor\">\n",
    );
    text += &format!("<StructuredGrid WholeExtent=\"{extent}\">\n<Piece Extent=\"{extent}\">\n");
    text += "<PointData Scalars=\"potential_V\">\n";
    text += &array("potential_V", 1, whole.potential.iter().copied())?;
    text += "</PointData>\n<CellData Vectors=\"field_V_per_m\">\n";
    text += &array("field_V_per_m", 3, whole.field.iter().flatten().copied())?;
    text += "</CellData>\n<Points>\n";
    text += &array("points_m", 3, whole.points.iter().flatten().copied())?;
    text += "</Points>\n</Piece>\n</StructuredGrid>\n</VTKFile>\n";
    Ok(text.into_bytes())
}
