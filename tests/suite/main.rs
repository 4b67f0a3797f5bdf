//! All integration tests in one binary.

mod demo;
mod export;
mod intervals;
mod layers;
mod one_dimension;
mod oracle;
mod render;
#[path = "support/reports.rs"]
mod reports;
mod sets;
mod soundness;
mod support;
