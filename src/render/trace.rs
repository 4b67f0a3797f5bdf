//! stub
use super::scene::Scene;
use super::{ChartSize, RenderError};
use crate::report::TraceReport;
pub(super) fn scene(_: &TraceReport, _: &ChartSize) -> Result<Scene, RenderError> {
    todo!()
}
