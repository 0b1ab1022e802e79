//! Reads what is sound of a stored key sheet: an old or damaged session loses no more than what is broken of it.

use serde_json::Value;

use super::row::Row;
use super::sheet::{FORMAT, Stored};
use crate::stored;

/// Reads a stored form, piece by piece; says what could not be used.
pub(crate) fn read(text: Option<&str>, findings: &mut Vec<String>) -> Stored {
    let mut sheet = Stored::default();
    let Some(text) = text else { return sheet };
    let fields = stored::open(text, "the key sheet", ("format", FORMAT), findings);
    let Some(fields) = fields else { return sheet };
    if let Some(unplayed) = stored::boolean(&fields, ("unplayed", "keys"), findings) {
        sheet.unplayed = unplayed;
    }
    take(stored::list(&fields, "rows", findings), &mut sheet, findings);
    sheet
}

fn take(rows: &[Value], stored: &mut Stored, findings: &mut Vec<String>) {
    let mut broken = 0;
    for value in rows {
        match serde_json::from_value::<Row>(value.clone()) {
            Ok(row) if row.is_sound() && stored.rows.iter().all(|r| r.key != row.key) => {
                stored.put(row);
            }
            _ => broken += 1,
        }
    }
    if broken > 0 {
        findings.push(format!("{broken} of {} rows of keys were damaged", rows.len()));
    }
}

#[cfg(test)]
mod tests {
    use super::super::row::fixtures::row;
    use super::*;

    fn stored(keys: impl Iterator<Item = u8>) -> Stored {
        Stored { unplayed: true, rows: keys.map(row).collect(), ..Stored::default() }
    }

    #[test]
    fn what_was_stored_is_read_back_bit_for_bit() {
        for keys in [0..0, 60..73, 0..128] {
            let before = stored(keys);
            let text = serde_json::to_string(&before).unwrap();
            let mut findings = Vec::new();
            assert_eq!(read(Some(&text), &mut findings), before, "{text}");
            assert_eq!(findings, Vec::<String>::new(), "{text}");
        }
    }

    #[test]
    fn what_is_damaged_goes_and_the_rest_stays() {
        let text = serde_json::to_string(&stored(60..63)).unwrap();
        for (sound, damaged, left) in [
            ("\"key\":61", "\"key\":60", 2),
            ("\"key\":61", "\"key\":200", 2),
            ("\"f0_sd_cents\":0.02", "\"f0_sd_cents\":-1.0", 2),
            ("\"f0_sd_cents\":0.02", "\"f0_sd_cents\":null", 2),
            ("\"partial\":204", "\"partial\":-4", 2),
            ("\"length_s\":1.25", "\"length_s\":0.0", 2),
            ("\"unplayed\":true", "\"unplayed\":3", 3),
            ("\"format\":1", "\"format\":9", 3),
            ("\"rows\":[", "\"rows\":7,\"others\":[", 0),
        ] {
            let changed = text.replacen(sound, damaged, 1);
            assert_ne!(changed, text, "{sound} is there");
            let mut findings = Vec::new();
            let found = read(Some(&changed), &mut findings);
            assert_eq!(found.rows.len(), left, "{damaged}: {findings:?}");
            assert_eq!(findings.len(), 1, "{damaged}: {findings:?}");
        }
        for cut in 0..text.len() {
            let mut findings = Vec::new();
            let found = read(text.get(..cut), &mut findings);
            assert_eq!((found.rows.len(), findings.len()), (0, 1), "cut at {cut}");
        }
    }

    #[test]
    fn rows_are_put_in_order_and_there_are_never_more_than_keys() {
        let mut before = stored(60..63);
        before.rows.reverse();
        let twice = [before.rows.clone(), before.rows.clone()].concat();
        let text = serde_json::to_string(&Stored { rows: twice, ..before }).unwrap();
        let mut findings = Vec::new();
        let keys: Vec<u8> = read(Some(&text), &mut findings).rows.iter().map(|r| r.key).collect();
        assert_eq!(keys, [60, 61, 62], "{findings:?}");
    }
}
