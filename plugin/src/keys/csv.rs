//! The key sheet as CSV, in the columns of the command line's: numbers with all their digits, what there is none of left
//! empty.

use plumbtone_analysis::tuning::Tuning;

use super::row::Row;

const HEAD: &str = "key,midi,told,length_s,f0_hz,cents,f0_sd_cents,inharmonicity_b,inharmonicity_sd,tilt_db_per_octave,level_dbfs,settling_s,alias_hz,alias_partial,alias_relative_db,alias_over_mask_db";

/// All of it; cents are against a tuning.
pub(crate) fn text(rows: &[Row], tuning: &Tuning) -> String {
    let lines = rows.iter().map(|row| line(row, tuning));
    [HEAD.to_owned()].into_iter().chain(lines).flat_map(|line| [line, "\n".to_owned()]).collect()
}

fn line(row: &Row, tuning: &Tuning) -> String {
    let alias = row.worst_alias.as_ref();
    [
        row.note().to_string(),
        row.key.to_string(),
        row.told.to_string(),
        row.length_s.to_string(),
        row.f0_hz.to_string(),
        row.cents(tuning).to_string(),
        row.f0_sd_cents.to_string(),
        figure(row.inharmonicity_b),
        figure(row.inharmonicity_sd),
        figure(row.tilt_db_per_octave),
        figure(row.level_dbfs),
        figure(row.settling_s),
        figure(alias.map(|alias| alias.frequency_hz)),
        figure(alias.map(|alias| alias.partial)),
        figure(alias.map(|alias| alias.relative_db)),
        figure(alias.and_then(|alias| alias.over_mask_db)),
    ]
    .join(",")
}

fn figure(value: Option<impl ToString>) -> String {
    value.map_or_else(String::new, |value| value.to_string())
}

#[cfg(test)]
mod tests {
    use super::super::row::fixtures::row;
    use super::*;

    #[test]
    fn every_row_fills_its_columns() {
        let bare = Row { worst_alias: None, settling_s: None, told: false, ..row(70) };
        let text = text(&[row(69), bare], &Tuning::default());
        let columns = |line: &str| line.split(',').count();
        assert!(text.lines().all(|line| columns(line) == columns(HEAD)), "{text}");
        let lines: Vec<&str> = text.lines().collect();
        assert!(lines[1].starts_with("A4,69,true,1.25,440.4"), "{text}");
        assert!(lines[1].ends_with("-18.25,0.03,2999.6,204,-52.5,3.5"), "{text}");
        assert!(lines[2].starts_with("Bb4,70,false,") && lines[2].ends_with(",,,,,"), "{text}");
    }
}
