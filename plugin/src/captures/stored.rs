//! Reads what is sound of stored captures: an old or damaged session, or a file that somebody edited, loses no more than what
//! is broken of it.

use serde_json::Value;

use super::{CAPTURES_MAX, Capture, FORMAT, Kept};
use crate::stored;

/// Reads a stored form, piece by piece; says what could not be used.
pub(crate) fn read(text: Option<&str>, findings: &mut Vec<String>) -> Kept {
    let mut kept = Kept::default();
    let Some(text) = text else { return kept };
    let format = ("plumbtone_captures", FORMAT);
    if let Some(fields) = stored::open(text, "the captures", format, findings) {
        take(stored::list(&fields, "captures", findings), &mut kept.captures, findings);
    }
    kept
}

fn take(captures: &[Value], kept: &mut Vec<Capture>, findings: &mut Vec<String>) {
    let (mut broken, mut surplus) = (0, 0);
    for value in captures {
        let known = |number| kept.iter().any(|capture: &Capture| capture.number == number);
        match serde_json::from_value::<Capture>(value.clone()) {
            Ok(capture) if capture.is_sound() && !known(capture.number) => {
                if kept.len() < CAPTURES_MAX {
                    kept.push(capture);
                } else {
                    surplus += 1;
                }
            }
            _ => broken += 1,
        }
    }
    if broken > 0 {
        findings.push(format!("{broken} of {} captures were damaged", captures.len()));
    }
    if surplus > 0 {
        findings
            .push(format!("{surplus} captures were more than the {CAPTURES_MAX} that are kept"));
    }
}

#[cfg(test)]
mod tests {
    use super::super::Captures;
    use super::super::capture::tests::capture;
    use super::*;

    fn stored(count: u64) -> String {
        let captures = Captures::default();
        for _ in 0..count {
            captures.add(Some(capture(220.0)));
        }
        captures.json(None)
    }

    #[test]
    fn what_is_damaged_goes_and_the_rest_stays() {
        let text = stored(3);
        for (sound, damaged, left) in [
            ("\"f0_hz\": 220.0", "\"f0_hz\": -1.0", 2),
            ("\"colour\": 1", "\"colour\": 77", 2),
            ("\"number\": 2,\n      \"name\"", "\"number\": 1,\n      \"name\"", 2),
            ("\"note\": \"A3\"", "\"note\": \"H9\"", 2),
            ("\"level_dbfs\": -11.0", "\"level_dbfs\": null", 2),
            ("\"kind\": \"mains\"", "\"kind\": \"ghost\"", 2),
            ("\"confidence\": 0.97", "\"confidence\": 97", 2),
            ("\"plumbtone_captures\": 1", "\"plumbtone_captures\": 9", 3),
            ("\"captures\": [", "\"captures\": 7, \"others\": [", 0),
        ] {
            let changed = text.replacen(sound, damaged, 1);
            assert_ne!(changed, text, "{sound} is there");
            let mut findings = Vec::new();
            let found = read(Some(&changed), &mut findings);
            assert_eq!(found.captures.len(), left, "{damaged}: {findings:?}");
            assert_eq!(findings.len(), 1, "{damaged}: {findings:?}");
        }
        for cut in (0..text.len()).step_by(97) {
            let mut findings = Vec::new();
            let found = read(text.get(..cut), &mut findings);
            assert_eq!((found.captures.len(), findings.len()), (0, 1), "cut at {cut}");
        }
    }

    #[test]
    fn more_than_there_is_room_for_is_said() {
        let text = stored(24);
        let mut found: Value = serde_json::from_str(&text).unwrap();
        let list = found["captures"].as_array_mut().unwrap();
        for k in 0..3u64 {
            let mut more = list[0].clone();
            more["number"] = Value::from(100 + k);
            list.push(more);
        }
        let mut findings = Vec::new();
        let kept = read(Some(&found.to_string()), &mut findings);
        assert_eq!(kept.captures.len(), CAPTURES_MAX);
        assert_eq!(findings, ["3 captures were more than the 24 that are kept"]);
    }
}
