//! All integration tests in one binary.

mod export;
mod render;
#[path = "support/reports.rs"]
mod reports;
