//! Sound files: bytes to recordings, and back.
//!
//! [`read`] takes every uncompressed WAV that a workstation writes and names what is wrong with the rest; [`write`](write())
//! encodes 16-bit, 24-bit and float files. Neither opens a file.

mod decode;
mod fault;
mod format;
mod read;
mod walk;
mod write;

pub use fault::WavFault;
pub use read::{Recording, read};
pub use write::{Encoding, WriteFault, Written, bytes_needed, write};
