//! One array of a MATLAB file of format 5: flags, shape, name, then numbers or texts.
//!
//! Laid out as in MathWorks, *MAT-File Format*, chapter 1 (level 5).

use std::io::{Cursor, Read};

use super::choose::Content;
use super::numbers::{Coding, Number};
use super::{Fault, Inflated};

/// No name, shape or label is longer.
const LONGEST: u32 = 1 << 20;

/// Classes of arrays that are told apart.
mod class {
    pub const CELL: u8 = 1;
    pub const STRUCTURE: u8 = 2;
    pub const TEXT: u8 = 4;
    pub const SPARSE: u8 = 5;
    pub const NUMBERS: std::ops::RangeInclusive<u8> = 6..=15;
    pub const OPAQUE: u8 = 17;
}

/// A reader of tagged elements.
pub struct Stream<R> {
    from: R,
    big_endian: bool,
}

/// The tag of an element: its type, its size, and its bytes where they are in the tag itself.
struct Tag {
    kind: u32,
    size: u32,
    inside: Option<[u8; 4]>,
}

impl<R: Read> Stream<R> {
    /// Reads tagged elements from bytes.
    pub fn new(from: R, big_endian: bool) -> Self {
        Stream { from, big_endian }
    }

    fn exact(&mut self, bytes: &mut [u8]) -> Result<(), Fault> {
        self.from
            .read_exact(bytes)
            .map_err(|e| Fault::Damaged(format!("a variable cannot be read ({e})")))
    }

    fn u32(&self, bytes: [u8; 4]) -> u32 {
        if self.big_endian {
            u32::from_be_bytes(bytes)
        } else {
            u32::from_le_bytes(bytes)
        }
    }

    fn tag(&mut self) -> Result<Tag, Fault> {
        let (mut first, mut second) = ([0; 4], [0; 4]);
        self.exact(&mut first)?;
        self.exact(&mut second)?;
        let kind = self.u32(first);
        // An element of up to four bytes has its size in the upper half of its type.
        Ok(match kind >> 16 {
            0 => Tag {
                kind,
                size: self.u32(second),
                inside: None,
            },
            size => Tag {
                kind: kind & 0xffff,
                size: size.min(4),
                inside: Some(second),
            },
        })
    }

    /// A short element: its type and bytes.
    fn element(&mut self) -> Result<(u32, Vec<u8>), Fault> {
        let tag = self.tag()?;
        if let Some(bytes) = tag.inside {
            return Ok((tag.kind, bytes[..tag.size as usize].to_vec()));
        }
        if tag.size > LONGEST {
            return Err(Fault::Damaged(format!(
                "a name, shape or text in it claims {} bytes",
                tag.size
            )));
        }
        let mut bytes = vec![0; tag.size as usize];
        self.exact(&mut bytes)?;
        let mut rest = [0; 8];
        let fill = bytes.len().next_multiple_of(8) - bytes.len();
        self.exact(&mut rest[..fill])?;
        Ok((tag.kind, bytes))
    }

    fn u32s(&self, bytes: &[u8]) -> Vec<u32> {
        bytes
            .chunks_exact(4)
            .map(|b| self.u32([b[0], b[1], b[2], b[3]]))
            .collect()
    }

    /// A text of an array of texts.
    fn text(&mut self) -> Result<Vec<char>, Fault> {
        let (kind, bytes) = self.element()?;
        let wide = || {
            bytes.chunks_exact(2).map(|b| {
                if self.big_endian {
                    u16::from_be_bytes([b[0], b[1]])
                } else {
                    u16::from_le_bytes([b[0], b[1]])
                }
            })
        };
        let text: Option<Vec<char>> = match kind {
            1 | 2 | 16 => std::str::from_utf8(&bytes)
                .ok()
                .map(|t| t.chars().collect()),
            3 | 4 | 17 => char::decode_utf16(wide()).collect::<Result<_, _>>().ok(),
            5 | 6 | 18 => self.u32s(&bytes).into_iter().map(char::from_u32).collect(),
            _ => None,
        };
        text.ok_or_else(|| Fault::Damaged("a text in it is no text".to_owned()))
    }
}

/// An array as its header describes it.
#[derive(Debug, Clone)]
pub struct Array {
    /// Its name.
    pub name: String,
    class: u8,
    complex: bool,
    logical: bool,
    shape: Vec<u32>,
}

impl Array {
    /// Reads the header of an array; `None` for an empty one without any.
    ///
    /// # Errors
    /// [`Fault`] where it is cut off or follows no format.
    pub fn read(from: &mut Stream<impl Read>) -> Result<Option<Array>, Fault> {
        let tag = from.tag()?;
        if tag.kind != 14 {
            return Err(Fault::Damaged(format!(
                "expected an array, found an element of type {}",
                tag.kind
            )));
        }
        if tag.size == 0 {
            return Ok(None);
        }
        let (_, flags) = from.element()?;
        let flags = from.u32s(&flags).first().copied().unwrap_or_default();
        let class = (flags & 0xff) as u8;
        let shape = if class == class::OPAQUE {
            Vec::new()
        } else {
            let (_, shape) = from.element()?;
            from.u32s(&shape)
        };
        let (_, name) = from.element()?;
        Ok(Some(Array {
            name: String::from_utf8_lossy(&name).into_owned(),
            class,
            complex: flags & 0x800 != 0,
            logical: flags & 0x200 != 0,
            shape,
        }))
    }

    /// What the array can be.
    #[must_use]
    pub fn content(&self) -> Content {
        let other = |what: &str| Content::Other(what.to_owned());
        if class::NUMBERS.contains(&self.class) {
            return match self.shape[..] {
                _ if self.complex => other("complex numbers"),
                _ if self.logical => other("logical values; save double(NAME)"),
                [rows, columns] => Content::Matrix {
                    rows: u64::from(rows),
                    columns: u64::from(columns),
                },
                _ => {
                    let axes: Vec<String> = self.shape.iter().map(u32::to_string).collect();
                    Content::Other(format!("an array of {}", axes.join(" x ")))
                }
            };
        }
        match (self.class, &self.shape[..]) {
            (class::CELL, &[1, labels] | &[labels, 1]) => Content::Labels(u64::from(labels)),
            (class::TEXT, &[labels, _]) => Content::Labels(u64::from(labels)),
            (class::CELL, _) => other("a cell array"),
            (class::STRUCTURE, _) => other("a structure"),
            (class::SPARSE, _) => other("a sparse matrix; save full(NAME)"),
            (class::OPAQUE, _) => other("an object; save cellstr(NAME) of texts"),
            _ => other("something else"),
        }
    }

    /// How the numbers of a matrix are written, its shape, and their bytes; column after column.
    ///
    /// # Errors
    /// [`Fault`] where the header and the bytes do not fit together, or there are more than allowed.
    pub fn numbers<R: Read>(
        &self,
        mut from: Stream<R>,
        allowed: Inflated,
    ) -> Result<(Coding, (usize, usize), impl Read + use<R>), Fault> {
        let tag = from.tag()?;
        let number = match tag.kind {
            1 => Number::I8,
            2 => Number::U8,
            3 => Number::I16,
            4 => Number::U16,
            5 => Number::I32,
            6 => Number::U32,
            7 => Number::F32,
            9 => Number::F64,
            12 => Number::I64,
            13 => Number::U64,
            other => {
                return Err(Fault::Damaged(format!(
                    "numbers in it are of the unknown type {other}"
                )))
            }
        };
        let coding = Coding {
            number,
            big_endian: from.big_endian,
        };
        let &[rows, columns] = &self.shape[..] else {
            return Err(Fault::NotTwoAxes {
                found: format!("{} axes", self.shape.len()),
            });
        };
        let shape = coding.fit(u64::from(rows), u64::from(columns), u64::from(tag.size))?;
        if u64::from(tag.size) > allowed.most {
            return Err(Fault::InflatesBeyond(allowed));
        }
        let inside = tag.inside.map_or_else(Vec::new, |bytes| bytes.to_vec());
        Ok((coding, shape, Cursor::new(inside).chain(from.from)))
    }

    /// The texts of a cell array, or the rows of an array of characters.
    ///
    /// # Errors
    /// [`Fault`] where something else is in it.
    pub fn texts(&self, from: &mut Stream<impl Read>) -> Result<Vec<String>, Fault> {
        if self.class == class::TEXT {
            let letters = from.text()?;
            let rows = self.shape.first().map_or(0, |rows| *rows as usize);
            let size: u128 = self.shape.iter().map(|axis| u128::from(*axis)).product();
            if letters.len() as u128 != size {
                return Err(Fault::Damaged(format!(
                    "the texts in {:?} have {} letters, not {size}",
                    self.name,
                    letters.len()
                )));
            }
            return Ok((0..rows)
                .map(|row| letters.iter().skip(row).step_by(rows).collect())
                .collect());
        }
        let cells: u64 = self.shape.iter().map(|axis| u64::from(*axis)).product();
        (0..cells).map(|at| self.cell(at, from)).collect()
    }

    /// The next cell as a text.
    fn cell(&self, at: u64, from: &mut Stream<impl Read>) -> Result<String, Fault> {
        let tag = from.tag()?;
        if tag.kind != 14 || tag.size > LONGEST {
            return Err(Fault::Damaged(format!(
                "the cell array {:?} is broken at {}",
                self.name,
                at + 1
            )));
        }
        // The whole cell, with its tag before it, as a file of its own.
        let mut bytes = vec![0; 8 + tag.size as usize];
        let (kind, size) = if from.big_endian {
            (tag.kind.to_be_bytes(), tag.size.to_be_bytes())
        } else {
            (tag.kind.to_le_bytes(), tag.size.to_le_bytes())
        };
        bytes[..4].copy_from_slice(&kind);
        bytes[4..8].copy_from_slice(&size);
        from.exact(&mut bytes[8..])?;
        let mut cell = Stream::new(Cursor::new(bytes), from.big_endian);
        let Some(array) = Array::read(&mut cell)? else {
            return Ok(String::new());
        };
        match (array.class, &array.shape[..]) {
            (class::TEXT, &[1, _]) => Ok(cell.text()?.into_iter().collect()),
            // An empty text has no row at all.
            (class::TEXT, shape) if shape.contains(&0) => Ok(String::new()),
            _ => Err(Fault::WrongArray {
                key: "label-variable",
                name: self.name.clone(),
                found: format!("a cell array whose cell {} holds no text", at + 1),
                expected: "a list of texts",
            }),
        }
    }
}
