//! All integration tests in one binary.

mod export;
mod oracle;
mod render;
#[path = "support/reports.rs"]
mod reports;
mod soundness;
mod support;
