//! Listening to instruments: a thread for each port, one queue out of all.

use std::sync::atomic::{AtomicBool, Ordering};
use std::sync::mpsc::{self, Receiver};
use std::sync::{Arc, Mutex};
use std::thread::{self, JoinHandle};
use std::time::Duration;

use super::bus::buses;
use super::counters::Counters;
use super::error::ProfileError;
use super::line::Opener;
use super::worker::{Heard, Shared, Worker, counted};
use crate::clock::Ticks;
use crate::entry::Instrument;

/// What the instruments say, as it comes. Dropping it stops the threads and closes the ports.
pub struct Streams {
    heard: Receiver<Heard>,
    counters: Shared,
    stop: Arc<AtomicBool>,
    threads: Vec<JoinHandle<()>>,
}

/// Listens to these instruments until the result is stopped or dropped. Those on one port share a thread; a port that
/// does not open is tried again and again.
///
/// # Errors
/// A profile that cannot be listened to, and two on one port that do not go together; then nothing was opened.
pub fn listen(
    instruments: &[Instrument],
    opener: &Arc<dyn Opener>,
    ticks: &Arc<dyn Ticks>,
) -> Result<Streams, ProfileError> {
    let (workers, heard, counters) = workers(instruments, opener, ticks)?;
    let stop = Arc::new(AtomicBool::new(false));
    let threads = workers.into_iter().map(|mut worker| {
        let stop = Arc::clone(&stop);
        thread::spawn(move || {
            while !stop.load(Ordering::Relaxed) {
                worker.turn();
            }
        })
    });
    let threads = threads.collect();
    Ok(Streams { heard, counters, stop, threads })
}

/// What [`listen`] runs, without its threads: each worker is turned by hand, as tests with a virtual clock do.
///
/// # Errors
/// As [`listen`].
pub fn by_hand(
    instruments: &[Instrument],
    opener: &Arc<dyn Opener>,
    ticks: &Arc<dyn Ticks>,
) -> Result<(Vec<Worker>, Streams), ProfileError> {
    let (workers, heard, counters) = workers(instruments, opener, ticks)?;
    let stop = Arc::new(AtomicBool::new(false));
    Ok((workers, Streams { heard, counters, stop, threads: Vec::new() }))
}

fn workers(
    instruments: &[Instrument],
    opener: &Arc<dyn Opener>,
    ticks: &Arc<dyn Ticks>,
) -> Result<(Vec<Worker>, Receiver<Heard>, Shared), ProfileError> {
    // The queue is not bounded: a full one would make a thread wait, and bytes would be lost in the port instead.
    let (out, heard) = mpsc::channel();
    let counters: Shared = Arc::new(Mutex::new(vec![Counters::default(); instruments.len()]));
    let worker =
        |bus| Worker::new(bus, Arc::clone(opener), Arc::clone(ticks), out.clone(), Arc::clone(&counters));
    let workers = buses(instruments)?.into_iter().map(worker).collect();
    Ok((workers, heard, counters))
}

impl Streams {
    /// The next thing heard; none when nothing came for so many seconds.
    #[must_use]
    pub fn wait(&self, longest_s: f64) -> Option<Heard> {
        self.heard.recv_timeout(Duration::try_from_secs_f64(longest_s).unwrap_or_default()).ok()
    }

    /// What is there now.
    pub fn waiting(&self) -> impl Iterator<Item = Heard> + '_ {
        self.heard.try_iter()
    }

    /// The counts of each instrument, in the order they were given.
    #[must_use]
    pub fn counters(&self) -> Vec<Counters> {
        counted(&self.counters).clone()
    }

    /// Stops listening, closes the ports, and hands over what was heard and not yet taken.
    #[must_use]
    pub fn stop(mut self) -> Vec<Heard> {
        self.end();
        self.heard.try_iter().collect()
    }

    fn end(&mut self) {
        self.stop.store(true, Ordering::Relaxed);
        for thread in self.threads.drain(..) {
            // A thread that panicked has closed its port; what it sent before is in the queue.
            let _ = thread.join();
        }
    }
}

impl Drop for Streams {
    fn drop(&mut self) {
        self.end();
    }
}
