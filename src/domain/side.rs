//! The two species of a study, and values held once for each.

use serde::Serialize;

/// One of the two species of a study.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize)]
#[serde(rename_all = "lowercase")]
pub enum Side {
    /// The species under `[species.a]`.
    A,
    /// The species under `[species.b]`.
    B,
}

impl Side {
    /// Both sides, a first.
    pub const BOTH: [Side; 2] = [Side::A, Side::B];

    /// The other species.
    #[must_use]
    pub fn opposite(self) -> Side {
        match self {
            Side::A => Side::B,
            Side::B => Side::A,
        }
    }

    /// The letter used in study files and column names.
    #[must_use]
    pub fn letter(self) -> &'static str {
        match self {
            Side::A => "a",
            Side::B => "b",
        }
    }
}

/// A value for each of the two species.
///
/// ```
/// use kinmark::domain::{Pair, Side};
/// let parcels = Pair { a: 90, b: 120 };
/// assert_eq!(parcels[Side::A.opposite()], 120);
/// ```
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default, Serialize)]
pub struct Pair<T> {
    /// The value for species a.
    pub a: T,
    /// The value for species b.
    pub b: T,
}

impl<T> Pair<T> {
    /// Calls `make` for a, then for b.
    pub fn from_fn(mut make: impl FnMut(Side) -> T) -> Self {
        let a = make(Side::A);
        let b = make(Side::B);
        Pair { a, b }
    }

    /// Like [`Pair::from_fn`], stopping at the first error.
    ///
    /// # Errors
    /// The first error `make` returns.
    pub fn try_from_fn<E>(mut make: impl FnMut(Side) -> Result<T, E>) -> Result<Self, E> {
        let a = make(Side::A)?;
        let b = make(Side::B)?;
        Ok(Pair { a, b })
    }

    /// Turns both values into others, at the same time where `threads` is not 1. An error of a comes
    /// before one of b, as if they had been turned one after the other.
    ///
    /// # Errors
    /// The error of a, else that of b.
    ///
    /// # Panics
    /// If `change` panics.
    pub fn try_map_at_once<U: Send, E: Send>(
        self,
        threads: usize,
        change: impl Fn(Side, T) -> Result<U, E> + Sync,
    ) -> Result<Pair<U>, E>
    where
        T: Send,
    {
        let Pair { a, b } = self;
        if threads == 1 {
            let a = change(Side::A, a)?;
            let b = change(Side::B, b)?;
            return Ok(Pair { a, b });
        }
        let (a, b) = std::thread::scope(|scope| {
            let other = scope.spawn(|| change(Side::B, b));
            let a = change(Side::A, a);
            let b = other
                .join()
                .unwrap_or_else(|fault| std::panic::resume_unwind(fault));
            (a, b)
        });
        Ok(Pair { a: a?, b: b? })
    }

    /// Borrows both values.
    pub fn as_ref(&self) -> Pair<&T> {
        Pair {
            a: &self.a,
            b: &self.b,
        }
    }

    /// Applies `change` to both values.
    pub fn map<U>(self, mut change: impl FnMut(T) -> U) -> Pair<U> {
        let a = change(self.a);
        let b = change(self.b);
        Pair { a, b }
    }
}

impl<T> std::ops::Index<Side> for Pair<T> {
    type Output = T;

    fn index(&self, side: Side) -> &T {
        match side {
            Side::A => &self.a,
            Side::B => &self.b,
        }
    }
}

impl<T> std::ops::IndexMut<Side> for Pair<T> {
    fn index_mut(&mut self, side: Side) -> &mut T {
        match side {
            Side::A => &mut self.a,
            Side::B => &mut self.b,
        }
    }
}
