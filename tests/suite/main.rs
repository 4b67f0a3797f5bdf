//! All integration tests in one binary.

mod export;
mod layers;
mod oracle;
mod render;
#[path = "support/reports.rs"]
mod reports;
mod soundness;
mod support;
