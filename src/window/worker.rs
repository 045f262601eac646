//! Slow work off the interface thread: one job at a time, which can be told to stop, says how far it is, and may hand over parts.
//!
//! *The rule.* A job belongs to the number of what it was asked for: the design, the condition and the request. What a job hands
//! over under another number than the present one is thrown away, so an answer for an older design is never shown. Starting
//! a job tells the one before to stop and forgets it at once, whether or not it listens.
//! *Rest.* The window is woken by what a job hands over, at most so many times a second; who shows the progress asks for frames
//! while the job runs. Without a job nothing wakes the window.

use std::sync::mpsc::{Receiver, Sender, TryRecvError, channel};
use std::thread::Builder;
use std::time::{Duration, Instant};

use eframe::egui;

use crate::switched::{Cancel, Progress};

/// Least time between two wakings for parts.
const BETWEEN: Duration = Duration::from_millis(30);

/// What a job has handed over.
#[derive(Debug)]
pub(super) enum News<P, T> {
    /// A part of the result, more to come.
    Part(P),
    /// The whole result; the job has ended.
    Done(T),
    /// The job ended without a result: an error of the program itself.
    Lost,
}

/// What a job works with: whether it is to stop, how far it is, and where its parts go.
#[derive(Debug)]
pub(super) struct Hand<P, T> {
    /// Set when nobody waits for the result any more.
    pub cancel: Cancel,
    /// How far the work is.
    pub progress: Progress,
    sender: Sender<News<P, T>>,
    ctx: egui::Context,
    woken: Instant,
}

impl<P, T> Hand<P, T> {
    /// Hands over a part of the result.
    pub(super) fn part(&mut self, part: P) {
        // Nobody may wait any more; the flag says so.
        let _ = self.sender.send(News::Part(part));
        if self.woken.elapsed() >= BETWEEN {
            self.woken = Instant::now();
            self.ctx.request_repaint();
        }
    }
}

/// A job under way.
#[derive(Debug)]
struct Job<P, T> {
    number: u64,
    cancel: Cancel,
    progress: Progress,
    receiver: Receiver<News<P, T>>,
}

/// One job at a time.
#[derive(Debug)]
pub(super) struct Worker<P, T> {
    job: Option<Job<P, T>>,
}

impl<P, T> Default for Worker<P, T> {
    fn default() -> Self {
        Worker { job: None }
    }
}

impl<P, T> Drop for Worker<P, T> {
    fn drop(&mut self) {
        self.cancel();
    }
}

impl<P, T> Worker<P, T> {
    /// The number of the job under way.
    pub(super) fn number(&self) -> Option<u64> {
        self.job.as_ref().map(|job| job.number)
    }

    /// How far the job under way is, from 0 to 1.
    pub(super) fn share(&self) -> Option<f64> {
        self.job.as_ref().map(|job| job.progress.share())
    }

    /// Tells the job under way to stop and forgets it; nothing of it is heard of again.
    pub(super) fn cancel(&mut self) {
        if let Some(job) = self.job.take() {
            job.cancel.cancel();
        }
    }

    /// What the job has handed over since the last call. A job of another number than `number` is told to stop, and all it
    /// handed over is thrown away.
    pub(super) fn news(&mut self, number: u64) -> Vec<News<P, T>> {
        if self.number().is_some_and(|of_job| of_job != number) {
            self.cancel();
        }
        let mut news = Vec::new();
        while let Some(job) = &self.job {
            match job.receiver.try_recv() {
                Ok(part @ News::Part(_)) => news.push(part),
                Ok(last) => {
                    news.push(last);
                    self.job = None;
                }
                Err(TryRecvError::Disconnected) => {
                    news.push(News::Lost);
                    self.job = None;
                }
                Err(TryRecvError::Empty) => break,
            }
        }
        news
    }
}

impl<P: Send + 'static, T: Send + 'static> Worker<P, T> {
    /// Starts a job under a number; the one before is told to stop.
    ///
    /// # Errors
    /// When no thread can be started.
    pub(super) fn start(
        &mut self,
        number: u64,
        name: &str,
        ctx: &egui::Context,
        work: impl FnOnce(&mut Hand<P, T>) -> T + Send + 'static,
    ) -> std::io::Result<()> {
        self.cancel();
        let (sender, receiver) = channel();
        let (cancel, progress) = (Cancel::new(), Progress::new());
        let mut hand = Hand {
            cancel: cancel.clone(),
            progress: progress.clone(),
            sender,
            ctx: ctx.clone(),
            woken: Instant::now(),
        };
        let run = move || {
            let waker = Waker(hand.ctx.clone());
            let result = work(&mut hand);
            let _ = hand.sender.send(News::Done(result));
            // The sender goes before the window is woken: whoever looks then finds the end.
            drop(hand);
            drop(waker);
        };
        Builder::new().name(name.to_owned()).spawn(run)?;
        self.job = Some(Job { number, cancel, progress, receiver });
        Ok(())
    }
}

/// Wakes the window when a job ends, however it ends.
struct Waker(egui::Context);

impl Drop for Waker {
    fn drop(&mut self) {
        self.0.request_repaint();
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use std::sync::{Arc, Barrier};

    /// Waits for the end of the job under way; nothing is timed, a job that never ends hangs the test.
    fn until_done(worker: &mut Worker<u32, u32>, number: u64) -> Vec<News<u32, u32>> {
        let mut all = Vec::new();
        while worker.number().is_some() {
            all.extend(worker.news(number));
            std::thread::yield_now();
        }
        all
    }

    /// A job that hands over its result only after the design has moved on: nothing of it is heard.
    #[test]
    fn an_answer_for_an_older_design_is_thrown_away() {
        let ctx = egui::Context::default();
        let mut worker: Worker<u32, u32> = Worker::default();
        let (late, left) = (Arc::new(Barrier::new(2)), Arc::new(Barrier::new(2)));
        let (late_there, left_there) = (Arc::clone(&late), Arc::clone(&left));
        let slow = move |hand: &mut Hand<u32, u32>| {
            hand.part(1);
            late_there.wait();
            // Deaf to the flag, and with an answer.
            hand.part(2);
            let stopped = hand.cancel.is_cancelled();
            left_there.wait();
            u32::from(stopped)
        };
        worker.start(7, "slow", &ctx, slow).unwrap();
        assert_eq!(worker.number(), Some(7));
        // The design moved on before anything was looked at: not even the first part is shown.
        assert!(worker.news(8).is_empty());
        assert_eq!(worker.number(), None);
        late.wait();
        left.wait();
        assert!(worker.news(8).is_empty() && worker.news(7).is_empty());
        worker.start(8, "quick", &ctx, |_| 5).unwrap();
        assert!(matches!(until_done(&mut worker, 8)[..], [News::Done(5)]));
    }

    /// Starting anew sets the flag of the job before, and its answer goes nowhere.
    #[test]
    fn a_new_job_stops_the_one_before() {
        let ctx = egui::Context::default();
        let mut worker: Worker<u32, u32> = Worker::default();
        let (tell, told) = channel();
        let patient = move |hand: &mut Hand<u32, u32>| {
            while !hand.cancel.is_cancelled() {
                hand.progress.set(0.5);
                std::thread::yield_now();
            }
            let _ = tell.send(());
            1
        };
        worker.start(1, "patient", &ctx, patient).unwrap();
        worker.start(1, "next", &ctx, |_| 2).unwrap();
        told.recv().unwrap();
        assert!(matches!(until_done(&mut worker, 1)[..], [News::Done(2)]));
    }

    #[test]
    fn parts_come_in_order_and_a_lost_job_is_told() {
        let ctx = egui::Context::default();
        let mut worker: Worker<u32, u32> = Worker::default();
        let parts = |hand: &mut Hand<u32, u32>| {
            (0..3).for_each(|k| hand.part(k));
            hand.progress.set(0.75);
            9
        };
        worker.start(3, "parts", &ctx, parts).unwrap();
        let heard = until_done(&mut worker, 3);
        assert!(matches!(heard[..], [News::Part(0), News::Part(1), News::Part(2), News::Done(9)]), "{heard:?}");
        // Unwinding without the message of a panic.
        worker.start(4, "lost", &ctx, |_| std::panic::resume_unwind(Box::new("lost"))).unwrap();
        let heard = until_done(&mut worker, 4);
        assert!(matches!(heard[..], [News::Lost]));
        assert_eq!(worker.share(), None);
    }
}
