//! The numbers of a GIFTI array. What a header claims is compared with what is there before anything
//! is allocated.

use std::io::{Cursor, Read};

use base64::engine::general_purpose::STANDARD;
use base64::Engine;
use flate2::read::{MultiGzDecoder, ZlibDecoder};

use super::document::Array;
use super::fault::GiftiFault;
use crate::input::formats::numbers::{self, Coding, Number, Order};
use crate::input::formats::Inflated;

/// The keys of an array of labels, one for each vertex.
///
/// # Errors
/// [`GiftiFault`] where the array is not one number for each vertex, or not there as a whole.
pub fn decode(array: &Array) -> Result<Vec<f64>, GiftiFault> {
    let (vertices, others) = array.dimensions.split_first().unwrap_or((&0, &[]));
    if *vertices == 0 || others.iter().any(|d| *d != 1) {
        let axes: Vec<String> = array.dimensions.iter().map(u64::to_string).collect();
        return Err(GiftiFault::Shape {
            found: format!("an array of {}", axes.join(" x ")),
        });
    }
    let coding = Coding {
        number: number(&array.data_type)?,
        big_endian: match array.endian.as_str() {
            "BigEndian" => true,
            "LittleEndian" => false,
            // Numbers that are written out have no order of bytes.
            _ if array.encoding == "ASCII" => false,
            other => {
                return Err(GiftiFault::Coding {
                    attribute: "Endian",
                    found: other.to_owned(),
                    known: "LittleEndian, BigEndian",
                })
            }
        },
    };
    match array.encoding.as_str() {
        "ASCII" => written_out(&array.data, *vertices),
        "Base64Binary" => convert(&bytes(&array.data)?, coding, *vertices),
        "GZipBase64Binary" => {
            let packed = bytes(&array.data)?;
            convert(&inflate(&packed, coding, *vertices)?, coding, *vertices)
        }
        "ExternalFileBinary" => Err(GiftiFault::External),
        other => Err(GiftiFault::Coding {
            attribute: "Encoding",
            found: other.to_owned(),
            known: "ASCII, Base64Binary, GZipBase64Binary",
        }),
    }
}

fn number(data_type: &str) -> Result<Number, GiftiFault> {
    Ok(match data_type {
        "NIFTI_TYPE_UINT8" => Number::U8,
        "NIFTI_TYPE_INT8" => Number::I8,
        "NIFTI_TYPE_UINT16" => Number::U16,
        "NIFTI_TYPE_INT16" => Number::I16,
        "NIFTI_TYPE_UINT32" => Number::U32,
        "NIFTI_TYPE_INT32" => Number::I32,
        "NIFTI_TYPE_UINT64" => Number::U64,
        "NIFTI_TYPE_INT64" => Number::I64,
        "NIFTI_TYPE_FLOAT32" => Number::F32,
        "NIFTI_TYPE_FLOAT64" => Number::F64,
        other => {
            return Err(GiftiFault::DataType {
                found: other.chars().take(40).collect(),
            })
        }
    })
}

fn written_out(text: &str, vertices: u64) -> Result<Vec<f64>, GiftiFault> {
    let found = text.split_ascii_whitespace().count();
    if found as u64 != vertices {
        let expected = vertices;
        return Err(GiftiFault::Count { expected, found });
    }
    text.split_ascii_whitespace()
        .map(|word| {
            word.parse().map_err(|_| {
                let shown: String = word.chars().take(40).collect();
                GiftiFault::Damaged(format!("{shown:?} stands where a number was expected"))
            })
        })
        .collect()
}

/// Base64, in lines or not, to bytes.
fn bytes(text: &str) -> Result<Vec<u8>, GiftiFault> {
    let dense: Vec<u8> = text
        .bytes()
        .filter(|byte| !byte.is_ascii_whitespace())
        .collect();
    STANDARD
        .decode(dense)
        .map_err(|e| GiftiFault::Damaged(format!("its data are no Base64 ({e})")))
}

/// What is deflated, which the standard calls gzip and everybody writes with the header of zlib.
fn inflate(packed: &[u8], coding: Coding, vertices: u64) -> Result<Vec<u8>, GiftiFault> {
    let needed = u128::from(vertices) * coding.number.bytes() as u128;
    let allowed = Inflated::of(packed.len());
    let most = match u64::try_from(needed) {
        Ok(needed) if needed <= allowed.most => needed,
        _ => {
            return Err(GiftiFault::InflatesBeyond {
                expected: vertices,
                allowed,
            })
        }
    };
    let from: Box<dyn Read> = if packed.starts_with(b"\x1f\x8b") {
        Box::new(MultiGzDecoder::new(packed))
    } else {
        Box::new(ZlibDecoder::new(packed))
    };
    let mut bytes = Vec::new();
    // One byte more shows that there is more than there should be.
    from.take(most + 1)
        .read_to_end(&mut bytes)
        .map_err(|e| GiftiFault::Damaged(format!("its data cannot be inflated ({e})")))?;
    Ok(bytes)
}

fn convert(bytes: &[u8], coding: Coding, vertices: u64) -> Result<Vec<f64>, GiftiFault> {
    let needed = u128::from(vertices) * coding.number.bytes() as u128;
    if bytes.len() as u128 != needed {
        let more = bytes.len() as u128 > needed;
        return Err(GiftiFault::Length {
            expected: vertices,
            needed,
            found: if more {
                "more".to_owned()
            } else {
                bytes.len().to_string()
            },
        });
    }
    let shape = (bytes.len() / coding.number.bytes(), 1);
    let values = numbers::matrix(&mut Cursor::new(bytes), coding, shape, Order::Rows)
        .map_err(|e| GiftiFault::Damaged(e.to_string()))?;
    Ok(values.into_raw_vec_and_offset().0)
}
