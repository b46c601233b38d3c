//! Results in, bytes and text out: terminal, JSON, CSV, SVG. Opens no files and prints nothing.
//!
//! | module | what |
//! | --- | --- |
//! | [`json`] | one document for each command, in structs of its own, so that a result may change without changing them |
//! | [`csv`] | levels and curves as tables for other programs |
//! | [`svg`] | pictures |
//! | [`terminal`] | what a builder reads first |
//! | [`diagnostics`] | faults shown in the text that holds them |
//! | [`safety`] | the cautions, in one place |

pub mod csv;
pub mod diagnostics;
pub mod json;
pub mod listing;
mod on_curve;
mod phrase;
pub mod safety;
#[cfg(test)]
mod sample;
pub mod svg;
pub mod terminal;
mod tube_words;
