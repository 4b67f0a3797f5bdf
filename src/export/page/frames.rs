//! The stepped dives: one control for each line, and a row of small frames for paper and where no script runs.

use maud::{Markup, html};

use super::Page;
use super::data::{Dive, Event, Ground, dives};
use super::table::count;
use crate::dive::ErrorShape;
use crate::report::TraceReport;

/// Most small frames of one dive.
const FRAMES: usize = 5;

pub(super) fn section(page: &Page<'_>) -> Markup {
    let Some(ground) = Ground::of(page) else { return html! {} };
    let stepped = dives(page);
    let landmarks = page.traces.first().map_or(&[][..], |trace| &trace.landmarks);
    html! {
        section #dives-section aria-labelledby="dives-head" {
            h2 #dives-head { "How one dive on each line finds itself" }
            p {
                "One simulated dive for each line, an example and no guarantee. Tinted: every position that explains what was \
                 seen so far. Cross: the true position, known to the simulator only. Thin: the planned track. Grey: landmarks. \
                 The frame is " (kilometres(ground.width)) " wide and " (kilometres(ground.height)) " high, grid north up."
            }
            svg.defs width="0" height="0" aria-hidden="true" focusable="false" {
                defs { path #landmarks d=(ground.boxes(landmarks)) {} }
            }
            @for (index, (trace, dive)) in page.traces.iter().zip(stepped.list()).enumerate() {
                (one(&ground, index, trace, dive))
            }
        }
    }
}

fn one(ground: &Ground, index: usize, trace: &TraceReport, dive: &Dive) -> Markup {
    let id = format!("dive-{index}");
    let last = dive.events.len().saturating_sub(1);
    html! {
        article.dive data-dive=(index) aria-labelledby={ (id) "-head" } {
            h3 id={ (id) "-head" } { "Line " (trace.line) }
            p { (summary(trace)) }
            @if let Some(first) = dive.events.first() {
                div.stepper {
                    p.controls {
                        label for={ (id) "-range" } { "Detection on line " (trace.line) }
                        input id={ (id) "-range" } type="range" min="0" max=(last) step="1" value="0"
                            aria-valuetext=(first.short);
                        button.back type="button" { "Back" span.aside { " to the detection before on line " (trace.line) } }
                        button.on type="button" { "On" span.aside { " to the next detection on line " (trace.line) } }
                    }
                    p.live role="status" aria-live="polite" { (first.text) }
                    div.pair {
                        figure {
                            (empty_picture(ground, trace, first, &view(ground), "whole"))
                            figcaption { "The whole search area" }
                        }
                        figure {
                            (empty_picture(ground, trace, first, &close_view(ground, first), "close"))
                            figcaption { "Close-up about the true position, " (ground.close / 10) " m wide" }
                        }
                    }
                }
                ol.frames {
                    @for event in chosen(trace).iter().filter_map(|&number| dive.events.get(number)) {
                        li { figure {
                            (picture(ground, trace, event, &view(ground), "whole"))
                            figcaption { (event.text) }
                        } }
                    }
                }
            } @else {
                p { "Nothing was detected on this dive." }
            }
        }
    }
}

/// What the dive shows in one sentence.
fn summary(trace: &TraceReport) -> String {
    let shape = match trace.error_shape {
        ErrorShape::Uniform => "errors uniform within their bounds",
        ErrorShape::Corners => "errors at the ends of their bounds",
        ErrorShape::Steady => "errors steady at the ends of their bounds",
    };
    let end = match (&trace.contradiction, trace.undecided, trace.fix_distance_m) {
        (Some(contradiction), ..) => format!(
            "no position explains the detections from detection {} on: more strays were drawn than the budget covers",
            contradiction.event
        ),
        (None, true, _) => "undecided: the solver ran out of its cell budget".to_owned(),
        (None, false, None) => "no fix before the line ends".to_owned(),
        (None, false, Some(fix_m)) => {
            let lasting = match trace.lasting_fix_distance_m {
                Some(lasting_m) if lasting_m > fix_m => {
                    format!(", lost again, lasting from {lasting_m:.0} m on")
                }
                Some(_) => ", lasting to the end of the line".to_owned(),
                None => ", lost again before the end of the line".to_owned(),
            };
            format!("fix after {fix_m:.0} m{lasting}")
        }
    };
    format!(
        "Lost at {:.0} m, draw {}, {shape}, {}: {end}.",
        trace.from_m,
        trace.draw,
        count(trace.events.len(), "detection", "detections")
    )
}

/// Events for the small frames: the first, the first fix, the last, the loss of a fix; then the next ones from the start.
fn chosen(trace: &TraceReport) -> Vec<usize> {
    let events = &trace.events;
    let fix = events.iter().position(|event| event.is_fix);
    let lost = events.windows(2).position(|pair| pair[0].is_fix && !pair[1].is_fix).map(|before| before + 1);
    let mut chosen: Vec<usize> = Vec::new();
    let wanted = [Some(0), fix, events.len().checked_sub(1), lost, Some(1), Some(2)].into_iter().flatten();
    for index in wanted.filter(|&index| index < events.len()) {
        if chosen.len() < FRAMES && !chosen.contains(&index) {
            chosen.push(index);
        }
    }
    chosen.sort_unstable();
    chosen
}

fn view(ground: &Ground) -> String {
    format!("0 0 {} {}", ground.width, ground.height)
}

fn close_view(ground: &Ground, event: &Event) -> String {
    let (x, y) = event.truth;
    format!("{} {} {} {}", x - ground.close / 2, y - ground.close / 2, ground.close, ground.close)
}

/// A picture that the script fills; it is not shown without one, and cells that stand in the data need not stand here.
fn empty_picture(ground: &Ground, trace: &TraceReport, event: &Event, view: &str, kind: &str) -> Markup {
    let event = Event {
        cells: String::new(),
        marks: String::new(),
        text: String::new(),
        short: event.short.clone(),
        ..*event
    };
    picture(ground, trace, &event, view, kind)
}

/// One picture of one event. Elements of SVG need their end tags: left open, one would hold the next.
fn picture(ground: &Ground, trace: &TraceReport, event: &Event, view: &str, kind: &str) -> Markup {
    let is_whole = kind == "whole";
    let arm = if is_whole { ground.width } else { ground.close } / 40;
    html! {
        svg class={ "map " (kind) } viewBox=(view) role="img" aria-label={ "Line " (trace.line) ": " (event.short) } {
            path.area d={ (ground.line(&trace.search_area)) "z" } {}
            use href="#landmarks" class="landmarks" {}
            path.cells d=(event.cells) {}
            @if is_whole {
                path.marks d=(event.marks) {}
                path.marks-in d=(event.marks) {}
            }
            path.track d=(ground.line(&trace.path)) {}
            path.cross d=(cross(event.truth, arm)) {}
        }
    }
}

/// A cross that leaves its middle open. The script draws the same.
fn cross((x, y): (i64, i64), arm: i64) -> String {
    let (gap, length) = (arm / 3, arm - arm / 3);
    format!(
        "M{} {y}h{length}M{} {y}h{length}M{x} {}v{length}M{x} {}v{length}",
        x - arm,
        x + gap,
        y - arm,
        y + gap
    )
}

fn kilometres(decimetres: i64) -> String {
    format!("{:.1} km", decimetres as f64 / 1e4)
}
