//! All integration tests in one binary.

mod demo;
mod intervals;
mod one_dimension;
mod support;
