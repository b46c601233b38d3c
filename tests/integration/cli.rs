//! The program as run: exit codes, files made, what it says and where.

mod broken;
mod lists;
mod place;
mod render;
mod sets;
mod signals;
