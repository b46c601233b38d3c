//! Circuits of resistors, capacitors, inductors and driven nodes, with nonlinear devices hung on them.
//!
//! Three questions are answered here, none of which knows what a tube is: where the circuit rests
//! ([`direct`]), how it answers small signals ([`alternating`]), and how its linear parts step through
//! time once it is cut at its devices and rails ([`companion`]).

pub mod alternating;
pub mod companion;
pub mod direct;
mod netlist;

pub use netlist::{Device, Drive, GROUND, Netlist, Node, Part, PartKind, Slopes};
