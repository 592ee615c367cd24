//! Long work in slices, so that a caller can show how far it is, stop it, and keep its own loop turning.

use serde::Serialize;

use crate::fault::Result;

/// How far a job is.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct Progress {
    /// What is being done, in words, such as "reading rows".
    pub what: &'static str,
    /// Share done, 0 to 1.
    pub done: f64,
}

/// Work that can be done in slices. To cancel it, do not ask again.
pub trait Job {
    /// What the job yields once done.
    type Output;

    /// Does about `budget` units of work (a unit is one interval, one row or about 30 bytes of a file, some tens of
    /// nanoseconds), and returns the output once there is nothing left to do. Must not be called again after that.
    fn advance(&mut self, budget: usize) -> Result<Option<Self::Output>>;

    /// How far the job is.
    fn progress(&self) -> Progress;
}

/// Runs a job to its end.
pub fn finish<J: Job>(mut job: J) -> Result<J::Output> {
    loop {
        if let Some(output) = job.advance(usize::MAX)? {
            return Ok(output);
        }
    }
}
