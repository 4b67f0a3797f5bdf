//! All integration tests in one binary.

mod intervals;
mod support;
