//! The verdict of the briefing on invented scores, each with its answer worked out by hand.

use fixability::assess::verdict;
use fixability::dive::RankBy;
use fixability::report::{Cause, Finding, GuaranteedFix, GuaranteedLine, LineReport, LinesReport};

use crate::reports::{at, estimated, four_lines, line, report};

/// A straight line of 50 m segments with these guaranteed fix distances: a number, or why there is none.
fn scored(name: &str, rank: usize, fixes: &[Result<f64, Cause>], required_m: f64) -> LineReport {
    let end = at(50.0 * fixes.len() as f64, 0.0);
    let mut line = line(name, rank, &[at(0.0, 0.0), end], |_, _| estimated(Some(300.0), 0.0));
    assert_eq!(line.segments.len(), fixes.len());
    for (segment, fix) in line.segments.iter_mut().zip(fixes) {
        segment.guaranteed = Some(GuaranteedFix {
            distance_m: fix.ok(),
            lasting_m: None,
            certain_detections: 5,
            cause: fix.err(),
            reason: None,
        });
    }
    let share = |count: usize| count as f64 / fixes.len() as f64;
    line.guaranteed = Some(GuaranteedLine {
        within_required_share: share(fixes.iter().filter(|fix| fix.is_ok_and(|m| m <= required_m)).count()),
        no_fix_share: share(fixes.iter().filter(|fix| fix.is_err()).count()),
        longest_m: fixes.iter().filter_map(|fix| fix.ok()).max_by(f64::total_cmp),
    });
    line
}

/// Lines scored against the 450 m of the invented dive, over its landmarks.
fn scores(lines: &[(&str, &[Result<f64, Cause>])]) -> LinesReport {
    let lines =
        lines.iter().enumerate().map(|(i, (name, fixes))| scored(name, i + 1, fixes, 450.0)).collect();
    let mut report = report(lines, four_lines().landmarks);
    report.rank_by = RankBy::Guaranteed;
    report
}

const NO: Result<f64, Cause> = Err(Cause::LookAlikes);

#[test]
fn the_abort_distance_is_the_longest_within_the_requirement() {
    let found = verdict(&scores(&[("A", &[Ok(100.0), Ok(412.3), Ok(450.1), NO]), ("B", &[NO, NO])]));
    assert_eq!(found.finding, Finding::Guaranteed);
    assert_eq!(found.line.as_deref(), Some("A"));
    let abort = found.abort.expect("there is one");
    assert_eq!((abort.distance_m, abort.longest_guaranteed_m), (412.3, 450.1));
    assert!(abort.within_required);
    assert!((abort.share_of_line - 0.5).abs() < 1e-12);
    assert_eq!(found.headline, "Run line A.");
    assert_eq!(found.figure, "50.0 %");
    assert_eq!(found.abort_headline, "Abort distance: 413 m.");
    // Both distances rounded up: what holds within 412.3 m need not hold within 412.
    for part in ["50.0 % of the length of line A", "after 413 m at the latest", "After 451 m no segment"] {
        assert!(found.abort_rule.contains(part), "{part}: {}", found.abort_rule);
    }
}

/// By the rule, no segment of those counted has a longer guaranteed distance, and one has exactly it.
#[test]
fn no_counted_segment_fixes_later_than_the_abort_distance() {
    for seed in 1..200u64 {
        let fixes: Vec<Result<f64, Cause>> = (0..12)
            .map(|i| match (seed * 7919 + i * 104_729) % 11 {
                0..3 => NO,
                k => Ok(60.0 * k as f64 + (seed % 7) as f64 * 40.0),
            })
            .collect();
        let report = scores(&[("A", &fixes)]);
        let Some(abort) = verdict(&report).abort else {
            assert!(fixes.iter().all(Result::is_err));
            continue;
        };
        let all: Vec<f64> = fixes.iter().filter_map(|fix| fix.ok()).collect();
        let counted: Vec<f64> =
            all.iter().copied().filter(|&m| !abort.within_required || m <= 450.0).collect();
        assert_eq!(abort.within_required, all.iter().any(|&m| m <= 450.0));
        assert!(counted.iter().all(|&m| m <= abort.distance_m) && counted.contains(&abort.distance_m));
        assert!((abort.share_of_line - counted.len() as f64 / 12.0).abs() < 1e-12);
    }
}

#[test]
fn fixes_beyond_the_requirement_only() {
    let found = verdict(&scores(&[("A", &[Ok(600.0), Ok(900.0), NO, NO])]));
    assert_eq!(found.finding, Finding::NothingGuaranteed);
    assert_eq!(found.headline, "No line has a guaranteed fix within 450 m, from any place on it.");
    assert_eq!(found.figure, "0 %");
    let abort = found.abort.expect("there is one");
    assert!(!abort.within_required && abort.distance_m == 900.0);
    assert!(found.abort_rule.contains("None of them is within the required 450 m"), "{}", found.abort_rule);
}

#[test]
fn nothing_guaranteed_gives_no_abort_distance() {
    let found = verdict(&scores(&[("A", &[NO, NO])]));
    assert_eq!((found.finding, found.abort), (Finding::NothingGuaranteed, None));
    assert_eq!(found.abort_headline, "No abort distance can be given.");
    assert!(found.abort_rule.contains("proves nothing"), "{}", found.abort_rule);
    assert!(found.guaranteed[0].contains("Nothing is guaranteed within 450 m"), "{:?}", found.guaranteed);
}

#[test]
fn an_undecided_line_is_called_so_and_counts_as_nothing() {
    let found = verdict(&scores(&[("A", &[Err(Cause::Undecided), NO, NO, NO])]));
    assert_eq!(found.finding, Finding::Undecided);
    assert_eq!((found.undecided_share, found.guaranteed_within_required_share), (0.25, 0.0));
    assert!(found.headline.starts_with("Undecided:"), "{}", found.headline);
    assert_eq!(found.figure, "25.0 %");
    // With a guarantee elsewhere it is an answer with a reservation.
    let found = verdict(&scores(&[("A", &[Err(Cause::Undecided), Ok(200.0)])]));
    assert_eq!(found.finding, Finding::Guaranteed);
    assert!(found.guaranteed.iter().any(|sentence| sentence.contains("ran out of its cell budget")));
}

#[test]
fn another_line_with_more_guaranteed_is_named() {
    let mut report = scores(&[("A", &[NO, NO]), ("B", &[Ok(200.0), NO])]);
    report.rank_by = RankBy::Median;
    let found = verdict(&report);
    assert_eq!(found.finding, Finding::NothingGuaranteed);
    assert_eq!(found.larger_guaranteed_line.as_deref(), Some("B"));
    assert!(found.headline.contains("Line A ranks first, but"), "{}", found.headline);
    assert!(
        found
            .guaranteed
            .iter()
            .any(|sentence| sentence.contains("Line B has the larger guaranteed share, 50.0 %"))
    );
}

#[test]
fn without_landmarks_there_is_no_fix() {
    let mut report = scores(&[("A", &[Err(Cause::TooFewLandmarks); 3])]);
    report.parameters.landmarks = 0;
    let found = verdict(&report);
    assert_eq!((found.finding, found.abort), (Finding::NoLandmarks, None));
    assert!(found.headline.contains("no landmark on the map"), "{}", found.headline);
    report.lines.clear();
    assert_eq!(verdict(&report).line, None);
}

/// Guaranteed and estimated figures stand apart.
#[test]
fn estimates_are_not_among_what_is_guaranteed() {
    let found = verdict(&scores(&[("A", &[Ok(100.0), NO])]));
    assert!(
        found.guaranteed.iter().all(|sentence| !sentence.contains("simulated")),
        "{:?}",
        found.guaranteed
    );
    assert!(found.estimated.iter().all(|sentence| !sentence.contains("guarantee")), "{:?}", found.estimated);
    assert!(
        found.estimated[0].contains("simulated") && found.estimated[0].contains("95 % confidence interval")
    );
}
