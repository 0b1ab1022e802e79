//! Reads what is sound of the stored results: an old or damaged session loses no more than what is broken of it.

use serde_json::{Map, Value};

use super::result::CheckResult;
use super::results::{FORMAT, Reports, Stored, TEXT_MAX};
use crate::stored;

/// What the settings are of.
const CHECKS: &str = "checks";

/// Reads a stored form, piece by piece; says what could not be used.
pub(crate) fn read(text: Option<&str>, findings: &mut Vec<String>) -> Stored {
    let mut kept = Stored::default();
    let Some(text) = text else { return kept };
    let what = "the results of the checks";
    let Some(fields) = stored::open(text, what, ("format", FORMAT), findings) else { return kept };
    if let Some(every_pass) = stored::boolean(&fields, ("every_pass", CHECKS), findings) {
        kept.every_pass = every_pass;
    }
    if let Some(left_out) = fields.get("left_out").and_then(Value::as_u64) {
        kept.left_out = left_out;
    }
    match fields.get("reports") {
        Some(Value::Object(reports)) => kept.reports = reports_from(reports, findings),
        None => {}
        Some(_) => findings.push("the stored settings of reports cannot be used".to_owned()),
    }
    take(stored::list(&fields, "results", findings), &mut kept, findings);
    kept
}

fn take(results: &[Value], stored: &mut Stored, findings: &mut Vec<String>) {
    let mut broken = 0;
    for value in results {
        let known = |number| stored.results.iter().any(|r: &CheckResult| r.number == number);
        match serde_json::from_value::<CheckResult>(value.clone()) {
            Ok(result) if result.is_sound() && !known(result.number) => stored.results.push(result),
            _ => broken += 1,
        }
    }
    if broken > 0 {
        findings.push(format!("{broken} of {} results of checks were damaged", results.len()));
    }
    stored.shorten();
}

fn reports_from(fields: &Map<String, Value>, findings: &mut Vec<String>) -> Reports {
    let mut reports = Reports::default();
    if let Some(automatic) = stored::boolean(fields, ("automatic", CHECKS), findings) {
        reports.automatic = automatic;
    }
    for (name, to) in [("folder", &mut reports.folder), ("name", &mut reports.name)] {
        match fields.get(name) {
            Some(Value::String(text)) if text.chars().count() <= TEXT_MAX => to.clone_from(text),
            None => {}
            Some(_) => findings.push(format!("the stored {name} of reports cannot be used")),
        }
    }
    reports
}

#[cfg(test)]
mod tests {
    use super::super::fixtures::result;
    use super::*;

    fn stored(results: usize) -> Stored {
        let results = (0..results)
            .map(|k| CheckResult { number: k as u64 + 1, ..result(k as f64, k as f64 + 0.7) })
            .collect();
        Stored { results, ..Stored::default() }
    }

    #[test]
    fn what_was_stored_is_read_back_bit_for_bit() {
        let mut before = stored(20);
        before.every_pass = true;
        before.reports.folder = "a \"quoted\" folder".to_owned();
        let text = serde_json::to_string(&before).unwrap();
        let mut findings = Vec::new();
        assert_eq!(read(Some(&text), &mut findings), before, "{text}");
        assert_eq!(findings, Vec::<String>::new(), "{text}");
    }

    #[test]
    fn results_of_older_sessions_have_no_curve_and_load() {
        let mut old = serde_json::to_value(stored(3)).unwrap();
        for result in old["results"].as_array_mut().unwrap() {
            result.as_object_mut().unwrap().remove("curve").unwrap();
        }
        let mut findings = Vec::new();
        let found = read(Some(&old.to_string()), &mut findings);
        assert_eq!(findings, Vec::<String>::new(), "nothing is missing");
        assert_eq!(found.results.len(), 3, "results");
        assert!(found.results.iter().all(|result| result.curve.is_none()), "{found:?}");
    }

    #[test]
    fn the_newest_results_keep_their_curves_and_sessions_stay_small() {
        let results = (0..200).map(|k| CheckResult {
            number: k + 1,
            ..result(10.0 * k as f64, 10.0 * k as f64 + 9.0)
        });
        let text =
            serde_json::to_string(&Stored { results: results.collect(), ..Stored::default() });
        let found = read(Some(&text.unwrap()), &mut Vec::new());
        let kept: Vec<bool> = found.results.iter().map(|result| result.curve.is_some()).collect();
        let first = kept.iter().position(|kept| *kept).unwrap();
        assert!(first > 100 && kept[first..].iter().all(|kept| *kept), "{kept:?}");
        let size = serde_json::to_string(&found).unwrap().len();
        assert!(size < 600_000, "{size} bytes");
    }

    #[test]
    fn what_is_damaged_goes_and_the_rest_stays() {
        let text = serde_json::to_string(&stored(3)).unwrap();
        for (sound, damaged, left) in [
            ("\"start_s\":1.0", "\"start_s\":9.0", 2),
            ("\"verdict\":\"outside\"", "\"verdict\":\"nice\"", 2),
            ("\"number\":2", "\"number\":1", 2),
            ("\"tolerance_cents\":5.0", "\"tolerance_cents\":null", 2),
            ("\"every_pass\":false", "\"every_pass\":3", 3),
            ("\"format\":1", "\"format\":9", 3),
            ("\"automatic\":false", "\"automatic\":{}", 3),
            ("\"results\":[", "\"results\":7,\"others\":[", 0),
        ] {
            let changed = text.replacen(sound, damaged, 1);
            assert_ne!(changed, text, "{sound} is there");
            let mut findings = Vec::new();
            let found = read(Some(&changed), &mut findings);
            assert_eq!(found.results.len(), left, "{damaged}: {findings:?}");
            assert_eq!(findings.len(), 1, "{damaged}: {findings:?}");
        }
        for cut in 0..text.len() {
            let mut findings = Vec::new();
            let found = read(text.get(..cut), &mut findings);
            assert_eq!((found.results.len(), findings.len()), (0, 1), "cut at {cut}");
        }
    }

    #[test]
    fn the_oldest_go_when_there_are_too_many() {
        let text = serde_json::to_string(&stored(300)).unwrap();
        let found = read(Some(&text), &mut Vec::new());
        assert_eq!((found.results.len(), found.left_out), (256, 44), "results, and left out");
        assert_eq!(found.results[0].number, 45, "the newest stay");
    }
}
