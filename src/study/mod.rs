//! A design at its gain settings.

pub mod bias;
pub mod curve;
mod play;
pub mod render;
pub mod result;
mod warnings;

use std::sync::atomic::{AtomicBool, Ordering};

use crate::circuit::direct::NotSettled;
use crate::render::ModelFault;
use crate::resample::ResampleFault;

/// Base rate of every figure, in hertz; figures are taken at this times the oversampling.
pub const BASE_RATE_HZ: f64 = 48e3;

/// Why a study came to no result.
#[derive(Debug, thiserror::Error)]
pub enum StudyFault {
    #[error(transparent)]
    NotSettled(#[from] NotSettled),
    #[error(transparent)]
    Model(#[from] ModelFault),
    #[error(transparent)]
    Resample(#[from] ResampleFault),
    #[error("interrupted")]
    Interrupted,
}

/// Long work under way: how far it is, and whether it should stop.
pub struct Watch<'a> {
    /// Called with the share done, 0 to 1, and what is being done; from any thread.
    pub progress: &'a (dyn Fn(f64, &str) + Sync),
    pub stop: &'a AtomicBool,
}

impl Watch<'_> {
    /// # Errors
    /// [`StudyFault::Interrupted`] once the stop flag is set.
    pub fn check(&self) -> Result<(), StudyFault> {
        if self.stop.load(Ordering::Relaxed) {
            Err(StudyFault::Interrupted)
        } else {
            Ok(())
        }
    }
}
