//! All integration tests in one binary.

mod oracle;
mod soundness;
mod support;
