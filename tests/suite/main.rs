//! All integration tests in one binary.
#![allow(clippy::unwrap_used, reason = "a test that unwraps nothing fails, as it should")]
#![allow(clippy::disallowed_methods, reason = "oracles are written plainly; the ban is for the program")]

mod adversary;
mod alias;
mod area;
mod backward;
mod cli;
mod colours;
mod corridor;
mod craters;
mod demo;
mod determinism;
mod edge_cases;
mod export;
mod gis;
mod guarantee;
mod heavy;
mod hostile;
mod intervals;
mod labels;
mod layers;
mod load;
mod look_alike_chance;
#[path = "support/moved.rs"]
mod moved;
mod one_dimension;
mod oracle;
mod pack;
mod page;
mod plain_way;
mod projection;
mod readme;
mod remap;
mod render;
#[path = "support/reports.rs"]
mod reports;
#[path = "support/scanline.rs"]
mod scanline;
mod sensitivity;
mod sets;
mod silence;
mod slices;
mod soundness;
mod suggest;
mod support;
#[path = "support/template.rs"]
mod template;
mod tightness;
mod trees;
mod verdict;
