//! CIFTI-2 of parcels (`.pconn.nii`): a NIfTI-2 header, an XML that names the parcels, the matrix.
//!
//! CIFTI-2 stores a matrix row after row; `dim[5]` is the length of a row. The labels of the columns
//! are those of matrix dimension 0 ("along a row"), the labels of the rows those of dimension 1.

use std::io::Cursor;

use super::cifti_labels;
use super::numbers::{self, Coding, Number, Order};
use super::{Fault, Wanted};
use crate::input::error::Place;
use crate::input::grid::{Grid, Label, Origin};

/// Bytes of a NIfTI-2 header.
const HEADER: usize = 540;
/// The code of the extension that holds the XML of CIFTI.
const CIFTI: u32 = 32;

/// A NIfTI-2 header and what follows it.
struct Nifti<'b> {
    bytes: &'b [u8],
    big_endian: bool,
}

/// Reads a matrix of parcels.
///
/// # Errors
/// [`Fault`] where the file is cut off, or is something else than a matrix of parcels.
pub fn read(bytes: &[u8], place: &Place, wanted: &Wanted<'_>) -> Result<Grid, Fault> {
    wanted.no_arrays("a CIFTI-2 matrix")?;
    let nifti = Nifti::new(bytes)?;
    let (rows, columns) = nifti.shape()?;
    let offset = nifti.offset()?;
    let (of_columns, of_rows) = cifti_labels::read(nifti.xml(offset)?)?;

    let coding = nifti.coding()?;
    let data = &bytes[offset..];
    let shape = coding.fit(rows, columns, data.len() as u64)?;
    for (axis, labels, entries) in [
        ("columns", &of_columns, shape.1),
        ("rows", &of_rows, shape.0),
    ] {
        if labels.len() != entries {
            return Err(Fault::ParcelCount {
                axis,
                parcels: labels.len(),
                entries,
            });
        }
    }
    let mut values = numbers::matrix(&mut Cursor::new(data), coding, shape, Order::Rows)
        .map_err(|e| Fault::Damaged(e.to_string()))?;
    if let Some((slope, intercept)) = nifti.scaling() {
        values.mapv_inplace(|value| slope * value + intercept);
    }
    Ok(Grid {
        file: place.file.clone(),
        row_labels: Some(Label::in_rows(of_rows, &place.clone().array("rows"))),
        column_labels: Some(Label::in_rows(of_columns, &place.clone().array("columns"))),
        values,
        origin: Origin::Array(place.clone()),
    })
}

impl<'b> Nifti<'b> {
    fn new(bytes: &'b [u8]) -> Result<Self, Fault> {
        // Four more bytes say whether an extension follows.
        if bytes.len() < HEADER + 4 {
            return Err(Fault::Truncated {
                what: "the NIfTI-2 header".to_owned(),
                needed: HEADER as u128 + 4,
                found: bytes.len() as u64,
            });
        }
        let big_endian = match bytes[..4] {
            [0x1c, 2, 0, 0] => false,
            [0, 0, 2, 0x1c] => true,
            _ => {
                return Err(Fault::Damaged(
                    "its NIfTI-2 header does not say 540 bytes".to_owned(),
                ))
            }
        };
        Ok(Nifti { bytes, big_endian })
    }

    /// The `N` bytes at a place within the file, least significant first.
    fn at<const N: usize>(&self, place: usize) -> [u8; N] {
        let mut bytes = [0; N];
        bytes.copy_from_slice(&self.bytes[place..place + N]);
        if self.big_endian {
            bytes.reverse();
        }
        bytes
    }

    fn u32(&self, place: usize) -> u32 {
        u32::from_le_bytes(self.at(place))
    }

    fn i64(&self, place: usize) -> i64 {
        i64::from_le_bytes(self.at(place))
    }

    fn f64(&self, place: usize) -> f64 {
        f64::from_le_bytes(self.at(place))
    }

    /// Rows and columns.
    fn shape(&self) -> Result<(u64, u64), Fault> {
        let dim: Vec<i64> = (0..8).map(|i| self.i64(16 + 8 * i)).collect();
        let image = dim[0] != 6 || dim[1..5].iter().any(|d| *d != 1);
        if image {
            let axes = usize::try_from(dim[0]).unwrap_or(0).min(7);
            let axes: Vec<String> = dim[1..=axes].iter().map(i64::to_string).collect();
            return Err(Fault::NotParcels {
                found: format!("a NIfTI-2 file of {}", axes.join(" x ")),
            });
        }
        match (u64::try_from(dim[6]), u64::try_from(dim[5])) {
            (Ok(rows), Ok(columns)) => Ok((rows, columns)),
            _ => Err(Fault::Damaged("its matrix has a negative size".to_owned())),
        }
    }

    /// Where the matrix starts.
    fn offset(&self) -> Result<usize, Fault> {
        let offset = self.i64(168);
        usize::try_from(offset)
            .ok()
            .filter(|at| (HEADER + 4..=self.bytes.len()).contains(at))
            .ok_or_else(|| {
                Fault::Damaged(format!(
                    "its matrix is said to start at byte {offset}, but the file has {}",
                    self.bytes.len()
                ))
            })
    }

    fn coding(&self) -> Result<Coding, Fault> {
        let number = match i16::from_le_bytes(self.at(12)) {
            16 => Number::F32,
            64 => Number::F64,
            other => {
                return Err(Fault::NumberType {
                    found: format!("NIfTI data type {other}"),
                })
            }
        };
        Ok(Coding {
            number,
            big_endian: self.big_endian,
        })
    }

    /// Factor and summand, where the header states any.
    fn scaling(&self) -> Option<(f64, f64)> {
        let (slope, intercept) = (self.f64(176), self.f64(184));
        let stated = slope.is_finite() && intercept.is_finite() && slope != 0.0;
        (stated && (slope, intercept) != (1.0, 0.0)).then_some((slope, intercept))
    }

    /// The XML of CIFTI among the extensions before the matrix.
    fn xml(&self, offset: usize) -> Result<&'b str, Fault> {
        let mut at = HEADER + 4;
        while self.bytes[HEADER] != 0 && at + 8 <= offset {
            let size = self.u32(at) as usize;
            if size < 8 || size > offset - at {
                return Err(Fault::Damaged(format!(
                    "an extension of its header claims {size} bytes"
                )));
            }
            if self.u32(at + 4) == CIFTI {
                return std::str::from_utf8(&self.bytes[at + 8..at + size])
                    .map(|xml| xml.trim_end_matches('\0'))
                    .map_err(|_| Fault::Damaged("its XML is no UTF-8 text".to_owned()));
            }
            at += size;
        }
        Err(Fault::NotParcels {
            found: "a NIfTI-2 file without the XML of CIFTI".to_owned(),
        })
    }
}
