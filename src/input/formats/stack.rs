//! A stack of matrices in one NumPy array of three axes.

use std::io::Cursor;

use ndarray::{Array3, ArrayD, Axis, IxDyn, ShapeBuilder};

use super::magic::Kind;
use super::npy::Header;
use super::{gzip, Fault};
use crate::input::error::{InputError, Place};
use crate::input::grid::{Grid, Origin};
use crate::input::source::Bytes;

/// Reads a stack of matrices, one for each individual. Individuals are along the first axis, or along
/// the last where only the first two are alike.
///
/// # Errors
/// [`InputError`] for anything but an array of three axes.
pub fn read(file: &Bytes) -> Result<Vec<Grid>, InputError> {
    let place = Place::file(&file.file.path);
    let fail = |fault: Fault| InputError::new(place.clone(), fault.into());
    let inflated;
    let file = match Kind::of(&file.bytes) {
        Kind::Gzip => {
            inflated = gzip::inflate(file.clone())?;
            &inflated
        }
        _ => file,
    };
    if Kind::of(&file.bytes) != Kind::Npy {
        return Err(fail(Fault::NoStack {
            found: "another kind of file".to_owned(),
        }));
    }
    let array = values(&file.bytes).map_err(fail)?;
    let (first, second, third) = array.dim();
    let subjects = if first == second && second != third {
        Axis(2)
    } else {
        Axis(0)
    };
    Ok(array
        .axis_iter(subjects)
        .zip(1..)
        .map(|(matrix, at)| Grid {
            file: place.file.clone(),
            row_labels: None,
            column_labels: None,
            values: matrix.as_standard_layout().into_owned(),
            origin: Origin::Array(place.clone().array(&format!("subject {at}"))),
        })
        .collect())
}

fn values(bytes: &[u8]) -> Result<Array3<f64>, Fault> {
    let mut from = Cursor::new(bytes);
    let header = Header::read(&mut from)?;
    let there = bytes.len() as u64 - header.length;
    let &[first, second, third] = &header.shape[..] else {
        return Err(Fault::NoStack {
            found: header.shape_in_words(),
        });
    };
    // The elements in the order of the file, read as one long row.
    let all = first
        .checked_mul(second)
        .and_then(|n| n.checked_mul(third))
        .ok_or(Fault::NoStack {
            found: header.shape_in_words(),
        })?;
    let row = Header {
        shape: vec![1, all],
        fortran: false,
        ..header.clone()
    };
    let values = row.matrix(&mut from, there)?.into_raw_vec_and_offset().0;
    let shape = [first, second, third].map(|n| usize::try_from(n).unwrap_or(usize::MAX));
    let shape = IxDyn(&shape).set_f(header.fortran);
    ArrayD::from_shape_vec(shape, values)
        .and_then(ArrayD::into_dimensionality)
        .map_err(|e| Fault::Damaged(e.to_string()))
}
