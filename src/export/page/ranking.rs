//! The ranking of the lines.

use maud::{Markup, html};

use super::Page;
use super::table::{NONE, distance, estimated, guaranteed, metres, per_cent, scrolling, share};
use crate::report::LineReport;

pub(super) fn section(page: &Page<'_>) -> Markup {
    let report = page.lines;
    let required = report.parameters.required_fix_m;
    let mut lines: Vec<&LineReport> = report.lines.iter().collect();
    lines.sort_by_key(|line| line.rank);
    let table = html! {
        table {
            caption {
                "Lines in the order of the ranking. Distances in metres, shares in per cent, in brackets the 95 % confidence \
                 interval. “none” means that there is none before the line ends."
            }
            thead {
                tr {
                    th scope="col" rowspan="2" { "Rank" }
                    th scope="col" rowspan="2" { "Line" }
                    th.n scope="col" rowspan="2" { "Length m" }
                    th scope="colgroup" colspan="3" { "Of its length " (guaranteed()) }
                    th scope="colgroup" colspan="5" { "Of all runs " (estimated()) }
                }
                tr {
                    th.n scope="col" { "fix within " (required) " m, %" }
                    th.n scope="col" { "no fix, %" }
                    th.n scope="col" { "longest fix distance m" }
                    th.n scope="col" { "fix within " (required) " m, %" }
                    th.n scope="col" { "median fix m" }
                    th.n scope="col" { "95th percentile m" }
                    th.n scope="col" { "no fix, %" }
                    th.n scope="col" { "undecided, %" }
                }
            }
            tbody {
                @for line in lines {
                    tr {
                        td { (line.rank) }
                        th scope="row" { (line.name) }
                        td.n { (metres(Some(line.length_m))) }
                        @match line.guaranteed {
                            Some(sum) => {
                                td.n { (per_cent(sum.within_required_share)) }
                                td.n { (per_cent(sum.no_fix_share)) }
                                td.n { (metres(sum.longest_m)) }
                            }
                            None => { td.n { (NONE) } td.n { (NONE) } td.n { (NONE) } }
                        }
                        td.n { (share(line.estimated.within_required_share)) }
                        td.n { (distance(line.estimated.median_m)) }
                        td.n { (distance(line.estimated.p95_m)) }
                        td.n { (share(line.estimated.no_fix_share)) }
                        td.n { (per_cent(line.estimated.undecided_share)) }
                    }
                }
            }
        }
    };
    html! {
        section #ranking aria-labelledby="ranking-head" {
            h2 #ranking-head { "Which line fixes the vehicle soonest?" }
            (scrolling("Ranking of the lines", &table))
            @if let Some(terms) = &report.guarantee {
                p { (guaranteed()) " " (terms.statement) " Tracks: " (terms.offset_tracks) " (" (terms.offset_pattern) ")." }
            }
            p {
                (estimated()) " From " (report.parameters.draws)
                " simulated dives for each line, each lost at every segment start in turn; no statement about a single dive."
            }
        }
    }
}
