//! How a run tells whoever started it where it is.

/// Receives the stages of a run; the terminal shows them as a bar.
pub trait Progress: Sync {
    /// A stage begins that will take `steps` steps.
    fn stage(&self, name: &str, steps: u64);
    /// One step is done.
    fn step(&self);
}

/// Says nothing: for tests and for use as a library.
#[derive(Debug, Clone, Copy, Default)]
pub struct Silent;

impl Progress for Silent {
    fn stage(&self, _name: &str, _steps: u64) {}
    fn step(&self) {}
}
