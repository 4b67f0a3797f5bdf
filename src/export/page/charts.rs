//! Pictures in the page.

use base64::Engine as _;
use base64::engine::general_purpose::STANDARD;
use maud::{Markup, html};

use super::Page;

/// A picture of the pack by the name of its file, across the page; nothing where the pack has none of this name. On a
/// narrow screen it keeps a width at which it can be read, and scrolls.
pub(super) fn chart(page: &Page<'_>, name: &str, alt: &str, caption: &Markup) -> Markup {
    let Some((_, png)) = page.charts.iter().find(|(chart, _)| chart == name) else { return html! {} };
    let size = size_px(png);
    html! {
        figure.chart {
            div.scroll tabindex="0" role="region" aria-label={ "Chart " (name) } {
                img src={ "data:image/png;base64," (STANDARD.encode(png)) } alt=(alt)
                    width=[size.map(|(width, _)| width)] height=[size.map(|(_, height)| height)];
            }
            figcaption { (caption) " File: " a href=(name) { (name) } "." }
        }
    }
}

/// Width and height of a PNG picture, from its head.
fn size_px(png: &[u8]) -> Option<(u32, u32)> {
    let number = |at: usize| png.get(at..at + 4)?.try_into().ok().map(u32::from_be_bytes);
    Some((number(16)?, number(20)?))
}
