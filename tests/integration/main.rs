//! One file for each kind of evidence.

mod published_tubes;
