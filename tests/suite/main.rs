//! All integration tests in one binary.

mod load;
mod projection;
