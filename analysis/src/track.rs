//! Choice of the pitch over time: the cheapest path through the candidates of successive instants, decided a fixed number
//! of instants late (Viterbi with a fixed look-ahead).
//!
//! A path pays for explaining an instant badly, for leaving the pitch and for changing between pitch and none. Small
//! moves are free, so vibrato and glides cost nothing, while one instant's octave error costs two jumps.

use crate::fundamental::{CANDIDATES, Candidate};

/// Instants by which the decision is later than the evidence.
pub(crate) const LOOK_AHEAD: usize = 6;
/// Paths kept: every candidate, and no pitch.
const STATES: usize = CANDIDATES + 1;
/// Score at which a pitch is as good an explanation as none.
const NO_PITCH_SCORE: f64 = 0.30;
/// Move per instant that is free, in cents.
const FREE_CENTS: f64 = 45.0;
/// Cost of a move beyond that, per cent, and at most.
const MOVE_COST: f64 = 0.01;
const JUMP_COST: f64 = 1.3;
/// Cost of a change between pitch and none.
const VOICING_COST: f64 = 0.5;

/// The candidates of one instant, with what the search over paths knows of them.
#[derive(Debug, Clone)]
pub(crate) struct Column {
    /// Candidates, best first.
    pub(crate) candidates: Vec<Candidate>,
    cost: [f64; STATES],
    from: [usize; STATES],
}

impl Column {
    /// An empty column with room for every candidate.
    pub(crate) fn new() -> Self {
        Self {
            candidates: Vec::with_capacity(CANDIDATES + 1),
            cost: [0.0; STATES],
            from: [CANDIDATES; STATES],
        }
    }
}

/// The search over paths.
#[derive(Debug)]
pub(crate) struct Tracker {
    columns: Vec<Column>,
    /// Columns pushed since the last restart.
    pushed: usize,
}

impl Tracker {
    /// A tracker without a past.
    pub(crate) fn new() -> Self {
        Self { columns: (0..=LOOK_AHEAD).map(|_| Column::new()).collect(), pushed: 0 }
    }

    /// Forgets the past.
    pub(crate) fn restart(&mut self) {
        self.pushed = 0;
    }

    /// The column to fill before [`push`](Self::push).
    pub(crate) fn next(&mut self) -> &mut Vec<Candidate> {
        let at = self.pushed % self.columns.len();
        &mut self.columns[at].candidates
    }

    /// Takes the filled column into the search.
    pub(crate) fn push(&mut self) {
        let len = self.columns.len();
        let at = self.pushed % len;
        let mut now = core::mem::replace(
            &mut self.columns[at],
            Column { candidates: Vec::new(), cost: [0.0; STATES], from: [0; STATES] },
        );
        if self.pushed == 0 {
            for (s, cost) in now.cost.iter_mut().enumerate() {
                *cost = emission(&now.candidates, s);
            }
        } else {
            let before = &self.columns[(at + len - 1) % len];
            for s in 0..STATES {
                let here = emission(&now.candidates, s);
                let (from, cost) = (0..STATES)
                    .map(|r| {
                        (r, before.cost[r] + transition(&before.candidates, r, &now.candidates, s))
                    })
                    .min_by(|a, b| a.1.total_cmp(&b.1))
                    .unwrap_or((CANDIDATES, 0.0));
                now.cost[s] = here + cost;
                now.from[s] = from;
            }
            let least = now.cost.iter().copied().fold(f64::INFINITY, f64::min);
            for cost in &mut now.cost {
                *cost -= least;
            }
        }
        self.columns[at] = now;
        self.pushed += 1;
    }

    /// The decision for the column pushed `age` pushes ago (0 is the newest): its candidate, and all its candidates.
    pub(crate) fn decide(&self, age: usize) -> (Option<Candidate>, &[Candidate]) {
        let len = self.columns.len();
        let newest = self.pushed + len - 1;
        let mut state = (0..STATES)
            .min_by(|&a, &b| {
                let cost = &self.columns[newest % len].cost;
                cost[a].total_cmp(&cost[b])
            })
            .unwrap_or(CANDIDATES);
        for back in 0..age {
            state = self.columns[(newest - back) % len].from[state];
        }
        let column = &self.columns[(newest - age) % len];
        (column.candidates.get(state).copied(), &column.candidates)
    }
}

/// Cost of explaining an instant by a state. No pitch costs what a pitch of the threshold's score would in the place of the
/// best one, so that the octave it lies in does not decide whether there is one.
fn emission(candidates: &[Candidate], state: usize) -> f64 {
    if state < CANDIDATES {
        return candidates.get(state).map_or(f64::INFINITY, |c| c.cost);
    }
    let best = candidates.iter().max_by(|a, b| a.score.total_cmp(&b.score));
    best.map_or(0.0, |c| c.cost + c.score.max(1e-6).ln() - NO_PITCH_SCORE.ln())
}

/// Cost of going from a state of one instant to a state of the next.
fn transition(before: &[Candidate], from: usize, now: &[Candidate], to: usize) -> f64 {
    match (before.get(from), now.get(to)) {
        (Some(a), Some(b)) => {
            let cents = crate::stiff::CENTS_PER_NEPER * (b.hz / a.hz).ln().abs();
            (MOVE_COST * (cents - FREE_CENTS)).clamp(0.0, JUMP_COST)
        }
        (None, None) => 0.0,
        _ => VOICING_COST,
    }
}
