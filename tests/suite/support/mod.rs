//! What several tests share.

pub mod demo;
pub mod exact;
