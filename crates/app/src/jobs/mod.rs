//! Work too long for a frame: one queue of background jobs.
//!
//! A job is given its own copy of what it needs and a [`Token`] with which it reports progress and learns that it is
//! no longer wanted. Jobs have keys: a new job of a key cancels the one before it, and the answer of a cancelled job
//! is never delivered. Answers carry the revision of the project they belong to, so that the window can tell a stale
//! one. A panic inside a job is an answer like any other.
//!
//! ```
//! use std::sync::Arc;
//! use whitesmith::jobs::{Answer, Jobs};
//!
//! let mut jobs: Jobs<u32> = Jobs::new(2, Arc::new(|| {}));
//! jobs.start("sum", 7, |token| {
//!     token.progress(0.5);
//!     1 + 1
//! });
//! let finished = jobs.wait().expect("one job was started");
//! assert_eq!((finished.key.as_str(), finished.revision), ("sum", 7));
//! assert!(matches!(finished.answer, Answer::Done(2)));
//! ```

use std::collections::{BTreeMap, VecDeque};
use std::panic::{AssertUnwindSafe, catch_unwind};
use std::sync::atomic::{AtomicBool, AtomicU64, Ordering};
use std::sync::mpsc::{Receiver, Sender, channel};
use std::sync::{Arc, Mutex, MutexGuard, PoisonError};
use std::thread;
use std::time::{Duration, Instant};

/// Asks the window for a frame. Called from job threads, at most every 50 ms while a job reports progress and once
/// when it ends.
pub type Repaint = Arc<dyn Fn() + Send + Sync>;

/// Least time between two repaints asked for by progress.
const REPAINT_INTERVAL: Duration = Duration::from_millis(50);

/// What a running job holds: where to report progress, and whether it is still wanted.
#[derive(Clone)]
pub struct Token {
    shared: Arc<Shared>,
}

struct Shared {
    cancelled: Arc<AtomicBool>,
    progress: AtomicU64,
    note: Mutex<String>,
    last_repaint: Mutex<Instant>,
    repaint: Repaint,
}

impl Token {
    /// True once the job is no longer wanted: it should return as soon as it can; its answer is thrown away.
    pub fn cancelled(&self) -> bool {
        self.shared.cancelled.load(Ordering::Relaxed)
    }

    /// The flag behind [`Token::cancelled`], for work that takes a plain flag (a solver's budget).
    pub fn flag(&self) -> Arc<AtomicBool> {
        Arc::clone(&self.shared.cancelled)
    }

    /// Reports the part done, 0 to 1.
    pub fn progress(&self, part: f64) {
        self.shared.progress.store(part.clamp(0.0, 1.0).to_bits(), Ordering::Relaxed);
        self.repaint_soon();
    }

    /// Says in words what is being done.
    pub fn note(&self, text: impl Into<String>) {
        *lock(&self.shared.note) = text.into();
        self.repaint_soon();
    }

    fn repaint_soon(&self) {
        let mut last = lock(&self.shared.last_repaint);
        if last.elapsed() >= REPAINT_INTERVAL {
            *last = Instant::now();
            drop(last);
            (self.shared.repaint)();
        }
    }
}

/// How a job ended.
#[derive(Debug, Clone, PartialEq)]
pub enum Answer<T> {
    /// It returned.
    Done(T),
    /// It panicked, with this message.
    Panicked(String),
}

/// A job that ended and was still wanted.
#[derive(Debug, Clone, PartialEq)]
pub struct Finished<T> {
    /// The job's key.
    pub key: String,
    /// The revision of the project it was started for.
    pub revision: u64,
    /// How it ended.
    pub answer: Answer<T>,
}

/// A job that is waiting or running.
#[derive(Debug, Clone, PartialEq)]
pub struct Running {
    /// The job's key.
    pub key: String,
    /// The revision of the project it was started for.
    pub revision: u64,
    /// The part done, 0 to 1; 0 while waiting.
    pub progress: f64,
    /// What it says it is doing.
    pub note: String,
}

type Work<T> = Box<dyn FnOnce(&Token) -> T + Send>;

struct Waiting<T> {
    serial: u64,
    key: String,
    work: Work<T>,
    token: Token,
}

struct Entry {
    serial: u64,
    revision: u64,
    token: Token,
}

struct Ended<T> {
    serial: u64,
    key: String,
    answer: Answer<T>,
}

/// The queue. `T` is what jobs return, usually an enum of all kinds of answers.
pub struct Jobs<T> {
    threads: usize,
    active: usize,
    serial: u64,
    waiting: VecDeque<Waiting<T>>,
    entries: BTreeMap<String, Entry>,
    sender: Sender<Ended<T>>,
    receiver: Receiver<Ended<T>>,
    repaint: Repaint,
}

impl<T: Send + 'static> Jobs<T> {
    /// A queue that runs at most `threads` jobs at a time (at least one).
    pub fn new(threads: usize, repaint: Repaint) -> Self {
        let (sender, receiver) = channel();
        Self {
            threads: threads.max(1),
            active: 0,
            serial: 0,
            waiting: VecDeque::new(),
            entries: BTreeMap::new(),
            sender,
            receiver,
            repaint,
        }
    }

    /// A queue with one thread fewer than the machine has cores, so that the window keeps one.
    pub fn for_this_machine(repaint: Repaint) -> Self {
        let cores = thread::available_parallelism().map_or(2, std::num::NonZero::get);
        Self::new(cores.saturating_sub(1), repaint)
    }

    /// Starts a job, or queues it when all threads are busy. A job of the same key that has not ended is cancelled.
    pub fn start(
        &mut self,
        key: impl Into<String>,
        revision: u64,
        work: impl FnOnce(&Token) -> T + Send + 'static,
    ) {
        let key = key.into();
        self.cancel(&key);
        self.serial += 1;
        let token = Token {
            shared: Arc::new(Shared {
                cancelled: Arc::new(AtomicBool::new(false)),
                progress: AtomicU64::new(0.0_f64.to_bits()),
                note: Mutex::new(String::new()),
                last_repaint: Mutex::new(Instant::now()),
                repaint: Arc::clone(&self.repaint),
            }),
        };
        self.entries.insert(key.clone(), Entry { serial: self.serial, revision, token: token.clone() });
        self.waiting.push_back(Waiting { serial: self.serial, key, work: Box::new(work), token });
        self.launch();
    }

    /// Cancels the job of that key, if there is one.
    pub fn cancel(&mut self, key: &str) {
        if let Some(entry) = self.entries.remove(key) {
            entry.token.shared.cancelled.store(true, Ordering::Relaxed);
            self.waiting.retain(|w| w.serial != entry.serial);
        }
    }

    /// Cancels every job.
    pub fn cancel_all(&mut self) {
        for entry in self.entries.values() {
            entry.token.shared.cancelled.store(true, Ordering::Relaxed);
        }
        self.entries.clear();
        self.waiting.clear();
    }

    /// The jobs that have not ended, by key.
    pub fn running(&self) -> Vec<Running> {
        self.entries.iter().map(|(key, entry)| describe(key, entry)).collect()
    }

    /// The job of that key, while it has not ended.
    pub fn progress_of(&self, key: &str) -> Option<Running> {
        self.entries.get_key_value(key).map(|(key, entry)| describe(key, entry))
    }

    /// True when nothing is waiting or running that is still wanted.
    pub fn is_idle(&self) -> bool {
        self.entries.is_empty()
    }

    /// The jobs that ended since the last call; call once a frame.
    pub fn poll(&mut self) -> Vec<Finished<T>> {
        let mut finished = Vec::new();
        while let Ok(ended) = self.receiver.try_recv() {
            finished.extend(self.settle(ended));
        }
        self.launch();
        finished
    }

    /// Waits for the next job to end; `None` when none is wanted any more. For headless use and tests.
    pub fn wait(&mut self) -> Option<Finished<T>> {
        while !self.is_idle() {
            let ended = self.receiver.recv().ok()?;
            let finished = self.settle(ended);
            self.launch();
            if finished.is_some() {
                return finished;
            }
        }
        None
    }

    fn settle(&mut self, ended: Ended<T>) -> Option<Finished<T>> {
        self.active = self.active.saturating_sub(1);
        let wanted = self.entries.get(&ended.key).is_some_and(|entry| entry.serial == ended.serial);
        if !wanted {
            return None;
        }
        let entry = self.entries.remove(&ended.key)?;
        Some(Finished { key: ended.key, revision: entry.revision, answer: ended.answer })
    }

    fn launch(&mut self) {
        while self.active < self.threads {
            let Some(Waiting { serial, key, work, token }) = self.waiting.pop_front() else { return };
            self.active += 1;
            let sender = self.sender.clone();
            let name = format!("job {key}");
            let ended_key = key.clone();
            let spawned = thread::Builder::new().name(name).spawn(move || {
                let answer = match catch_unwind(AssertUnwindSafe(|| work(&token))) {
                    Ok(value) => Answer::Done(value),
                    Err(payload) => Answer::Panicked(message_of(payload.as_ref())),
                };
                // The queue may be gone already: then nobody waits for the answer.
                let _ = sender.send(Ended { serial, key: ended_key, answer });
                (token.shared.repaint)();
            });
            if let Err(error) = spawned {
                let answer = Answer::Panicked(format!("no thread could be started: {error}"));
                let _ = self.sender.send(Ended { serial, key, answer });
                (self.repaint)();
            }
        }
    }
}

impl<T> Drop for Jobs<T> {
    fn drop(&mut self) {
        for entry in self.entries.values() {
            entry.token.shared.cancelled.store(true, Ordering::Relaxed);
        }
    }
}

fn describe(key: &str, entry: &Entry) -> Running {
    let shared = &entry.token.shared;
    Running {
        key: key.to_owned(),
        revision: entry.revision,
        progress: f64::from_bits(shared.progress.load(Ordering::Relaxed)),
        note: lock(&shared.note).clone(),
    }
}

/// What a lock guards here is replaced whole, so a panic while it was held leaves nothing half done.
fn lock<V>(mutex: &Mutex<V>) -> MutexGuard<'_, V> {
    mutex.lock().unwrap_or_else(PoisonError::into_inner)
}

fn message_of(payload: &(dyn std::any::Any + Send)) -> String {
    payload
        .downcast_ref::<&str>()
        .map(|text| (*text).to_owned())
        .or_else(|| payload.downcast_ref::<String>().cloned())
        .unwrap_or_else(|| "a job failed without saying why".to_owned())
}

#[cfg(test)]
mod tests {
    use super::*;
    use std::sync::atomic::AtomicUsize;

    fn queue(threads: usize) -> (Jobs<u32>, Arc<AtomicUsize>) {
        let repaints = Arc::new(AtomicUsize::new(0));
        let counted = Arc::clone(&repaints);
        (Jobs::new(threads, Arc::new(move || _ = counted.fetch_add(1, Ordering::SeqCst))), repaints)
    }

    #[test]
    fn the_latest_job_of_a_key_wins() {
        let (mut jobs, _) = queue(2);
        let (go, gate) = channel::<()>();
        jobs.start("solve", 1, move |token| {
            gate.recv().unwrap();
            u32::from(token.cancelled())
        });
        jobs.start("solve", 2, |_| 22);
        go.send(()).unwrap();
        let finished = jobs.wait().unwrap();
        assert_eq!((finished.revision, finished.answer), (2, Answer::Done(22)));
        assert!(jobs.wait().is_none() && jobs.is_idle());
    }

    #[test]
    fn a_job_that_waits_and_is_replaced_never_runs() {
        let (mut jobs, _) = queue(1);
        let (go, gate) = channel::<()>();
        let ran = Arc::new(AtomicBool::new(false));
        jobs.start("long", 1, move |_| {
            gate.recv().unwrap();
            1
        });
        let flag = Arc::clone(&ran);
        jobs.start("next", 1, move |_| {
            flag.store(true, Ordering::SeqCst);
            2
        });
        jobs.start("next", 2, |_| 3);
        go.send(()).unwrap();
        let answers: Vec<_> = std::iter::from_fn(|| jobs.wait()).map(|f| f.answer).collect();
        assert_eq!(answers, [Answer::Done(1), Answer::Done(3)]);
        assert!(!ran.load(Ordering::SeqCst));
    }

    #[test]
    fn a_panic_is_an_answer_and_the_queue_goes_on() {
        let (mut jobs, repaints) = queue(1);
        jobs.start("bad", 4, |_| panic!("no blend"));
        assert_eq!(jobs.wait().unwrap().answer, Answer::Panicked("no blend".to_owned()));
        jobs.start("good", 5, |_| 5);
        assert_eq!(jobs.wait().unwrap().answer, Answer::Done(5));
        // The repaint of the last job may still be on its way; the first one's came before the second started.
        assert!(repaints.load(Ordering::SeqCst) >= 1);
    }

    #[test]
    fn progress_and_words_are_seen_while_a_job_runs() {
        let (mut jobs, _) = queue(1);
        let (told, tell) = channel::<()>();
        let (go, gate) = channel::<()>();
        jobs.start("frontier", 9, move |token| {
            token.progress(0.25);
            token.note("level 3 of 12");
            told.send(()).unwrap();
            gate.recv().unwrap();
            0
        });
        tell.recv().unwrap();
        let running = jobs.progress_of("frontier").unwrap();
        assert_eq!((running.progress, running.note.as_str(), running.revision), (0.25, "level 3 of 12", 9));
        go.send(()).unwrap();
        assert!(jobs.wait().is_some() && jobs.running().is_empty());
    }

    #[test]
    fn dropping_the_queue_cancels_what_runs() {
        let (mut jobs, _) = queue(1);
        let (told, tell) = channel::<bool>();
        let (go, gate) = channel::<()>();
        jobs.start("long", 1, move |token| {
            gate.recv().unwrap();
            told.send(token.cancelled()).unwrap();
            0
        });
        drop(jobs);
        go.send(()).unwrap();
        assert!(tell.recv().unwrap());
    }
}
