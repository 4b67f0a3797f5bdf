//! The command `fixability`.

use std::process::ExitCode;

fn main() -> ExitCode {
    ExitCode::from(fixability::cli::main_with(std::env::args_os()) as u8)
}
