//! Binary numbers of any width and byte order to double precision, in a stream: never more than a
//! buffer of raw bytes beside the matrix.

use std::io::{self, Read};

use ndarray::Array2;

use super::Fault;

/// Numbers converted at a time.
const AT_ONCE: usize = 8192;

/// Types of numbers that are read.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Number {
    /// Unsigned, 8 bits.
    U8,
    /// Signed, 8 bits.
    I8,
    /// Unsigned, 16 bits.
    U16,
    /// Signed, 16 bits.
    I16,
    /// Unsigned, 32 bits.
    U32,
    /// Signed, 32 bits.
    I32,
    /// Unsigned, 64 bits; above 2^53 rounded.
    U64,
    /// Signed, 64 bits; beyond 2^53 rounded.
    I64,
    /// Single precision.
    F32,
    /// Double precision.
    F64,
}

/// How numbers are written.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Coding {
    /// Their type.
    pub number: Number,
    /// Whether the most significant byte comes first.
    pub big_endian: bool,
}

/// In which order the entries of a matrix stand.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Order {
    /// Row after row.
    Rows,
    /// Column after column.
    Columns,
}

impl Number {
    /// Bytes of one number.
    #[must_use]
    pub fn bytes(self) -> usize {
        match self {
            Number::U8 | Number::I8 => 1,
            Number::U16 | Number::I16 => 2,
            Number::U32 | Number::I32 | Number::F32 => 4,
            Number::U64 | Number::I64 | Number::F64 => 8,
        }
    }
}

impl Coding {
    /// The shape of a matrix, and the bytes it takes.
    ///
    /// # Errors
    /// [`Fault`] where the matrix is empty or larger than the `there` bytes there are.
    pub fn fit(self, rows: u64, columns: u64, there: u64) -> Result<(usize, usize), Fault> {
        if rows == 0 || columns == 0 {
            return Err(Fault::NotTwoAxes {
                found: format!("an empty array of {rows} x {columns}"),
            });
        }
        let needed = u128::from(rows)
            .saturating_mul(u128::from(columns))
            .saturating_mul(self.number.bytes() as u128);
        let shape = usize::try_from(rows)
            .ok()
            .zip(usize::try_from(columns).ok());
        shape
            .filter(|_| needed <= u128::from(there))
            .ok_or_else(|| Fault::Truncated {
                what: format!("a matrix of {rows} x {columns}"),
                needed,
                found: there,
            })
    }

    /// Converts whole numbers one after the other.
    #[allow(clippy::cast_lossless)]
    fn each(self, bytes: &[u8], mut put: impl FnMut(f64)) {
        macro_rules! convert {
            ($type:ty) => {
                for number in bytes.chunks_exact(size_of::<$type>()) {
                    let number = number.try_into().expect("chunks are as long as the type");
                    put(if self.big_endian {
                        <$type>::from_be_bytes(number)
                    } else {
                        <$type>::from_le_bytes(number)
                    } as f64);
                }
            };
        }
        match self.number {
            Number::U8 => convert!(u8),
            Number::I8 => convert!(i8),
            Number::U16 => convert!(u16),
            Number::I16 => convert!(i16),
            Number::U32 => convert!(u32),
            Number::I32 => convert!(i32),
            Number::U64 => convert!(u64),
            Number::I64 => convert!(i64),
            Number::F32 => convert!(f32),
            Number::F64 => convert!(f64),
        }
    }
}

/// Reads a matrix whose shape has passed [`Coding::fit`].
///
/// # Errors
/// What the reader says, above all that it ends too early.
pub fn matrix(
    from: &mut impl Read,
    coding: Coding,
    (rows, columns): (usize, usize),
    order: Order,
) -> io::Result<Array2<f64>> {
    let mut values = Array2::zeros((rows, columns));
    let mut buffer = vec![0; AT_ONCE * coding.number.bytes()];
    let mut left = rows * columns;
    let (mut i, mut j) = (0, 0);
    while left > 0 {
        let now = left.min(AT_ONCE);
        let bytes = &mut buffer[..now * coding.number.bytes()];
        from.read_exact(bytes)?;
        coding.each(bytes, |value| {
            values[(i, j)] = value;
            match order {
                Order::Rows => {
                    j += 1;
                    if j == columns {
                        (i, j) = (i + 1, 0);
                    }
                }
                Order::Columns => {
                    i += 1;
                    if i == rows {
                        (i, j) = (0, j + 1);
                    }
                }
            }
        });
        left -= now;
    }
    Ok(values)
}
