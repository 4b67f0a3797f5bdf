//! `index.html`: one page that holds the whole briefing and asks for nothing from outside.
//!
//! *Offline.* Pictures are in the page; the policy in its head forbids every request, and allows the page's own style and
//! script by their fingerprints.
//!
//! *Text of users.* Names of dives, lines, landmarks and files reach the page through the template, which escapes them, or
//! through [`data::script_json`], which does so for JSON.
//!
//! *Without a script, and on paper* the stepped dives are rows of small frames, drawn here.

mod assumptions;
mod charts;
mod data;
mod findings;
mod frames;
mod planning;
mod provenance;
mod ranking;
mod sections;
mod table;
mod verdict;

use base64::Engine as _;
use base64::engine::general_purpose::STANDARD;
use maud::{DOCTYPE, Markup, PreEscaped, html};
use sha2::{Digest, Sha256};

use crate::report::{
    AreaReport, LinesReport, LookAlikesReport, RemapReport, SensitivityReport, SuggestReport, TraceReport,
    Verdict,
};

const STYLE: &str = include_str!("style.css");
const SCRIPT: &str = include_str!("script.js");

/// Everything that the page shows.
#[derive(Clone, Copy, Debug)]
pub struct Page<'a> {
    /// What comes first.
    pub verdict: &'a Verdict,
    /// The scored lines.
    pub lines: &'a LinesReport,
    /// The area map.
    pub area: &'a AreaReport,
    /// The look-alikes.
    pub look_alikes: &'a LookAlikesReport,
    /// The regions to map again.
    pub remap: &'a RemapReport,
    /// The suggested dive points.
    pub suggest: &'a SuggestReport,
    /// What better bounds would bring.
    pub sensitivity: &'a SensitivityReport,
    /// One dive for each line, in the order of the file.
    pub traces: &'a [TraceReport],
    /// Pictures by the names of their files.
    pub charts: &'a [(String, Vec<u8>)],
    /// Names of the other files of the pack.
    pub files: &'a [String],
}

/// The page's bytes.
pub fn page_html(page: &Page<'_>) -> Vec<u8> {
    let mut text = document(page).into_string();
    text.push('\n');
    text.into_bytes()
}

fn document(page: &Page<'_>) -> Markup {
    let provenance = &page.lines.provenance;
    html! {
        (DOCTYPE)
        html lang="en" {
            head {
                meta charset="utf-8";
                meta http-equiv="Content-Security-Policy" content=(policy());
                meta name="viewport" content="width=device-width, initial-scale=1";
                meta name="generator" content={ "fixability " (provenance.tool_version) };
                title { "Briefing: " (provenance.dive) }
                style { (PreEscaped(STYLE)) }
            }
            body {
                a.skip href="#verdict" { "To the verdict" }
                header {
                    p.over { "Briefing before the dive" }
                    h1 { (provenance.dive) }
                    p.under { (dates(page)) }
                    p.caution { (provenance.caution) }
                }
                main {
                    (verdict::section(page))
                    (ranking::section(page))
                    (sections::charts(page))
                    (frames::section(page))
                    (findings::look_alikes(page))
                    (findings::remap(page))
                    (planning::suggest(page))
                    (planning::sensitivity(page))
                    (assumptions::section(page))
                    (sections::cautions(page))
                    (provenance::section(page))
                }
                script type="application/json" id="dives" { (PreEscaped(data::script_json(&data::dives(page)))) }
                script { (PreEscaped(SCRIPT)) }
            }
        }
    }
}

/// When issued, and how old the map is; what is not stated is said to be so.
fn dates(page: &Page<'_>) -> String {
    let provenance = &page.lines.provenance;
    let issued = match &provenance.issued {
        Some(date) => format!("Issued {date}"),
        None => "Date of issue not stated".to_owned(),
    };
    let surveyed = match (&provenance.surveyed, provenance.map_age_days) {
        (Some(date), Some(days)) => format!("map surveyed {date}, {days} days before"),
        (Some(date), None) => format!("map surveyed {date}"),
        (None, _) => "age of the map not stated".to_owned(),
    };
    format!("{issued}; {surveyed}; {}; seed {}", provenance.coordinate_system, provenance.seed)
}

/// Nothing may be fetched; the page's own style and script are known by their fingerprints.
fn policy() -> String {
    let fingerprint = |text: &str| STANDARD.encode(Sha256::digest(text.as_bytes()));
    format!(
        "default-src 'none'; img-src data:; style-src 'sha256-{}'; script-src 'sha256-{}'; base-uri 'none'; form-action 'none'",
        fingerprint(STYLE),
        fingerprint(SCRIPT)
    )
}
