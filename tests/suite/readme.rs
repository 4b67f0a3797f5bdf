//! README.
