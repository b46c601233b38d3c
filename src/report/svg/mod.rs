//! Pictures, drawn by hand as SVG: 900 by 560 units (higher with rows of panels), on a light ground of their own, readable on light and dark pages.

mod axis;
mod canvas;
mod distortion;
mod harmonics;
mod plate;
mod plot;
mod response;
mod style;
mod transfer;

pub use distortion::distortion_svg;
pub use harmonics::harmonics_svg;
pub use plate::plate_svg;
pub use response::response_svg;
pub use transfer::transfer_svg;

/// Width of every picture, in its own units.
const WIDTH: f64 = 900.0;
/// Height of a picture with one row of panels.
const HEIGHT: f64 = 560.0;

#[cfg(test)]
mod tests;
