//! Printing: results on standard output, everything else on standard error.

use std::io::{self, Write};

use indicatif::{ProgressBar, ProgressDrawTarget, ProgressStyle};

use crate::problem::Notice;

/// Writes a result to standard output. A reader that has gone away (a closed pipe) is no error.
///
/// # Errors
/// When standard output cannot be written for another reason.
pub(super) fn print_result(text: &[u8]) -> io::Result<()> {
    let mut out = io::stdout().lock();
    match out.write_all(text).and_then(|()| out.flush()) {
        Err(error) if error.kind() == io::ErrorKind::BrokenPipe => Ok(()),
        other => other,
    }
}

/// Writes notices to standard error, warnings marked; nothing when `quiet`.
pub(super) fn print_notices<'a>(notices: impl IntoIterator<Item = &'a Notice>, quiet: bool) {
    if quiet {
        return;
    }
    for notice in notices {
        let kind = if notice.is_warning { "warning" } else { "note" };
        // Standard error that cannot be written leaves nobody to tell.
        let _ = match &notice.file {
            Some(file) => writeln!(io::stderr(), "{kind}: {}: {}", file.display(), notice.text),
            None => writeln!(io::stderr(), "{kind}: {}", notice.text),
        };
    }
}

/// A progress bar over simulated dives on standard error; drawn only when that is a terminal and not `quiet`.
pub(super) fn progress_bar(dives: usize, quiet: bool) -> ProgressBar {
    progress_bar_over(dives, "dives", quiet)
}

/// A progress bar over anything that is counted.
pub(super) fn progress_bar_over(count: usize, what: &str, quiet: bool) -> ProgressBar {
    let target = if quiet { ProgressDrawTarget::hidden() } else { ProgressDrawTarget::stderr() };
    let style = ProgressStyle::with_template(&format!("{{bar:30}} {{pos}}/{{len}} {what}, {{eta}} left"))
        .expect("the template is valid");
    ProgressBar::with_draw_target(Some(count as u64), target).with_style(style)
}

/// A progress bar over straight runs, whose number grows as an analysis finds out what to run next; drawn as
/// [`progress_bar`].
pub(super) fn runs_bar(quiet: bool) -> ProgressBar {
    let target = if quiet { ProgressDrawTarget::hidden() } else { ProgressDrawTarget::stderr() };
    let style = ProgressStyle::with_template("{bar:30} {pos}/{len} runs so far planned")
        .expect("the template is fixed and valid");
    ProgressBar::with_draw_target(Some(0), target).with_style(style)
}

/// The steps of a long job: one line on standard error that names the step, its place among all, and how far it is.
#[derive(Debug)]
pub(super) struct Steps {
    count: usize,
    begun: usize,
    quiet: bool,
    bar: ProgressBar,
}

impl Steps {
    /// `count` steps to come.
    pub fn new(count: usize, quiet: bool) -> Self {
        Self { count, begun: 0, quiet, bar: ProgressBar::hidden() }
    }

    /// Ends the step before and begins the next: with a bar over a number of somethings, or with its name alone where
    /// nothing can be counted.
    pub fn next(&mut self, name: &str, over: Option<(usize, &str)>) -> &ProgressBar {
        let progress = match over {
            Some((_, what)) => format!(" {{bar:30}} {{pos}}/{{len}} {what}, {{eta}} left"),
            None => String::new(),
        };
        self.begin(name, &progress, over.map_or(0, |(count, _)| count))
    }

    /// The same with a number that grows as the step finds out what to do next.
    pub fn next_growing(&mut self, name: &str, what: &str) -> &ProgressBar {
        self.begin(name, &format!(" {{bar:30}} {{pos}}/{{len}} {what} so far planned"), 0)
    }

    fn begin(&mut self, name: &str, progress: &str, count: usize) -> &ProgressBar {
        self.bar.finish_and_clear();
        self.begun += 1;
        let target = if self.quiet { ProgressDrawTarget::hidden() } else { ProgressDrawTarget::stderr() };
        let template = format!("step {} of {}, {name}{progress}", self.begun, self.count);
        let style = ProgressStyle::with_template(&template).expect("the template is valid");
        self.bar = ProgressBar::with_draw_target(Some(count as u64), target).with_style(style);
        self.bar.tick();
        &self.bar
    }

    /// Ends the last step.
    pub fn finish(&self) {
        self.bar.finish_and_clear();
    }
}
