//! Progress on standard error: one line that updates itself on a terminal, few lines elsewhere.

use super::number::general;
use super::state::Run;
use std::io::Write;
use std::time::Instant;

/// Which line it is.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Moment {
    First,
    Some,
    Last,
}

impl Run<'_> {
    fn share_done(&self) -> f64 {
        let position = &self.position;
        match position.steps {
            Some(0) => 1.0,
            Some(steps) => position.step as f64 / steps as f64,
            None if position.end > self.begin => (position.time - self.begin) / (position.end - self.begin),
            None => 1.0,
        }
    }

    pub fn show_progress(&mut self, moment: Moment) {
        if self.quiet {
            return;
        }
        let since = self.shown_at.elapsed().as_secs_f64();
        let wait = if self.terminal { 0.2 } else { 10.0 };
        if moment == Moment::Some && since < wait {
            return;
        }
        let (share, step) = (self.share_done(), self.position.step);
        let mut line = format!(
            "{}: step {step}, t = {} s, {:.1} %",
            self.about.name,
            general(self.position.time, 6),
            100.0 * share
        );
        if moment == Moment::Some {
            let points = (step - self.shown_step) as f64 * self.total as f64;
            let rate = if since > 0.0 { points / since * 1e-6 } else { 0.0 };
            let left = if share > 0.0 { self.wall() * (1.0 - share) / share } else { 0.0 };
            line.push_str(&format!(", {} Mpt/s, {left:.0} s left", general(rate, 3)));
        } else if moment == Moment::Last {
            line.push_str(&format!(", {} s", general(self.started.elapsed().as_secs_f64(), 3)));
        }
        let end = if moment == Moment::Last { "\n" } else { "" };
        let text = if self.terminal { format!("\r{line}\x1b[K{end}") } else { format!("{line}\n") };
        // Nobody to tell is no fault of the run.
        let mut out = std::io::stderr().lock();
        let _ = out.write_all(text.as_bytes()).and_then(|()| out.flush());
        self.shown_at = Instant::now();
        self.shown_step = step;
    }
}
