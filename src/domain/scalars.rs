//! Numbers that carry a meaning, checked once when they are made.

use serde::Serialize;
use thiserror::Error;

/// A number outside the range its meaning allows.
#[derive(Debug, Clone, PartialEq, Error)]
#[error("{name} must be {expected}, not {found}")]
pub struct ScalarError {
    /// What the number stands for.
    pub name: &'static str,
    /// The range allowed, in words.
    pub expected: &'static str,
    /// The number that came.
    pub found: f64,
}

/// The seed from which every random draw of a run derives.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
#[serde(transparent)]
pub struct Seed(pub u64);

/// A share in (0, 1].
///
/// ```
/// use kinmark::domain::Share;
/// assert_eq!(Share::new(0.1).unwrap().get(), 0.1);
/// assert!(Share::new(0.0).is_err());
/// ```
#[derive(Debug, Clone, Copy, PartialEq, PartialOrd, Serialize)]
#[serde(transparent)]
pub struct Share(f64);

impl Share {
    /// Everything.
    pub const ALL: Share = Share(1.0);

    /// Checks that `value` lies in (0, 1].
    ///
    /// # Errors
    /// [`ScalarError`] where it does not, or is not a number.
    pub fn new(value: f64) -> Result<Self, ScalarError> {
        if value > 0.0 && value <= 1.0 {
            Ok(Share(value))
        } else {
            Err(ScalarError {
                name: "a share",
                expected: "above 0 and at most 1",
                found: value,
            })
        }
    }

    /// The share as a number.
    #[must_use]
    pub fn get(self) -> f64 {
        self.0
    }
}
