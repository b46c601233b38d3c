//! Hear and measure a small single-ended tube guitar amplifier while it is still on paper.
//!
//! Data takes one way, and imports point down it only:
//!
//! ```text
//! text -> design -> solved stages -> rendered sound -> measured figures -> report
//! ```
//!
//! | layer | modules | what |
//! | --- | --- | --- |
//! | 0 | [`units`], [`numeric`], [`diagnostic`] | quantities people write; numerics; codes, places, hints |
//! | 1 | [`signal`], [`resample`] | test signals; rates and oversampling |
//! | 2 | [`design`], [`tube`], [`circuit`], [`measure`], [`wav`] | the file's words; tube laws; linear networks; figures; sound files |
//! | 3 | [`stage`] | a design and a catalog become a solved amplifier |
//! | 4 | [`render`] | the sample loop |
//! | 5 | [`trial`] | an amplifier under test tones |
//! | 6 | [`study`] | a design at its gain settings |
//! | 7 | [`report`] | results in, bytes out |
//!
//! The library opens no files, prints nothing and never exits; the `forehear` program does.
//! The interface is unstable before version 1.0.

pub mod circuit;
pub mod design;
pub mod diagnostic;
pub mod measure;
pub mod numeric;
pub mod render;
pub mod report;
pub mod resample;
pub mod signal;
pub mod stage;
pub mod study;
pub mod trial;
pub mod tube;
pub mod units;
pub mod wav;
