//! NumPy's `.npy`: a header that is a Python dictionary, then the numbers.
//!
//! Format versions 1 to 3 as described in `numpy.lib.format`.

use std::io::{Cursor, Read};

use super::choose::Content;
use super::numbers::{self, Coding, Number, Order};
use super::{Fault, Wanted};
use crate::input::error::Place;
use crate::input::grid::{Grid, Origin};

/// NumPy itself refuses headers of more than 10 000 bytes.
const LONGEST_HEADER: usize = 1 << 16;

/// The header of an array.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Header {
    /// The type of its elements, as NumPy writes it.
    pub descr: String,
    /// Whether the first axis runs fastest.
    pub fortran: bool,
    /// Its axes.
    pub shape: Vec<u64>,
    /// Bytes before the first element.
    pub length: u64,
}

/// Reads a file of one array.
///
/// # Errors
/// [`Fault`] for anything but a matrix of real numbers that is there as a whole.
pub fn read(bytes: &[u8], place: &Place, wanted: &Wanted<'_>) -> Result<Grid, Fault> {
    wanted.no_arrays("a single array (.npy)")?;
    let mut from = Cursor::new(bytes);
    let header = Header::read(&mut from)?;
    let there = bytes.len() as u64 - header.length;
    Ok(Grid {
        file: place.file.clone(),
        row_labels: None,
        column_labels: None,
        values: header.matrix(&mut from, there)?,
        origin: Origin::Array(place.clone()),
    })
}

impl Header {
    /// Reads the magic bytes and the header.
    ///
    /// # Errors
    /// [`Fault`] where they are cut off or do not follow the format.
    pub fn read(from: &mut impl Read) -> Result<Header, Fault> {
        let mut start = [0; 8];
        take(from, &mut start)?;
        if !start.starts_with(b"\x93NUMPY") {
            return Err(Fault::Damaged(
                "a NumPy array does not start as one".to_owned(),
            ));
        }
        let (length, before) = if start[6] == 1 {
            let mut length = [0; 2];
            take(from, &mut length)?;
            (usize::from(u16::from_le_bytes(length)), 10)
        } else {
            let mut length = [0; 4];
            take(from, &mut length)?;
            (u32::from_le_bytes(length) as usize, 12)
        };
        if length > LONGEST_HEADER {
            return Err(Fault::Damaged(format!(
                "its NumPy header claims {length} bytes, more than {LONGEST_HEADER}"
            )));
        }
        let mut text = vec![0; length];
        take(from, &mut text)?;
        let text = String::from_utf8_lossy(&text);
        let (descr, fortran, shape) = dictionary(&text).ok_or_else(|| {
            Fault::Damaged(format!("its NumPy header is {:?}", shortened(text.trim())))
        })?;
        Ok(Header {
            descr,
            fortran,
            shape,
            length: (before + length) as u64,
        })
    }

    /// What the array can be.
    #[must_use]
    pub fn content(&self) -> Content {
        match (
            &self.shape[..],
            coding(&self.descr),
            text_width(&self.descr),
        ) {
            (&[rows, columns], Some(_), _) => Content::Matrix { rows, columns },
            (&[labels], _, Some(_)) => Content::Labels(labels),
            _ => Content::Other(format!("{} of {}", self.shape_in_words(), self.type_name())),
        }
    }

    /// Reads the elements as a matrix; `there` is how many bytes there are for them.
    ///
    /// # Errors
    /// [`Fault`] for other shapes and types, and where the bytes do not suffice.
    pub fn matrix(&self, from: &mut impl Read, there: u64) -> Result<ndarray::Array2<f64>, Fault> {
        let coding = coding(&self.descr).ok_or_else(|| Fault::NumberType {
            found: self.type_name(),
        })?;
        let &[rows, columns] = &self.shape[..] else {
            return Err(Fault::NotTwoAxes {
                found: self.shape_in_words(),
            });
        };
        let shape = coding.fit(rows, columns, there)?;
        let order = if self.fortran {
            Order::Columns
        } else {
            Order::Rows
        };
        numbers::matrix(from, coding, shape, order).map_err(|e| Fault::Damaged(e.to_string()))
    }

    /// Reads the elements as texts; `there` is how many bytes there are for them.
    ///
    /// # Errors
    /// [`Fault`] where the array holds something else or the bytes do not suffice.
    pub fn texts(&self, from: &mut impl Read, there: u64) -> Result<Vec<String>, Fault> {
        let (&[count], Some(width)) = (&self.shape[..], text_width(&self.descr)) else {
            return Err(Fault::Damaged("its labels are no texts".to_owned()));
        };
        let needed = u128::from(count) * width as u128;
        if needed > u128::from(there) {
            return Err(Fault::Truncated {
                what: "the array of labels".to_owned(),
                needed,
                found: there,
            });
        }
        let mut bytes = vec![0; width];
        (0..count)
            .map(|_| {
                take(from, &mut bytes)?;
                text(&bytes, &self.descr).ok_or_else(|| {
                    Fault::Damaged("a label holds bytes that are no text".to_owned())
                })
            })
            .collect()
    }

    /// The shape, for people.
    #[must_use]
    pub fn shape_in_words(&self) -> String {
        let axes: Vec<String> = self.shape.iter().map(u64::to_string).collect();
        match axes.len() {
            0 => "a single value".to_owned(),
            1 => format!("a list of {}", axes[0]),
            _ => format!("an array of {}", axes.join(" x ")),
        }
    }

    fn type_name(&self) -> String {
        match self.descr.trim_start_matches(['<', '>', '|', '=']) {
            "b1" | "?" => "bool".to_owned(),
            "O" => "Python objects".to_owned(),
            "f2" => "float16".to_owned(),
            "f4" => "float32".to_owned(),
            "f8" => "float64".to_owned(),
            other if other.starts_with('c') => "complex numbers".to_owned(),
            other if other.starts_with(['U', 'S']) => "texts".to_owned(),
            _ => format!("type {:?}", shortened(&self.descr)),
        }
    }
}

fn take(from: &mut impl Read, bytes: &mut [u8]) -> Result<(), Fault> {
    from.read_exact(bytes)
        .map_err(|e| Fault::Damaged(format!("its NumPy array cannot be read ({e})")))
}

fn shortened(text: &str) -> String {
    text.chars().take(80).collect()
}

/// The coding of a type of real numbers.
fn coding(descr: &str) -> Option<Coding> {
    let number = match descr.trim_start_matches(['<', '>', '|', '=']) {
        "u1" => Number::U8,
        "i1" => Number::I8,
        "u2" => Number::U16,
        "i2" => Number::I16,
        "u4" => Number::U32,
        "i4" => Number::I32,
        "u8" => Number::U64,
        "i8" => Number::I64,
        "f4" => Number::F32,
        "f8" => Number::F64,
        _ => return None,
    };
    Some(Coding {
        number,
        big_endian: descr.starts_with('>'),
    })
}

/// Bytes of one text of a type of texts.
fn text_width(descr: &str) -> Option<usize> {
    let bare = descr.trim_start_matches(['<', '>', '|', '=']);
    let (each, count) = if let Some(count) = bare.strip_prefix('U') {
        (4, count)
    } else {
        (1, bare.strip_prefix('S')?)
    };
    // A label of a megabyte is none.
    let count: usize = count.parse().ok().filter(|c| *c <= 1 << 20)?;
    Some(count * each)
}

/// One text: four bytes a character for `U`, UTF-8 for `S`; zeros fill the end.
fn text(bytes: &[u8], descr: &str) -> Option<String> {
    if !descr.contains('U') {
        let end = bytes.iter().rposition(|b| *b != 0).map_or(0, |at| at + 1);
        return String::from_utf8(bytes[..end].to_vec()).ok();
    }
    let text: String = bytes
        .chunks_exact(4)
        .map(|c| {
            let c = c.try_into().expect("chunks are of four bytes");
            char::from_u32(if descr.starts_with('>') {
                u32::from_be_bytes(c)
            } else {
                u32::from_le_bytes(c)
            })
        })
        .collect::<Option<String>>()?;
    Some(text.trim_end_matches('\0').to_owned())
}

/// Type, order and shape from a header such as
/// `{'descr': '<f8', 'fortran_order': False, 'shape': (3, 4), }`.
fn dictionary(text: &str) -> Option<(String, bool, Vec<u64>)> {
    let mut rest = text.trim().strip_prefix('{')?;
    let (mut descr, mut fortran, mut shape) = (None, None, None);
    loop {
        rest = rest.trim_start();
        if let Some(end) = rest.strip_prefix('}') {
            return end.trim().is_empty().then_some((descr?, fortran?, shape?));
        }
        let (key, value) = quoted(rest)?;
        let value = value.trim_start().strip_prefix(':')?.trim_start();
        rest = match key {
            "descr" if value.starts_with('[') => {
                // A list is a table with named columns; its end is that before the next key.
                let end = value.rfind(']')? + 1;
                descr = Some(value[..end].to_owned());
                &value[end..]
            }
            "descr" => {
                let (found, rest) = quoted(value)?;
                descr = Some(found.to_owned());
                rest
            }
            "fortran_order" => {
                fortran = Some(value.starts_with("True"));
                value
                    .strip_prefix("True")
                    .or_else(|| value.strip_prefix("False"))?
            }
            "shape" => {
                let (inside, rest) = value.strip_prefix('(')?.split_once(')')?;
                shape = Some(axes(inside)?);
                rest
            }
            _ => return None,
        }
        .trim_start();
        rest = rest.strip_prefix(',').unwrap_or(rest);
    }
}

/// A text in quotes at the start, and what follows it.
fn quoted(text: &str) -> Option<(&str, &str)> {
    let quote = text.chars().next().filter(|c| matches!(c, '\'' | '"'))?;
    text[1..].split_once(quote)
}

/// The numbers of a tuple; Python 2 wrote an L after some.
fn axes(inside: &str) -> Option<Vec<u64>> {
    inside
        .split(',')
        .map(str::trim)
        .filter(|axis| !axis.is_empty())
        .map(|axis| axis.trim_end_matches('L').parse().ok())
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn headers_are_read_in_any_order_and_spelling() {
        let read = |text| dictionary(text).unwrap();
        let expected = ("<f8".to_owned(), false, vec![3, 4]);
        for text in [
            "{'descr': '<f8', 'fortran_order': False, 'shape': (3, 4), }   \n",
            "{'shape': (3L, 4L), 'fortran_order': False, \"descr\": \"<f8\"}",
        ] {
            assert_eq!(read(text), expected);
        }
        let (descr, _, shape) =
            read("{'descr': [('x', '<f8')], 'fortran_order': True, 'shape': (5,), }");
        assert_eq!((descr.as_str(), shape), ("[('x', '<f8')]", vec![5]));
    }

    #[test]
    fn broken_headers_are_none() {
        for text in [
            "",
            "{",
            "{'descr': '<f8'}",
            "{'descr': '<f8', 'fortran_order': Maybe, 'shape': (1,)}",
            "{'descr': '<f8', 'fortran_order': False, 'shape': (-1, 2)}",
            "{'descr': '<f8', 'fortran_order': False, 'shape': (1, 2",
            "{'é",
        ] {
            assert_eq!(dictionary(text), None, "{text:?}");
        }
    }
}
