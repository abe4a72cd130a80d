//! How long work reports on itself and is told to stop; the library never prints.

/// A look over the shoulder of a running computation.
pub trait Watch: Sync {
    /// A stage of `steps` steps begins.
    fn begin(&self, stage: &str, steps: usize);

    /// Some steps of the stage are done.
    fn advance(&self, steps: usize);

    /// The stage is over.
    fn end(&self);

    /// Whether to stop as soon as possible.
    fn interrupted(&self) -> bool;
}

/// Nobody watches.
#[derive(Debug, Clone, Copy, Default)]
pub struct Unwatched;

impl Watch for Unwatched {
    fn begin(&self, _stage: &str, _steps: usize) {}
    fn advance(&self, _steps: usize) {}
    fn end(&self) {}
    fn interrupted(&self) -> bool {
        false
    }
}

/// The computation was told to stop.
#[derive(Debug, Clone, Copy, PartialEq, Eq, thiserror::Error)]
#[error("interrupted")]
pub struct Interrupted;
