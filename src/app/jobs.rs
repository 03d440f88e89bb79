//! Work in the background: two named threads, jobs in, answers out, progress and cancelling on the way.

use std::collections::VecDeque;
use std::fmt;
use std::sync::atomic::{AtomicBool, AtomicUsize, Ordering};
use std::sync::mpsc::{Receiver, Sender, channel};
use std::sync::{Arc, Condvar, Mutex, PoisonError};

use crate::snag::Progress;

/// What a job is for. A new job of a purpose takes the place of an older one, which is cancelled.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Slot {
    /// Reading clips or a scene.
    Open,
    /// Finding snags.
    Survey,
    /// Running the passes.
    Evaluate,
    /// Limits for the clip's joints.
    Limits,
    /// The turn map.
    Heat,
    /// The rotation curves.
    Curves,
    /// Which joint plays which part.
    Roles,
    /// Writing the scene.
    Save,
    /// Writing clips.
    Export,
    /// Finding a source anew.
    Relocate,
    /// Comparing the two clips of a blend.
    Blend,
    /// Making a retarget ready.
    Carry,
    /// Carrying a clip over and measuring it.
    CarryMeasure,
    /// Writing the settings.
    Settings,
}

impl Slot {
    /// What the progress bar says.
    pub const fn label(self) -> &'static str {
        match self {
            Self::Open | Self::Relocate => "Reading",
            Self::Survey => "Finding snags",
            Self::Evaluate => "Running passes",
            Self::Limits => "Working out limits",
            Self::Heat => "Drawing the turn map",
            Self::Curves => "Sampling curves",
            Self::Roles => "Telling limbs apart",
            Self::Save | Self::Settings => "Saving",
            Self::Export => "Exporting",
            Self::Blend => "Comparing clips",
            Self::Carry => "Mapping joints",
            Self::CarryMeasure => "Measuring the retarget",
        }
    }

    /// Short work that the eye waits for must not stand behind long work.
    const fn is_quick(self) -> bool {
        matches!(
            self,
            Self::Evaluate
                | Self::Curves
                | Self::Roles
                | Self::Save
                | Self::Blend
                | Self::Carry
                | Self::Settings
        )
    }
}

/// How far a job is, and whether it is to stop. The job holds one end, the window the other.
#[derive(Debug, Default)]
pub(crate) struct Watch {
    is_cancelled: AtomicBool,
    done: AtomicUsize,
    total: AtomicUsize,
}

impl Progress for Watch {
    fn report(&self, done: usize, total: usize) -> bool {
        self.done.store(done, Ordering::Relaxed);
        self.total.store(total, Ordering::Relaxed);
        !self.is_cancelled.load(Ordering::Relaxed)
    }
}

impl Watch {
    /// 0 to 1; `None` before the job told anything.
    pub(crate) fn share(&self) -> Option<f32> {
        let total = self.total.load(Ordering::Relaxed);
        (total > 0).then(|| (self.done.load(Ordering::Relaxed) as f32 / total as f32).min(1.0))
    }

    fn cancel(&self) {
        self.is_cancelled.store(true, Ordering::Relaxed);
    }

    fn is_cancelled(&self) -> bool {
        self.is_cancelled.load(Ordering::Relaxed)
    }
}

type Work<A> = Box<dyn FnOnce(&Watch) -> Option<A> + Send>;

struct Queued<A> {
    watch: Arc<Watch>,
    work: Work<A>,
}

struct Lane<A> {
    queue: Mutex<(VecDeque<Queued<A>>, bool)>,
    wakened: Condvar,
}

/// Who does the work.
enum Workers<A> {
    /// Two threads, for quick and for long work.
    Threads { lanes: [Arc<Lane<A>>; 2] },
    /// Whoever submits, at once: for tests and pictures, which must not depend on how threads run.
    Nobody,
}

/// The door to the background.
pub(crate) struct Jobs<A> {
    workers: Workers<A>,
    answers: Receiver<(Arc<Watch>, Option<A>)>,
    sender: Sender<(Arc<Watch>, Option<A>)>,
    running: Vec<(Slot, Arc<Watch>)>,
}

impl<A> fmt::Debug for Jobs<A> {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.debug_struct("Jobs").field("running", &self.running).finish_non_exhaustive()
    }
}

impl<A: Send + 'static> Jobs<A> {
    /// With two threads of their own. `wake` is called whenever an answer waits.
    ///
    /// Where the system gives no threads, work is done at once by whoever submits it.
    pub(crate) fn threaded(wake: impl Fn() + Send + Sync + 'static) -> Self {
        let mut jobs = Self::inline();
        let wake: Arc<dyn Fn() + Send + Sync> = Arc::new(wake);
        let lanes = [0, 1]
            .map(|_| Arc::new(Lane { queue: Mutex::new((VecDeque::new(), false)), wakened: Condvar::new() }));
        let names = ["turnwright-quick", "turnwright-long"];
        let started = lanes.iter().zip(names).all(|(lane, name)| {
            let (lane, sender, wake) = (Arc::clone(lane), jobs.sender.clone(), Arc::clone(&wake));
            let run = move || work_through(&lane, &sender, &*wake);
            std::thread::Builder::new().name(name.to_owned()).spawn(run).is_ok()
        });
        if started {
            jobs.workers = Workers::Threads { lanes };
        }
        jobs
    }

    /// Without threads.
    pub(crate) fn inline() -> Self {
        let (sender, answers) = channel();
        Self { workers: Workers::Nobody, answers, sender, running: Vec::new() }
    }

    /// Hands in a job. `work` gives `None` when it stopped because it was told to.
    pub(crate) fn submit(&mut self, slot: Slot, work: impl FnOnce(&Watch) -> Option<A> + Send + 'static) {
        self.cancel(slot);
        let watch = Arc::new(Watch::default());
        self.running.push((slot, Arc::clone(&watch)));
        match &self.workers {
            Workers::Nobody => {
                let answer = work(&watch);
                // The receiver lives in the same struct.
                let _ = self.sender.send((watch, answer));
            }
            Workers::Threads { lanes } => {
                let lane = &lanes[usize::from(!slot.is_quick())];
                let mut queue = lane.queue.lock().unwrap_or_else(PoisonError::into_inner);
                queue.0.push_back(Queued { watch, work: Box::new(work) });
                lane.wakened.notify_one();
            }
        }
    }

    /// Stops the jobs of a purpose.
    pub(crate) fn cancel(&mut self, slot: Slot) {
        for (_, watch) in self.running.iter().filter(|(running, _)| *running == slot) {
            watch.cancel();
        }
        self.running.retain(|(running, _)| *running != slot);
    }

    /// Answers that have come in and that somebody still waits for.
    pub(crate) fn drain(&mut self) -> Vec<A> {
        let mut found = Vec::new();
        while let Ok((watch, answer)) = self.answers.try_recv() {
            self.running.retain(|(_, running)| !Arc::ptr_eq(running, &watch));
            if watch.is_cancelled() {
                continue;
            }
            found.extend(answer);
        }
        found
    }

    /// Whether a job of this purpose is on its way.
    pub(crate) fn is_running(&self, slot: Slot) -> bool {
        self.running.iter().any(|(running, _)| *running == slot)
    }

    /// The jobs on their way, oldest first, and how far they are.
    pub(crate) fn running(&self) -> impl Iterator<Item = (Slot, Option<f32>)> + '_ {
        self.running.iter().map(|(slot, watch)| (*slot, watch.share()))
    }
}

impl<A> Drop for Jobs<A> {
    fn drop(&mut self) {
        for (_, watch) in &self.running {
            watch.cancel();
        }
        if let Workers::Threads { lanes } = &self.workers {
            for lane in lanes {
                lane.queue.lock().unwrap_or_else(PoisonError::into_inner).1 = true;
                lane.wakened.notify_all();
            }
        }
    }
}

fn work_through<A>(lane: &Lane<A>, sender: &Sender<(Arc<Watch>, Option<A>)>, wake: &dyn Fn()) {
    loop {
        let next = {
            let queue = lane.queue.lock().unwrap_or_else(PoisonError::into_inner);
            let mut queue = lane
                .wakened
                .wait_while(queue, |(jobs, is_over)| jobs.is_empty() && !*is_over)
                .unwrap_or_else(PoisonError::into_inner);
            if queue.1 {
                return;
            }
            queue.0.pop_front()
        };
        let Some(Queued { watch, work }) = next else { continue };
        // A panic in a job is a bug of ours, but it must not take the thread and all later jobs with it.
        let run = || if watch.is_cancelled() { None } else { work(&watch) };
        let answer = std::panic::catch_unwind(std::panic::AssertUnwindSafe(run)).unwrap_or(None);
        if sender.send((watch, answer)).is_err() {
            return;
        }
        wake();
    }
}

#[cfg(test)]
mod tests {
    use std::time::{Duration, Instant};

    use super::*;

    fn wait_for<A: Send + 'static>(jobs: &mut Jobs<A>, count: usize) -> Vec<A> {
        let mut found = Vec::new();
        let start = Instant::now();
        while found.len() < count && start.elapsed() < Duration::from_secs(10) {
            found.extend(jobs.drain());
            std::thread::sleep(Duration::from_millis(1));
        }
        found
    }

    #[test]
    fn a_newer_job_takes_the_place_of_an_older_one() {
        let mut jobs = Jobs::threaded(|| {});
        jobs.submit(Slot::Survey, |watch| {
            while watch.report(1, 2) {
                std::thread::sleep(Duration::from_millis(1));
            }
            None
        });
        jobs.submit(Slot::Survey, |_| Some(2));
        assert_eq!(wait_for(&mut jobs, 1), [2]);
        assert!(!jobs.is_running(Slot::Survey));
    }

    #[test]
    fn quick_work_does_not_wait_for_long_work() {
        let mut jobs = Jobs::threaded(|| {});
        jobs.submit(Slot::Survey, |watch| {
            while watch.report(0, 1) {
                std::thread::sleep(Duration::from_millis(1));
            }
            None
        });
        jobs.submit(Slot::Curves, |_| Some("curves"));
        assert_eq!(wait_for(&mut jobs, 1), ["curves"]);
        assert!(jobs.is_running(Slot::Survey));
    }

    #[test]
    fn without_threads_the_answer_is_there_at_once() {
        let mut jobs = Jobs::inline();
        jobs.submit(Slot::Heat, |watch| watch.report(3, 4).then_some(7));
        assert_eq!(jobs.drain(), [7]);
    }
}
