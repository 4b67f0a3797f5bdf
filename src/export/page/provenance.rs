//! Where the page comes from, and what else is in the pack.

use maud::{Markup, html};

use super::Page;
use super::table::scrolling;

pub(super) fn section(page: &Page<'_>) -> Markup {
    let provenance = &page.lines.provenance;
    let inputs = html! {
        table {
            caption { "Input files with their SHA-256." }
            thead { tr { th scope="col" { "File" } th scope="col" { "SHA-256" } } }
            tbody {
                @for input in &provenance.inputs {
                    tr { th scope="row" { (input.name) } td { code { (input.sha256) } } }
                }
            }
        }
    };
    let files = html! {
        table {
            caption { "Files of the pack, in the same folder as this page; pack.json holds their SHA-256." }
            thead { tr { th scope="col" { "File" } th scope="col" { "What it is" } } }
            tbody {
                @for name in page.files {
                    tr { th scope="row" { a href=(name) { (name) } } td.words { (about(name)) } }
                }
            }
        }
    };
    html! {
        section #provenance aria-labelledby="provenance-head" {
            h2 #provenance-head { "Where this comes from" }
            p {
                "Made by fixability " (provenance.tool_version) " from the files below; seed " (provenance.seed) " ("
                (provenance.generator) "); schema fixability.brief, version " (provenance.schema_version)
                ". The same inputs and options give the same bytes."
            }
            (scrolling("Table of the input files", &inputs))
            (scrolling("Table of the files of the pack", &files))
        }
    }
}

/// What a file of the pack is, by its name.
fn about(name: &str) -> &'static str {
    match name {
        "pack.json" => "List of the files with SHA-256, figures of the verdict",
        "lines.json" => "Scores of the lines, complete",
        "lines.csv" => "One row for each segment of each line",
        "lines.png" => "Chart of the lines",
        "lines.geojson" => "Scored segments for a GIS",
        "recommended.gpx" => "The first-ranked line as a route",
        "profiles.png" => "Figures along each line",
        "area.json" => "Area map, complete",
        "area.csv" => "One row for each start cell",
        "area-worst.png" => "Area map, worst heading",
        "area-best.png" => "Area map, best heading",
        "area-share.png" => "Area map, share of headings within the requirement",
        "lookalikes.json" => "Look-alikes, complete",
        "lookalikes.csv" => "One row for each listed look-alike",
        "lookalikes.png" => "Map of the look-alikes",
        "lookalikes-panels.png" => "The worst look-alikes one by one",
        "lookalikes.geojson" => "Look-alikes for a GIS",
        "landmarks.geojson" => "Landmarks with their bounds for a GIS",
        "remap.json" => "Regions to map again, complete",
        "remap.csv" => "One row for each region",
        "remap.png" => "Map of the regions",
        "remap.geojson" => "Regions for a GIS or a survey crew",
        "suggest.json" => "Suggested dive points and headings, complete",
        "suggest.csv" => "One row for each suggestion",
        "suggest-lines.csv" => "Suggested lines as waypoints, which `lines` reads",
        "suggest.png" => "Map of the suggestions",
        "suggest.geojson" => "Suggestions for a GIS",
        "suggest.gpx" => "Suggestions as routes",
        "sensitivity.json" => "Sensitivity to each error bound, complete",
        "sensitivity.csv" => "One row for each error bound",
        "sensitivity.png" => "Bars of the sensitivity",
        _ if name.ends_with(".tif") => "Grid of the area map for a GIS",
        _ if name.starts_with("trace-") => "One simulated dive of a line, detection by detection",
        _ => "",
    }
}
