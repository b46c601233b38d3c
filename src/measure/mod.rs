//! Signals in, figures out. This layer knows neither circuits nor the renderer.

mod fourier_basis;
pub mod harmonics;
