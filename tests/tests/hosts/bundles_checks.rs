//! Drift checks of the VST3 bundle in the host dawdreamer: its automation switches Check on and off over a session that
//! plays, and each stretch ends in the verdict that the engine alone has.

use std::fs;
use std::path::Path;
use std::process::Command;

use plumbtone_plugin::check::{CheckResult, VerdictWord};

use crate::bundles::{target, there};
use crate::checks::{alone, sound, texts};

const RATE: f64 = 48_000.0;
/// Quarter notes a minute; the host plays in 4/4.
const TEMPO: f64 = 90.0;
/// Where Check goes on and off, in samples: the host automates block by block, here of 512. Within, outside, under a
/// vibrato, and the outside stretch cut short.
const LANE: [(usize, usize); 4] =
    [(24_064, 119_808), (131_072, 199_680), (204_800, 262_144), (288_256, 416_256)];

#[test]
fn an_automated_lane_in_dawdreamer_ends_in_the_verdicts_of_its_stretches() {
    let what = "the check lane in dawdreamer";
    let bundle = there(target().join("bundled/Plumbtone.vst3"), what);
    let python = there(target().join("vst3-hosts/bin/python"), what);
    let (Some(bundle), Some(python)) = (bundle, python) else { return };
    let folder = tempfile::TempDir::new().expect("a temporary folder");
    let sound = sound();
    let samples = folder.path().join("sound.f32");
    let bytes: Vec<u8> = sound.iter().flat_map(|sample| sample.to_le_bytes()).collect();
    fs::write(&samples, bytes).expect("the sound is written");
    let script = Path::new(env!("CARGO_MANIFEST_DIR")).join("hosts/vst3_hosts.py");
    let output = Command::new(python)
        .arg(script)
        .args(["dawdreamer", "lane"])
        .args([&bundle, &samples])
        .args([RATE.to_string(), TEMPO.to_string()])
        .arg(folder.path())
        .args(LANE.map(|(on, off)| format!("{on}-{off}")))
        .output()
        .expect("the host starts");
    let errors = String::from_utf8_lossy(&output.stderr);
    assert!(output.status.success(), "{}{errors}", String::from_utf8_lossy(&output.stdout));
    let of = |render: &str| {
        let place = folder.path().join(render);
        let results = fs::read_to_string(place.join("results.json")).expect("results");
        fs::remove_file(place.join("results.json")).expect("they were there");
        (serde_json::from_str::<Vec<CheckResult>>(&results).expect("results"), texts(&place))
    };
    let (results, report) = of("1");
    judge(&sound, &results);
    assert_eq!(report.len(), 3, "a report with each bounce: {report:?}");
    let again = of("2");
    assert_eq!(again.0, results, "the same results again");
    // Reports name the folder nowhere, so only the time could differ.
    assert_eq!(again.1, report, "the same report again but for its time");
}

fn judge(sound: &[f32], results: &[CheckResult]) {
    let verdicts: Vec<VerdictWord> = results.iter().map(|result| result.verdict).collect();
    let (within, outside) = (VerdictWord::Within, VerdictWord::Outside);
    assert_eq!(verdicts, [within, outside, outside, within], "{results:#?}");
    for (result, (on, off)) in results.iter().zip(LANE) {
        let extent = result.extent;
        let samples = [extent.start_sample, extent.end_sample];
        let expected = [on, off].map(|at| i64::try_from(at).expect("a position"));
        assert_eq!(samples, expected, "the session begins with the render");
        let (bar, beat) = (extent.start_bar.expect("a bar"), extent.start_beat.expect("a beat"));
        let beats = 4.0 * (bar - 1) as f64 + beat - 1.0;
        let told_s = beats * 60.0 / TEMPO;
        assert!((told_s - on as f64 / RATE).abs() < 1e-3, "{bar}|{beat} at sample {on}");
        let alone = alone(sound, (on, off));
        assert_eq!(result.worst_cents, alone.worst_cents, "as the check alone has it");
        assert_eq!(result.mean_cents, alone.mean_cents, "as the check alone has it");
        let spans: Vec<_> = result
            .spans
            .iter()
            .map(|span| (span.extent.start_sample, span.extent.end_sample))
            .collect();
        let position = |at: u64| i64::try_from(at).expect("a position");
        let expected: Vec<_> =
            alone.spans.iter().map(|span| (position(span.start), position(span.end))).collect();
        assert_eq!(spans, expected, "spans as the check alone has them");
    }
}
