//! The worker threads: one small pool for the whole process, started with its first instance and gone with its last.
//!
//! The audio thread never wakes a worker, for that would be a system call; the workers look for themselves, every few
//! milliseconds while there is sound to measure and less often while there is none.

use std::panic::{AssertUnwindSafe, catch_unwind};
use std::sync::atomic::{AtomicBool, Ordering};
use std::sync::{Arc, Condvar, Mutex, MutexGuard, PoisonError, TryLockError, Weak};
use std::thread::{self, JoinHandle};
use std::time::Duration;

use crate::analysis::Analysis;
use crate::tap::Intake;

/// How long a worker rests when it found nothing to do.
const REST: Duration = Duration::from_millis(3);
/// How long once nothing has come for [`ROUNDS_AWAKE`] rounds.
const LONG_REST: Duration = Duration::from_millis(25);
const ROUNDS_AWAKE: u32 = 300;
/// Most threads.
const THREADS_MAX: usize = 8;

static POOL: Mutex<Weak<Pool>> = Mutex::new(Weak::new());

/// An instance's place in the pool; leaving it to be dropped gives it up.
#[derive(Debug)]
pub(crate) struct Place {
    seat: Arc<Seat>,
    pool: Arc<Pool>,
}

/// Rings for the workers' attention; from any thread but the audio thread.
#[derive(Debug, Clone)]
pub(crate) struct Bell(Weak<Pool>);

#[derive(Debug)]
struct Pool {
    floor: Arc<Floor>,
    threads: Vec<JoinHandle<()>>,
}

/// What the threads share.
#[derive(Debug)]
struct Floor {
    seats: Mutex<Arc<[Arc<Seat>]>>,
    stop: AtomicBool,
    rung: Mutex<bool>,
    bell: Condvar,
}

#[derive(Debug)]
struct Seat(Mutex<Analysis>);

impl Place {
    /// Takes a place, starting the pool if this is the process's first.
    pub(crate) fn take(analysis: Analysis) -> Self {
        let pool = Pool::get();
        let seat = Arc::new(Seat(Mutex::new(analysis)));
        pool.floor.change_seats(|seats| seats.push(Arc::clone(&seat)));
        Self { seat, pool }
    }

    /// Gives the analysis another tap to listen to.
    pub(crate) fn install(&self, intake: Intake) {
        self.seat.lock().install(intake);
        self.pool.floor.ring();
    }

    /// Does all that waits in the rings, on the calling thread.
    pub(crate) fn drain(&self) {
        let mut analysis = self.seat.lock();
        while turn(&mut analysis) {}
    }

    pub(crate) fn bell(&self) -> Bell {
        Bell(Arc::downgrade(&self.pool))
    }
}

impl Drop for Place {
    fn drop(&mut self) {
        self.pool.floor.change_seats(|seats| seats.retain(|seat| !Arc::ptr_eq(seat, &self.seat)));
    }
}

impl Bell {
    pub(crate) fn ring(&self) {
        if let Some(pool) = self.0.upgrade() {
            pool.floor.ring();
        }
    }
}

impl Pool {
    fn get() -> Arc<Self> {
        let mut shared = lock(&POOL);
        shared.upgrade().unwrap_or_else(|| {
            let pool = Arc::new(Self::start());
            *shared = Arc::downgrade(&pool);
            pool
        })
    }

    fn start() -> Self {
        let floor = Arc::new(Floor {
            seats: Mutex::new(Arc::new([])),
            stop: AtomicBool::new(false),
            rung: Mutex::new(false),
            bell: Condvar::new(),
        });
        let cores = thread::available_parallelism().map_or(1, usize::from);
        let threads = (0..(cores / 2).clamp(1, THREADS_MAX))
            .filter_map(|number| {
                let floor = Arc::clone(&floor);
                thread::Builder::new()
                    .name(format!("plumbtone-{number}"))
                    .spawn(move || floor.work(number))
                    .ok()
            })
            .collect();
        Self { floor, threads }
    }
}

impl Drop for Pool {
    fn drop(&mut self) {
        self.floor.stop.store(true, Ordering::Relaxed);
        self.floor.ring();
        for thread in self.threads.drain(..) {
            // A worker that panicked outside an analysis has nothing more to say here.
            let _ = thread.join();
        }
    }
}

impl Floor {
    fn work(&self, number: usize) {
        let mut idle_rounds = 0;
        while !self.stop.load(Ordering::Relaxed) {
            let seats = Arc::clone(&lock(&self.seats));
            let mut worked = false;
            for turn_number in 0..seats.len() {
                worked |= seats[(turn_number + number) % seats.len()].turn();
                if self.stop.load(Ordering::Relaxed) {
                    return;
                }
            }
            drop(seats);
            idle_rounds = if worked { 0 } else { idle_rounds + 1 };
            if !worked && self.rest(if idle_rounds < ROUNDS_AWAKE { REST } else { LONG_REST }) {
                idle_rounds = 0;
            }
        }
    }

    /// Waits for the bell; true if it rang.
    fn rest(&self, time: Duration) -> bool {
        let nothing = |rung: &mut bool| !*rung && !self.stop.load(Ordering::Relaxed);
        let (mut rung, _) = self
            .bell
            .wait_timeout_while(lock(&self.rung), time, nothing)
            .unwrap_or_else(PoisonError::into_inner);
        core::mem::take(&mut *rung)
    }

    fn ring(&self) {
        *lock(&self.rung) = true;
        self.bell.notify_all();
    }

    fn change_seats(&self, change: impl FnOnce(&mut Vec<Arc<Seat>>)) {
        let mut seats = lock(&self.seats);
        let mut changed = seats.to_vec();
        change(&mut changed);
        *seats = changed.into();
    }
}

impl Seat {
    /// Gives the analysis a turn, unless another thread is at it.
    fn turn(&self) -> bool {
        match self.0.try_lock() {
            Ok(mut analysis) => turn(&mut analysis),
            Err(TryLockError::Poisoned(poisoned)) => turn(&mut poisoned.into_inner()),
            Err(TryLockError::WouldBlock) => false,
        }
    }

    fn lock(&self) -> MutexGuard<'_, Analysis> {
        lock(&self.0)
    }
}

/// One turn of one analysis; a panic ends that analysis and nothing else.
fn turn(analysis: &mut Analysis) -> bool {
    catch_unwind(AssertUnwindSafe(|| analysis.turn())).unwrap_or_else(|_| {
        analysis.fail();
        true
    })
}

fn lock<T>(mutex: &Mutex<T>) -> MutexGuard<'_, T> {
    mutex.lock().unwrap_or_else(PoisonError::into_inner)
}

#[cfg(test)]
mod tests {
    use std::time::Instant;

    use nice_plug_egui::RepaintNotifier;
    use plumbtone_analysis::{Analyzer, Settings, SettingsError};
    use triple_buffer::{Output, triple_buffer};

    use super::*;
    use crate::analysis::Build;
    use crate::captures::{Captures, Press};
    use crate::check::{Checks, Results};
    use crate::controls::Controls;
    use crate::delivery::Delivery;
    use crate::keys::{Keys, Sheet};
    use crate::readout::{Condition, Readout};
    use crate::session::Transport;
    use crate::status::Status;
    use crate::tap::{Format, Patience, Tap};

    const FORMAT: Format =
        Format { sample_rate_hz: 48_000.0, block_max: 512, patience: Patience::Always };

    fn place(build: Build) -> (Place, Tap, Output<Readout>) {
        let (input, output) = triple_buffer(&Readout::default());
        let delivery = Delivery::new(
            Arc::default(),
            input,
            RepaintNotifier::new(),
            None,
            (
                Checks::new(Results::default()),
                Keys::new(Sheet::default()),
                Press::new(Captures::default()),
            ),
        );
        let place = Place::take(Analysis::new(build, delivery));
        let status = Arc::new(Status::default());
        status.watch(true);
        let (tap, intake) = Tap::new(FORMAT, status);
        place.install(intake);
        (place, tap, output)
    }

    fn play(tap: &mut Tap, blocks: usize) {
        for number in 0..blocks {
            let mut block: Vec<f32> =
                (0..512).map(|n| ((number * 512 + n) as f32 * 0.03).sin()).collect();
            let channels = [&mut block[..]];
            tap.block(&channels, &Controls::default(), &Transport::default(), std::iter::empty());
        }
        tap.end();
    }

    fn broken(_: &Settings) -> Result<Analyzer, SettingsError> {
        panic!("the engine of this test is broken")
    }

    #[test]
    fn a_panic_ends_one_analysis_and_no_other() {
        let (sick, mut sick_tap, mut sick_readout) = place(broken);
        let (well, mut well_tap, mut well_readout) = place(Analyzer::new);
        play(&mut sick_tap, 100);
        play(&mut well_tap, 100);
        sick.drain();
        well.drain();
        assert_eq!(sick_readout.read().condition, Condition::Failed, "the broken one says so");
        assert_eq!(well_readout.read().condition, Condition::Ended, "the other went on");
        assert!(well_readout.read().measured, "and measured");
        assert!(!sick_readout.read().measured, "the broken one did not");
    }

    #[test]
    fn a_sample_rate_out_of_range_is_said() {
        let (place, _, mut readout) = place(Analyzer::new);
        let status = Arc::new(Status::default());
        status.watch(true);
        let (mut tap, intake) = Tap::new(Format { sample_rate_hz: 4_000.0, ..FORMAT }, status);
        place.install(intake);
        play(&mut tap, 3);
        place.drain();
        let condition = readout.read().condition;
        assert!(matches!(condition, Condition::Refused(_)), "{condition:?}");
    }

    #[test]
    fn the_workers_find_work_by_themselves() {
        let (_place, mut tap, mut readout) = place(Analyzer::new);
        play(&mut tap, 100);
        // Long enough for any machine; the condition ends the wait.
        let start = Instant::now();
        while readout.read().condition != Condition::Ended {
            assert!(start.elapsed() < Duration::from_secs(60), "{:?}", readout.read().condition);
            thread::sleep(REST);
        }
        assert!(readout.read().measured, "readings came");
    }
}
