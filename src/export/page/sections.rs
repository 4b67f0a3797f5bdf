//! Sections that are mostly pictures or words.

use maud::{Markup, html};

use super::Page;
use super::charts::chart;
use super::table::{estimated, guaranteed};

pub(super) fn charts(page: &Page<'_>) -> Markup {
    let required = page.lines.parameters.required_fix_m;
    let headings = page.area.headings_deg.len();
    html! {
        section #charts aria-labelledby="charts-head" {
            div.plates {
            h2 #charts-head { "Where along the lines, and where on the seabed?" }
            (chart(
                page,
                "lines.png",
                "Map of the candidate lines over the landmarks. Each segment is coloured by the fix distance of a vehicle lost \
                 at its start; hatched segments have none. The figures are in the ranking above and in lines.csv.",
                &html! {
                    "Each segment by its fix distance; the ranking beside the map tells " (guaranteed()) " from " (estimated())
                    ". Brackets with numbers mark look-alike ground, with r and a number ground to map again."
                },
            ))
            (chart(
                page,
                "profiles.png",
                "For each line, the fix distance and the number of places against the distance along it.",
                &html! { "Along each line: fix distance " (guaranteed()) " and " (estimated()) ", number of places " (estimated()) "." },
            ))
            (chart(
                page,
                "area-best.png",
                "Map of the search area. Each start cell is coloured by the guaranteed fix distance on its best heading, with \
                 arrows along that heading. The figures are in area.csv.",
                &html! { "Best of " (headings) " headings from each start cell " (guaranteed()) "." },
            ))
            (chart(
                page,
                "area-worst.png",
                "Map of the search area. Each start cell is coloured by the guaranteed fix distance on its worst heading; cells \
                 where some heading has none are hatched.",
                &html! { "Worst heading from each start cell " (guaranteed()) "." },
            ))
            (chart(
                page,
                "area-share.png",
                "Map of the search area. Each start cell is coloured by the share of headings with a guaranteed fix within the \
                 required distance.",
                &html! { "Share of headings with a fix within " (required) " m " (guaranteed()) "." },
            ))
            }
            p { (guaranteed()) " " (crate::report::AREA_STATEMENT) }
        }
    }
}

pub(super) fn cautions(page: &Page<'_>) -> Markup {
    html! {
        section #cautions aria-labelledby="cautions-head" {
            h2 #cautions-head { "Cautions" }
            p.caution { (page.lines.provenance.caution) }
            ul {
                li { "The figures are for the planned tracks and the starts computed. A vehicle that leaves them sees other landmarks." }
                li { "A fix is a position on this map. A shift of the whole map cannot be seen from relative positions." }
                li { "A first fix may be lost again further along the line; “lasting” figures are in lines.csv." }
                li { "The vehicle finds out that it has a fix only if it solves its detections with these bounds." }
                li { "Contact positions may be sensitive: the charts and stepped dives of this page show them." }
            }
        }
    }
}
