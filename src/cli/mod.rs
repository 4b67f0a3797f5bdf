//! The command line: arguments → dive → report → files and exit code.
//!
//! The only place that prints, reads the command line, sets the number of threads, or decides on an exit code.

mod area;
mod args;
mod lookalikes;
mod remap;
mod run;
mod sensitivity;
mod suggest;
mod terminal;

pub use run::{Exit, main_with};
