//! A run or a session as lines, for a pipe and for a terminal that cannot be drawn on: one a second, each point and
//! each alarm besides.

use std::io::{self, Write};
use std::sync::Arc;
use std::sync::atomic::{AtomicBool, Ordering};

use crate::report::bench_live::{BenchView, bench_line, point_line};
use crate::report::cautions::{SESSION_ALARM, SESSION_LIVE};
use crate::report::session_live::{SessionView, Wrong, alarm_words, session_line};
use crate::work::log::{BenchFace, BenchWish, SessionFace, SessionWish};

/// Where lines go.
struct Out<'a> {
    lines: &'a mut dyn Write,
    /// Why no more can be written.
    closed: Option<io::ErrorKind>,
    interrupted: Arc<AtomicBool>,
}

impl Out<'_> {
    fn line(&mut self, text: &str) {
        if self.closed.is_none() {
            let written = self.lines.write_all(format!("{text}\n").as_bytes());
            self.closed = written.and_then(|()| self.lines.flush()).err().map(|error| error.kind());
        }
    }

    fn is_over(&self) -> bool {
        self.closed.is_some() || self.interrupted.load(Ordering::SeqCst)
    }
}

/// The second of the last line, and the line.
#[derive(Debug, Default)]
struct Pace {
    second: Option<u64>,
    line: String,
}

impl Pace {
    /// Whether a line is due: with every new second of what is logged; before that begins, when the line is another.
    fn is_due(&mut self, elapsed_s: Option<f64>, line: &str) -> bool {
        let second = elapsed_s.map(|seconds| seconds.max(0.0) as u64);
        let due = match second {
            Some(_) => second != self.second,
            None => self.line != line,
        };
        if due {
            self.second = second;
            line.clone_into(&mut self.line);
        }
        due
    }
}

/// A bench run as lines.
pub struct BenchLines<'a> {
    out: Out<'a>,
    pace: Pace,
    /// Points as they were shown last; none before the first view.
    points: Option<Vec<(usize, Option<String>)>>,
}

impl<'a> BenchLines<'a> {
    /// Lines that go to `out`; `interrupted` is set when the program shall end.
    pub fn new(out: &'a mut dyn Write, interrupted: Arc<AtomicBool>) -> Self {
        Self { out: Out { lines: out, closed: None, interrupted }, pace: Pace::default(), points: None }
    }

    /// Why no more lines can be written, if that is so; a closed pipe among it.
    #[must_use]
    pub const fn closed(&self) -> Option<io::ErrorKind> {
        self.out.closed
    }
}

impl BenchFace for BenchLines<'_> {
    fn show(&mut self, view: &BenchView) {
        let points: Vec<(usize, Option<String>)> =
            view.points.iter().map(|point| (point.number, point.left_out.clone())).collect();
        // Those that a resumed run brought along are no news.
        if let Some(before) = &self.points {
            for (point, now) in view.points.iter().zip(&points) {
                if !before.contains(now) {
                    self.out.line(&point_line(view, point));
                }
            }
        }
        self.points = Some(points);
        let line = bench_line(view);
        if self.pace.is_due(Some(view.elapsed_s), &line) {
            self.out.line(&line);
        }
    }

    fn wishes(&mut self) -> Vec<BenchWish> {
        if self.out.is_over() { vec![BenchWish::LeaveOpen] } else { Vec::new() }
    }

    fn say(&mut self, sentence: &str) {
        self.out.line(sentence);
    }
}

/// A session as lines.
pub struct SessionLines<'a> {
    out: Out<'a>,
    pace: Pace,
    raised: Vec<Wrong>,
    cautioned: bool,
}

impl<'a> SessionLines<'a> {
    /// As [`BenchLines::new`].
    pub fn new(out: &'a mut dyn Write, interrupted: Arc<AtomicBool>) -> Self {
        let out = Out { lines: out, closed: None, interrupted };
        Self { out, pace: Pace::default(), raised: Vec::new(), cautioned: false }
    }

    /// As [`BenchLines::closed`].
    #[must_use]
    pub const fn closed(&self) -> Option<io::ErrorKind> {
        self.out.closed
    }
}

impl SessionFace for SessionLines<'_> {
    fn show(&mut self, view: &SessionView) {
        if !std::mem::replace(&mut self.cautioned, true) {
            self.out.line(SESSION_LIVE);
        }
        for alarm in &view.alarms {
            if !self.raised.contains(&alarm.what) {
                self.out.line(&format!("ALARM {}; {SESSION_ALARM}", alarm_words(alarm, &view.units)));
            }
        }
        self.raised = view.alarms.iter().map(|alarm| alarm.what.clone()).collect();
        let line = session_line(view);
        if self.pace.is_due(view.elapsed_s, &line) {
            self.out.line(&line);
        }
    }

    fn wishes(&mut self) -> Vec<SessionWish> {
        if self.out.is_over() { vec![SessionWish::LeaveOpen] } else { Vec::new() }
    }

    fn say(&mut self, sentence: &str) {
        self.out.line(sentence);
    }
}
