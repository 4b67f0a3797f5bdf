//! All integration tests in one binary.

mod soundness;
mod support;
