//! Tube laws, ratings, catalog.

mod catalog;
mod device;
mod entry;
mod file;
#[cfg(test)]
mod file_tests;
mod grid;
mod pentode;
mod reader;
mod softplus;
#[cfg(test)]
mod tests;
mod triode;

pub use catalog::Catalog;
pub use device::{Currents, Device};
pub use entry::{
    Capacitances, Confidence, FittedRange, Law, Origin, Provenance, Ratings, Span, Tube, TubeKind,
};
pub use file::read_tube;
pub use grid::{GridCurrent, GridLaw, GridParameters};
pub use pentode::{PentodeLaw, PentodeParameters, SecondSection};
pub use triode::{TriodeLaw, TriodeParameters};
