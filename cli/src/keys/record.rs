//! A row of the key sheet as it is written down.

use crate::measure::Timebase;
use crate::output::csv::{Column, figure};
use plumbtone_analysis::keys::{AliasHeard, KeyRow};
use plumbtone_analysis::tuning::NoteName;
use serde::Serialize;

/// One note of the sheet.
#[derive(Debug, Clone, Serialize)]
pub(crate) struct KeyRecord {
    pub(crate) key: String,
    pub(crate) file: String,
    pub(crate) start_s: f64,
    pub(crate) end_s: f64,
    pub(crate) f0_hz: f64,
    pub(crate) cents: f64,
    pub(crate) f0_sd_cents: f64,
    pub(crate) inharmonicity_b: Option<f64>,
    pub(crate) inharmonicity_sd: Option<f64>,
    pub(crate) tilt_db_per_octave: Option<f64>,
    pub(crate) level_dbfs: Option<f64>,
    pub(crate) settling_s: Option<f64>,
    pub(crate) worst_alias: Option<AliasRecord>,
    /// For sorting.
    #[serde(skip)]
    pub(crate) note: NoteName,
}

/// The alias of a note that stands out most.
#[derive(Debug, Clone, Serialize)]
pub(crate) struct AliasRecord {
    pub(crate) frequency_hz: f64,
    pub(crate) partial: u32,
    pub(crate) folds: u32,
    pub(crate) relative_db: f64,
    pub(crate) over_mask_db: Option<f64>,
}

/// The columns of the CSV.
pub(super) const COLUMNS: &[Column<KeyRecord>] = &[
    ("key", |_, row| row.key.clone()),
    ("file", |_, row| row.file.clone()),
    ("start_s", |_, row| row.start_s.to_string()),
    ("end_s", |_, row| row.end_s.to_string()),
    ("f0_hz", |_, row| row.f0_hz.to_string()),
    ("cents", |_, row| row.cents.to_string()),
    ("f0_sd_cents", |_, row| row.f0_sd_cents.to_string()),
    ("inharmonicity_b", |_, row| figure(row.inharmonicity_b)),
    ("inharmonicity_sd", |_, row| figure(row.inharmonicity_sd)),
    ("tilt_db_per_octave", |_, row| figure(row.tilt_db_per_octave)),
    ("level_dbfs", |_, row| figure(row.level_dbfs)),
    ("settling_s", |_, row| figure(row.settling_s)),
    ("alias_hz", |_, row| figure(row.worst_alias.as_ref().map(|a| a.frequency_hz))),
    ("alias_partial", |_, row| {
        row.worst_alias.as_ref().map(|a| a.partial.to_string()).unwrap_or_default()
    }),
    ("alias_relative_db", |_, row| figure(row.worst_alias.as_ref().map(|a| a.relative_db))),
    ("alias_over_mask_db", |_, row| figure(row.worst_alias.as_ref().and_then(|a| a.over_mask_db))),
];

impl KeyRecord {
    /// A row; the file's name is known later.
    pub(super) fn new(row: &KeyRow, timebase: Timebase) -> Self {
        let finite = |x: f64| x.is_finite().then_some(x);
        let alias = |a: AliasHeard| AliasRecord {
            frequency_hz: a.frequency_hz,
            partial: a.partial,
            folds: a.folds,
            relative_db: a.relative_db,
            over_mask_db: finite(a.over_mask_db),
        };
        Self {
            key: row.key.to_string(),
            file: String::new(),
            start_s: timebase.seconds(row.start),
            end_s: timebase.seconds(row.end),
            f0_hz: row.f0_hz,
            cents: row.cents,
            f0_sd_cents: row.f0_sd_cents,
            inharmonicity_b: row.stretch.map(|s| s.0),
            inharmonicity_sd: row.stretch.map(|s| s.1),
            tilt_db_per_octave: row.tilt_db_per_octave,
            level_dbfs: finite(row.level_dbfs),
            settling_s: row.settling_s,
            worst_alias: row.alias.map(alias),
            note: row.key,
        }
    }
}
