//! The project's figures on recorded instruments.

use plumbtone_tests::recorded::{FamilyScore, Score, bank_path, recordings, score};

/// Frames off by more than 50 cents. The figure to reach is 0.5; three sounds (a kettledrum, a blown bottle, a choir of many
/// voices) make up most of the rest.
const WRONG_PERCENT: f64 = 0.75;
/// Recordings misread. The figure to reach is 0; a tubular bell, whose strike tone is no line of its own, gets no pitch, and
/// a kettledrum another one than the bank states.
const MISREAD: usize = 2;

#[test]
fn recorded_instruments_are_read_at_their_stated_pitch() {
    let Some(recordings) = recordings().unwrap() else {
        let missing = format!("no sound bank at {}", bank_path().display());
        assert!(std::env::var_os("CI").is_none(), "{missing}, and CI does not skip it");
        eprintln!("skipped: {missing}; `cargo xtask test` fetches it");
        return;
    };
    let scores = score(&recordings).unwrap();
    let judged: Vec<&Score> = scores.iter().filter(|score| !score.disputed).collect();
    let sum = FamilyScore::of(judged.iter().copied());
    let figures = [
        ("wrong frames", sum.percent(sum.wrong), WRONG_PERCENT),
        ("frames without an answer", sum.percent(sum.unanswered), 1.0),
        ("wrong frames claimed with confidence", sum.percent(sum.claimed), 0.1),
    ];
    assert!(sum.recordings >= 300, "most of the bank's samples are judged: {}", sum.recordings);
    for (name, percent, most) in figures {
        assert!(percent <= most, "{name}: {percent:.3} %, to reach {most} %; {}", worst(&judged));
    }
    assert!(sum.misread <= MISREAD, "{} recordings misread; {}", sum.misread, worst(&judged));
}

fn worst(scores: &[&Score]) -> String {
    let mut bad: Vec<&&Score> = scores.iter().filter(|s| s.misread() || s.wrong > 0).collect();
    bad.sort_by_key(|score| std::cmp::Reverse((score.misread(), score.wrong)));
    let shown = bad.iter().take(10).map(|score| {
        let Score { name, f0_hz, wrong, frames, note_cents, .. } = score;
        format!("{name} ({f0_hz:.1} Hz): {wrong} of {frames} frames, note {note_cents:?} cents off")
    });
    format!("worst:\n  {}", shown.collect::<Vec<_>>().join("\n  "))
}
