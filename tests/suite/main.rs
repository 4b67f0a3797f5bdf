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
#[path = "support/scanline.rs"]
mod scanline;
mod soundness;
mod support;
#[path = "support/template.rs"]
mod template;
mod tightness;
