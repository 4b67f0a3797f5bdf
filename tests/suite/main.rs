//! All integration tests in one binary.

mod demo;
mod export;
mod guarantee;
mod intervals;
mod layers;
mod load;
mod one_dimension;
mod oracle;
mod projection;
mod render;
#[path = "support/reports.rs"]
mod reports;
mod sets;
mod soundness;
mod support;
