//! One file for each kind of evidence.
