//! All integration tests in one binary.

mod demo;
mod intervals;
mod support;
