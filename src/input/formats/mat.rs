//! MATLAB files of format 5 (saved with `-v6` or `-v7`): variables one after the other, each perhaps
//! compressed.

use std::io::{Cursor, Read};

use flate2::read::ZlibDecoder;

use super::choose::{self, Listed};
use super::mat_array::{Array, Stream};
use super::numbers::{self, Order};
use super::{Fault, Inflated, Wanted};
use crate::input::error::Place;
use crate::input::grid::{Grid, Origin};

/// Bytes of the file's header.
const HEADER: usize = 128;
/// Type of an array.
const MATRIX: u32 = 14;
/// Type of a compressed array.
const COMPRESSED: u32 = 15;

/// Reads a matrix, and its labels where they are there, from a MATLAB file.
///
/// # Errors
/// [`Fault`] where the file is damaged or does not hold what is wanted.
pub fn read(bytes: &[u8], place: &Place, wanted: &Wanted<'_>) -> Result<Grid, Fault> {
    let (variables, listed) = list(bytes)?;
    let matrix = choose::matrix(&listed, wanted)?;
    let values = {
        let mut from = variables[matrix].open();
        let array = Array::read(&mut from)?;
        let (coding, shape, mut from) = array
            .ok_or_else(|| Fault::Damaged("a variable is empty".to_owned()))?
            .numbers(from, variables[matrix].most())?;
        numbers::matrix(&mut from, coding, shape, Order::Columns)
            .map_err(|e| Fault::Damaged(e.to_string()))?
    };
    let (row_labels, column_labels) =
        choose::labels(&listed, wanted, values.dim(), place, |labels| {
            let mut from = variables[labels].open();
            match Array::read(&mut from)? {
                Some(array) => array.texts(&mut from),
                None => Ok(Vec::new()),
            }
        })?;
    Ok(Grid {
        file: place.file.clone(),
        row_labels,
        column_labels,
        values,
        origin: Origin::Array(place.clone().array(&listed[matrix].name)),
    })
}

/// The variables of a file.
///
/// # Errors
/// [`Fault`] where the file is damaged.
pub fn arrays(bytes: &[u8]) -> Result<Vec<Listed>, Fault> {
    list(bytes).map(|(_, listed)| listed)
}

/// All variables with a name: their bytes and what they can be.
fn list(bytes: &[u8]) -> Result<(Vec<Element<'_>>, Vec<Listed>), Fault> {
    let elements = elements(bytes)?;
    let (mut variables, mut listed) = (Vec::new(), Vec::new());
    for element in elements {
        let Some(array) = Array::read(&mut element.open())? else {
            continue;
        };
        // What MATLAB keeps for itself has no name.
        if !array.name.is_empty() {
            listed.push(Listed {
                name: array.name.clone(),
                content: array.content(),
            });
            variables.push(element);
        }
    }
    Ok((variables, listed))
}

/// The bytes of a variable, from its tag on, perhaps compressed.
struct Element<'b> {
    bytes: &'b [u8],
    compressed: bool,
    big_endian: bool,
}

impl<'b> Element<'b> {
    fn open(&self) -> Stream<Box<dyn Read + 'b>> {
        let from: Box<dyn Read + 'b> = if self.compressed {
            Box::new(ZlibDecoder::new(self.bytes).take(self.most().most))
        } else {
            Box::new(Cursor::new(self.bytes))
        };
        Stream::new(from, self.big_endian)
    }

    /// The most bytes it may hold.
    fn most(&self) -> Inflated {
        if self.compressed {
            Inflated::of(self.bytes.len())
        } else {
            Inflated {
                most: self.bytes.len() as u64,
            }
        }
    }
}

/// Divides a file into its variables.
fn elements(bytes: &[u8]) -> Result<Vec<Element<'_>>, Fault> {
    let cut = |what: &str, needed: usize, found: usize| Fault::Truncated {
        what: what.to_owned(),
        needed: needed as u128,
        found: found as u64,
    };
    if bytes.len() < HEADER {
        return Err(cut("the MATLAB header", HEADER, bytes.len()));
    }
    let big_endian = bytes.get(126..128) == Some(b"MI");
    let u32 = |at: usize| {
        let bytes = [bytes[at], bytes[at + 1], bytes[at + 2], bytes[at + 3]];
        if big_endian {
            u32::from_be_bytes(bytes)
        } else {
            u32::from_le_bytes(bytes)
        }
    };
    let mut elements = Vec::new();
    let mut at = HEADER;
    while at < bytes.len() {
        let left = bytes.len() - at;
        if left < 8 {
            return Err(cut("the tag of a variable", 8, left));
        }
        let (kind, size) = (u32(at), u32(at + 4) as usize);
        if size > left - 8 {
            return Err(cut("a variable", size, left - 8));
        }
        let end = at + 8 + size;
        let compressed = kind == COMPRESSED;
        if compressed || kind == MATRIX {
            elements.push(Element {
                bytes: &bytes[if compressed { at + 8 } else { at }..end],
                compressed,
                big_endian,
            });
        }
        // Only what is not compressed is filled up to eight bytes.
        at = if compressed {
            end
        } else {
            end.next_multiple_of(8)
        };
    }
    Ok(elements)
}
