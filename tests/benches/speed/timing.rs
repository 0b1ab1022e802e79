//! Times of tasks that take turns.

use std::error::Error;
use std::time::Instant;

/// Something to be timed.
pub(crate) type Task<'a> = Box<dyn FnMut() -> Result<(), Box<dyn Error>> + 'a>;

/// The shortest time of each task in seconds, over rounds in which each runs once.
pub(crate) fn shortest_times<'a>(
    tasks: impl IntoIterator<Item = Task<'a>>,
    rounds: usize,
) -> Result<Vec<f64>, Box<dyn Error>> {
    let mut tasks: Vec<Task<'a>> = tasks.into_iter().collect();
    let mut shortest = vec![f64::INFINITY; tasks.len()];
    for _ in 0..rounds {
        for (task, shortest) in tasks.iter_mut().zip(&mut shortest) {
            let start = Instant::now();
            task()?;
            *shortest = shortest.min(start.elapsed().as_secs_f64());
        }
    }
    Ok(shortest)
}
