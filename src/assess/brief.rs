//! The verdict of the briefing: which line, how much of it, when to come up.
//!
//! *Which line.* The first of the ranking. When the ranking goes by an estimate and another line has a larger guaranteed
//! share, the verdict says so.
//!
//! *Abort distance.* Let D be the guaranteed fix distances of those segments of the line that have one within the required
//! distance, or of all that have one when none has it within. The abort distance is the largest of D. By the guarantee of
//! each segment a vehicle lost at the start of one of them has had a fix by then. So a vehicle that has had none was lost
//! elsewhere, or runs off the tracks that were computed, or a bound, a budget or the map does not hold; the figure cannot tell
//! which. A vehicle that does not know where it is cannot tell either whether it started on such a segment: the rule says when
//! waiting has lost its ground, not that waiting will pay.
//!
//! *Rounding.* A distance within which something is guaranteed is rounded up in words; a share is never rounded to 0 % or
//! 100 % that is not exactly that.

use crate::dive::RankBy;
use crate::report::{
    AbortDistance, Cause, Estimate, Finding, LineReport, LinesReport, SegmentReport, Verdict,
};

/// The verdict on scored lines.
pub fn verdict(report: &LinesReport) -> Verdict {
    let required_m = report.parameters.required_fix_m;
    let best = report.lines.iter().min_by_key(|line| line.rank);
    let within = best.map_or(0.0, guaranteed_share);
    let undecided = best.map_or(0.0, |line| share_of(line, is_undecided));
    let abort = best.and_then(|line| abort_distance(line, required_m));
    let finding = match (report.parameters.landmarks, within > 0.0, undecided > 0.0) {
        (0, ..) => Finding::NoLandmarks,
        (_, true, _) => Finding::Guaranteed,
        (_, false, true) => Finding::Undecided,
        (_, false, false) => Finding::NothingGuaranteed,
    };
    let lasting = best.map_or(0.0, |line| {
        share_of(line, |segment| {
            let lasting = segment.guaranteed.as_ref().and_then(|fix| fix.lasting_m);
            lasting.is_some_and(|lasting_m| lasting_m <= required_m)
        })
    });
    let larger = report.lines.iter().max_by(|a, b| {
        // Of equal shares the better ranked line.
        guaranteed_share(a).total_cmp(&guaranteed_share(b)).then(b.rank.cmp(&a.rank))
    });
    let larger = larger.filter(|line| guaranteed_share(line) > within);
    let facts = Facts { report, best, larger, within, lasting, undecided, abort, finding };
    Verdict {
        finding,
        line: best.map(|line| line.name.clone()),
        required_fix_m: required_m,
        guaranteed_within_required_share: within,
        guaranteed_lasting_within_required_share: lasting,
        undecided_share: undecided,
        abort,
        estimated_within_required_share: best.map(|line| line.estimated.within_required_share),
        larger_guaranteed_line: larger.map(|line| line.name.clone()),
        headline: facts.headline(),
        figure: if finding == Finding::Undecided { per_cent(undecided) } else { per_cent(within) },
        figure_means: facts.figure_means(),
        guaranteed: facts.guaranteed(),
        estimated: facts.estimated(),
        abort_headline: match abort {
            Some(abort) => format!("Abort distance: {} m.", metres_up(abort.distance_m)),
            None => "No abort distance can be given.".to_owned(),
        },
        abort_rule: facts.abort_rule(),
    }
}

fn guaranteed_share(line: &LineReport) -> f64 {
    line.guaranteed.map_or(0.0, |sum| sum.within_required_share)
}

fn is_undecided(segment: &SegmentReport) -> bool {
    segment.guaranteed.as_ref().is_some_and(|fix| fix.cause == Some(Cause::Undecided))
}

/// Share of a line's length in the segments that `is_counted` names.
fn share_of(line: &LineReport, is_counted: impl Fn(&SegmentReport) -> bool) -> f64 {
    let length = |segments: &mut dyn Iterator<Item = &SegmentReport>| -> f64 {
        segments.map(|segment| segment.end_m - segment.start_m).sum()
    };
    let all = length(&mut line.segments.iter());
    if all > 0.0 {
        length(&mut line.segments.iter().filter(|segment| is_counted(segment))) / all
    } else {
        0.0
    }
}

/// See the head of this file; none when no segment has a guaranteed fix.
fn abort_distance(line: &LineReport, required_m: f64) -> Option<AbortDistance> {
    let fix_m = |segment: &SegmentReport| segment.guaranteed.as_ref().and_then(|fix| fix.distance_m);
    let all = || line.segments.iter().filter_map(fix_m);
    let longest_guaranteed_m = all().max_by(f64::total_cmp)?;
    let longest_within = all().filter(|&fix_m| fix_m <= required_m).max_by(f64::total_cmp);
    Some(AbortDistance {
        distance_m: longest_within.unwrap_or(longest_guaranteed_m),
        within_required: longest_within.is_some(),
        share_of_line: share_of(line, |segment| {
            fix_m(segment).is_some_and(|fix_m| longest_within.is_none() || fix_m <= required_m)
        }),
        longest_guaranteed_m,
    })
}

/// What the words are made of.
struct Facts<'a> {
    report: &'a LinesReport,
    best: Option<&'a LineReport>,
    larger: Option<&'a LineReport>,
    within: f64,
    lasting: f64,
    undecided: f64,
    abort: Option<AbortDistance>,
    finding: Finding,
}

impl Facts<'_> {
    fn name(&self) -> &str {
        self.best.map_or("none", |line| line.name.as_str())
    }

    fn required(&self) -> String {
        plain(self.report.parameters.required_fix_m)
    }

    fn headline(&self) -> String {
        let (name, required) = (self.name(), self.required());
        match self.finding {
            Finding::NoLandmarks => {
                "There is no landmark on the map: a lost vehicle cannot find itself on any line.".to_owned()
            }
            Finding::Guaranteed => format!("Run line {name}."),
            Finding::Undecided => format!(
                "Undecided: the solver ran out of its cell budget on line {name}, and no fix within {required} m is \
                 guaranteed anywhere else on it."
            ),
            Finding::NothingGuaranteed if self.larger.is_some() => {
                format!(
                    "Line {name} ranks first, but no fix within {required} m is guaranteed anywhere on it."
                )
            }
            Finding::NothingGuaranteed => {
                format!("No line has a guaranteed fix within {required} m, from any place on it.")
            }
        }
    }

    fn figure_means(&self) -> String {
        let (name, required) = (self.name(), self.required());
        match self.finding {
            Finding::Undecided => {
                format!("of line {name} is undecided; it counts as ground without a guarantee")
            }
            Finding::NoLandmarks => "of any line has a guaranteed fix".to_owned(),
            _ => format!("of the length of line {name} has a guaranteed fix within {required} m"),
        }
    }

    fn guaranteed(&self) -> Vec<String> {
        let (name, required) = (self.name(), self.required());
        let mut sentences = Vec::new();
        if self.finding == Finding::NoLandmarks {
            sentences.push("Nothing is guaranteed without landmarks.".to_owned());
            return sentences;
        }
        if self.within > 0.0 {
            sentences.push(format!(
                "That holds whatever the errors within the stated bounds, on the tracks computed. From {} of the length of \
                 line {name} a fix within {required} m is also guaranteed to last to the end of the line; a first fix may \
                 be lost again further on.",
                per_cent(self.lasting),
            ));
        } else {
            sentences.push(format!("Nothing is guaranteed within {required} m on line {name}."));
        }
        if let Some(other) = self.larger {
            sentences.push(format!(
                "Line {} has the larger guaranteed share, {}; the ranking goes by another key ({}).",
                other.name,
                per_cent(guaranteed_share(other)),
                key_in_words(self.report.rank_by),
            ));
        }
        if self.undecided > 0.0 && self.finding != Finding::Undecided {
            sentences.push(format!(
                "On {} of the line the solver ran out of its cell budget; that counts as ground without a guarantee.",
                per_cent(self.undecided)
            ));
        }
        sentences
    }

    fn estimated(&self) -> Vec<String> {
        let Some(line) = self.best else { return Vec::new() };
        let fix = &line.estimated;
        let mut sentences = vec![format!(
            "{} dives along line {} were simulated, each lost at every segment start in turn: {} of these runs had a fix \
             within {} m (95 % confidence interval {}).",
            fix.dives,
            line.name,
            fix.within_required_share.value.map_or_else(|| "no counted share".to_owned(), per_cent),
            self.required(),
            interval(fix.within_required_share),
        )];
        if fix.wrong_fix_share > 0.0 || fix.contradiction_share > 0.0 {
            sentences.push(
                "In some runs more strays were drawn than the stray budget covers; these ended without a fix, or on a \
                 wrong place."
                    .to_owned(),
            );
        }
        sentences
    }

    fn abort_rule(&self) -> String {
        let name = self.name();
        let Some(abort) = self.abort else {
            return match self.finding {
                Finding::NoLandmarks => "There will be no fix.".to_owned(),
                _ => format!(
                    "No segment of line {name} has a guaranteed fix, so a run without one proves nothing at any distance."
                ),
            };
        };
        let distance = metres_up(abort.distance_m);
        let within = if abort.within_required {
            String::new()
        } else {
            format!(" None of them is within the required {} m.", self.required())
        };
        let rest = if abort.longest_guaranteed_m > abort.distance_m {
            format!(
                " After {} m no segment of the line has a guarantee left.",
                metres_up(abort.longest_guaranteed_m)
            )
        } else {
            String::new()
        };
        format!(
            "A vehicle lost at the start of one of the segments with such a guarantee ({} of the length of line {name}) has \
             had its fix after {distance} m at the latest.{within} No fix by then means that it was lost \
             elsewhere, or is off the tracks that were computed, or a bound or the map does not hold: come up, as the vehicle's \
             safety case lays down.{rest}",
            per_cent(abort.share_of_line),
        )
    }
}

/// What a ranking goes by.
fn key_in_words(key: RankBy) -> &'static str {
    match key {
        RankBy::Guaranteed => "guaranteed share",
        RankBy::Share => "share of simulated runs with a fix within the required distance",
        RankBy::P95 => "95th percentile of the fix distance",
        RankBy::Median => "median fix distance",
        RankBy::NoFix => "share of runs without a fix",
    }
}

fn interval(estimate: Estimate) -> String {
    match (estimate.low, estimate.high) {
        (Some(low), Some(high)) => format!("{} to {}", per_cent(low), per_cent(high)),
        _ => "not known".to_owned(),
    }
}

/// A share in per cent with one decimal; 0 and 100 only when exact.
fn per_cent(share: f64) -> String {
    let tenths = (share * 1000.0).round();
    if share <= 0.0 {
        "0 %".to_owned()
    } else if share >= 1.0 {
        "100 %".to_owned()
    } else if tenths < 1.0 {
        "less than 0.1 %".to_owned()
    } else if tenths > 999.0 {
        "more than 99.9 %".to_owned()
    } else {
        format!("{:.1} %", tenths / 10.0)
    }
}

/// Whole metres, rounded up: what holds within a distance holds within a longer one.
fn metres_up(distance_m: f64) -> String {
    format!("{:.0}", distance_m.ceil())
}

/// A number as the user wrote it.
fn plain(value: f64) -> String {
    format!("{value}")
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn shares_are_never_rounded_to_all_or_nothing() {
        for (share, text) in [
            (0.0, "0 %"),
            (1e-6, "less than 0.1 %"),
            (0.5357, "53.6 %"),
            (0.9996, "more than 99.9 %"),
            (0.999, "99.9 %"),
            (1.0, "100 %"),
        ] {
            assert_eq!(per_cent(share), text);
        }
    }

    #[test]
    fn guaranteed_distances_are_rounded_up() {
        assert_eq!(metres_up(412.0), "412");
        assert_eq!(metres_up(412.01), "413");
    }
}
