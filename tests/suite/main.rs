//! All integration tests in one binary.

mod cli;
mod craters;
mod demo;
mod determinism;
mod export;
mod guarantee;
mod intervals;
mod layers;
mod load;
mod one_dimension;
mod oracle;
mod projection;
mod readme;
mod render;
#[path = "support/reports.rs"]
mod reports;
mod soundness;
mod support;
