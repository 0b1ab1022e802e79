//! What a session stores: the parameters and the part that is none, checked piece by piece when it is loaded.
//!
//! What is sound is loaded, what is not takes its default, and the editor is told which that was.

use std::sync::{Mutex, MutexGuard, PoisonError};

use nice_plug::params::persist::PersistentField;
use nice_plug::plugin::ParamValue;
use nice_plug::prelude::*;
use serde::{Deserialize, Serialize};
use serde_json::Value;

use crate::editor::Theme;
use crate::keys;
use crate::parameters::Parameters;
use crate::stored;
use crate::{captures, check};

/// Version of the part that is no parameter. A newer one is read as far as it is understood.
const FORMAT: u64 = 1;
/// Smallest and largest zoom of the editor.
const ZOOM: (f64, f64) = (0.5, 3.0);
/// Shortest and longest side of its window, in points.
const SIDE: (f64, f64) = (100.0, 20_000.0);
/// Keys of the persistent fields.
const KEPT: &str = "kept";
const CHECKS: &str = "checks";
const KEYS: &str = "keys";
const CAPTURES: &str = "captures";
const UNSOUND: &str = "unsound";

/// The part of the state that is no parameter.
#[derive(Debug, Default)]
pub struct Kept(Mutex<KeptFields>);

/// The stored form of [`Kept`].
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct KeptFields {
    format: u64,
    /// Zoom of the editor.
    zoom: f64,
    /// Name of its theme.
    theme: String,
    /// Width and height of its window in points, once it was resized.
    size: Option<(f64, f64)>,
}

/// What of the last loaded state was unsound, in words; never stored.
#[derive(Debug, Default)]
pub struct Unsound(Mutex<Vec<String>>);

/// The form in which findings reach [`Unsound`] from [`filter`].
#[derive(Debug, Default, Serialize, Deserialize)]
#[serde(transparent)]
pub struct Findings(Vec<String>);

impl Default for KeptFields {
    fn default() -> Self {
        Self { format: FORMAT, zoom: 1.0, theme: Theme::default().name().to_owned(), size: None }
    }
}

impl Kept {
    /// Zoom of the editor.
    pub fn zoom(&self) -> f64 {
        lock(&self.0).zoom
    }

    /// Keeps the zoom of the editor.
    pub fn set_zoom(&self, zoom: f64) {
        lock(&self.0).zoom = zoom.clamp(ZOOM.0, ZOOM.1);
    }
}

impl Kept {
    /// Size of the editor's window in points, if it was resized.
    pub fn size(&self) -> Option<(f64, f64)> {
        lock(&self.0).size
    }

    /// Keeps the size of the editor's window.
    pub fn set_size(&self, width: f64, height: f64) {
        lock(&self.0).size = Some((width, height)).filter(fits);
    }
}

/// Whether a window can have a size.
fn fits(&(width, height): &(f64, f64)) -> bool {
    [width, height].into_iter().all(|side| side >= SIDE.0 && side <= SIDE.1)
}

impl Kept {
    /// Theme of the editor.
    pub fn theme(&self) -> Theme {
        Theme::named(&lock(&self.0).theme).unwrap_or_default()
    }

    /// Keeps the theme of the editor.
    pub fn set_theme(&self, theme: Theme) {
        theme.name().clone_into(&mut lock(&self.0).theme);
    }
}

impl Unsound {
    /// One sentence for each thing that was unsound.
    pub fn findings(&self) -> Vec<String> {
        lock(&self.0).clone()
    }
}

impl<'a> PersistentField<'a, KeptFields> for Kept {
    fn set(&self, new_value: KeptFields) {
        *lock(&self.0) = new_value;
    }

    fn map<F: Fn(&KeptFields) -> R, R>(&self, f: F) -> R {
        f(&lock(&self.0))
    }
}

impl<'a> PersistentField<'a, Findings> for Unsound {
    fn set(&self, Findings(new_value): Findings) {
        *lock(&self.0) = new_value;
    }

    fn map<F: Fn(&Findings) -> R, R>(&self, f: F) -> R {
        f(&Findings::default())
    }
}

/// Makes a stored state sound: each value that cannot be used, and each that is missing, becomes its default.
pub(crate) fn filter(state: &mut PluginState) {
    let mut findings = Vec::new();
    let known = known(&Parameters::default());
    state.params.retain(|id, value| {
        let parameter = known.iter().find(|parameter| parameter.id == id);
        let sound = parameter.is_some_and(|parameter| parameter.takes(value));
        if !sound {
            findings.push(match parameter {
                Some(_) => format!("{id} was {value:?} and is at its default now"),
                None => format!("{id} is unknown to this version and was left out"),
            });
        }
        sound
    });
    for parameter in known {
        state.params.entry(parameter.id.to_owned()).or_insert(parameter.default);
    }
    let kept = kept_from(state.fields.get(KEPT).map(String::as_str), &mut findings);
    if let Ok(kept) = serde_json::to_string(&kept) {
        state.fields.insert(KEPT.to_owned(), kept);
    }
    let checks = check::read(state.fields.get(CHECKS).map(String::as_str), &mut findings);
    if let Ok(checks) = serde_json::to_string(&checks) {
        state.fields.insert(CHECKS.to_owned(), checks);
    }
    let keys = keys::read(state.fields.get(KEYS).map(String::as_str), &mut findings);
    if let Ok(keys) = serde_json::to_string(&keys) {
        state.fields.insert(KEYS.to_owned(), keys);
    }
    let captures = captures::read(state.fields.get(CAPTURES).map(String::as_str), &mut findings);
    if let Ok(captures) = serde_json::to_string(&captures) {
        state.fields.insert(CAPTURES.to_owned(), captures);
    }
    if let Ok(findings) = serde_json::to_string(&Findings(findings)) {
        state.fields.insert(UNSOUND.to_owned(), findings);
    }
}

/// Reads what is sound of the kept part.
fn kept_from(text: Option<&str>, findings: &mut Vec<String>) -> KeptFields {
    let mut kept = KeptFields::default();
    let Some(text) = text else { return kept };
    let what = "what is kept beside the parameters";
    let fields = stored::open(text, what, ("format", FORMAT), findings);
    let Some(fields) = fields else { return kept };
    match fields.get("zoom").map(Value::as_f64) {
        Some(Some(zoom)) if zoom >= ZOOM.0 && zoom <= ZOOM.1 => kept.zoom = zoom,
        None => {}
        Some(_) => findings.push("the stored zoom cannot be used".to_owned()),
    }
    match fields.get("theme").map(|theme| theme.as_str().and_then(Theme::named)) {
        Some(Some(theme)) => theme.name().clone_into(&mut kept.theme),
        None => {}
        Some(None) => findings.push("the stored theme cannot be used".to_owned()),
    }
    match fields.get("size") {
        None | Some(Value::Null) => {}
        Some(size) => {
            kept.size = serde_json::from_value(size.clone()).ok().filter(fits);
            if kept.size.is_none() {
                findings.push("the stored size of the editor cannot be used".to_owned());
            }
        }
    }
    kept
}

/// What is known of a parameter.
struct Known {
    id: &'static str,
    kind: Kind,
    default: ParamValue,
}

enum Kind {
    Float(f32, f32),
    Int(i32, i32),
    Bool,
    Choice(&'static [&'static str]),
}

impl Known {
    /// Whether a stored value is one the parameter can take.
    fn takes(&self, value: &ParamValue) -> bool {
        match (&self.kind, value) {
            (Kind::Float(low, high), ParamValue::F32(x)) => x >= low && x <= high,
            (Kind::Int(low, high), ParamValue::I32(x)) => x >= low && x <= high,
            (Kind::Bool, ParamValue::Bool(_)) => true,
            (Kind::Choice(ids), ParamValue::String(id)) => ids.contains(&id.as_str()),
            _ => false,
        }
    }
}

fn known(parameters: &Parameters) -> Vec<Known> {
    let Parameters { tuning, analysis, check, midi, .. } = parameters;
    vec![
        float("concert_pitch", &tuning.concert_pitch),
        choice("temperament", &tuning.temperament),
        choice("channel", &analysis.channel),
        float("lowest", &analysis.lowest),
        float("highest", &analysis.highest),
        float("integration", &analysis.integration),
        int("partials", &analysis.partials),
        boolean("freeze", &analysis.freeze),
        boolean("capture", &analysis.capture),
        boolean("check", &check.check),
        float("tolerance", &check.tolerance),
        choice("reference", &check.reference),
        float("reference_pitch", &check.reference_pitch),
        choice("midi_output", &midi.output),
        int("midi_number", &midi.number),
        int("midi_channel", &midi.channel),
    ]
}

fn float(id: &'static str, parameter: &FloatParam) -> Known {
    let range = parameter.range();
    Known {
        id,
        kind: Kind::Float(range.unnormalize(0.0), range.unnormalize(1.0)),
        default: ParamValue::F32(parameter.default_plain_value()),
    }
}

fn int(id: &'static str, parameter: &IntParam) -> Known {
    let range = parameter.range();
    Known {
        id,
        kind: Kind::Int(range.unnormalize(0.0), range.unnormalize(1.0)),
        default: ParamValue::I32(parameter.default_plain_value()),
    }
}

fn boolean(id: &'static str, parameter: &BoolParam) -> Known {
    Known { id, kind: Kind::Bool, default: ParamValue::Bool(parameter.default_plain_value()) }
}

fn choice<E: Enum + PartialEq>(id: &'static str, parameter: &EnumParam<E>) -> Known {
    let ids = E::ids().unwrap_or_default();
    let default = ids[parameter.default_plain_value().to_index()];
    Known { id, kind: Kind::Choice(ids), default: ParamValue::String(default.to_owned()) }
}

fn lock<T>(mutex: &Mutex<T>) -> MutexGuard<'_, T> {
    mutex.lock().unwrap_or_else(PoisonError::into_inner)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn stored(params: &[(&str, ParamValue)], kept: Option<&str>) -> PluginState {
        PluginState {
            version: String::new(),
            params: params.iter().map(|(id, value)| ((*id).to_owned(), value.clone())).collect(),
            fields: kept.map(|kept| (KEPT.to_owned(), kept.to_owned())).into_iter().collect(),
        }
    }

    fn findings(state: &PluginState) -> Vec<String> {
        serde_json::from_str::<Findings>(&state.fields[UNSOUND]).unwrap().0
    }

    #[test]
    fn every_parameter_is_known() {
        let parameters = Parameters::default();
        let known: Vec<&str> = known(&parameters).iter().map(|known| known.id).collect();
        let ids: Vec<String> = parameters.param_map().into_iter().map(|(id, ..)| id).collect();
        assert_eq!(known, ids, "what is not known is not loaded");
    }

    #[test]
    fn a_sound_state_passes_unchanged() {
        let mut state = stored(
            &[("concert_pitch", ParamValue::F32(415.0)), ("partials", ParamValue::I32(8))],
            Some(r#"{"format":1,"zoom":1.5,"theme":"light","size":[1300.0,900.0]}"#),
        );
        filter(&mut state);
        assert!(matches!(state.params["concert_pitch"], ParamValue::F32(415.0)), "{state:?}");
        assert!(matches!(state.params["partials"], ParamValue::I32(8)), "{state:?}");
        let kept = r#"{"format":1,"zoom":1.5,"theme":"light","size":[1300.0,900.0]}"#;
        assert_eq!(state.fields[KEPT], kept, "{state:?}");
        assert_eq!(findings(&state), Vec::<String>::new(), "{state:?}");
    }

    #[test]
    fn an_old_state_gets_defaults_for_what_it_lacks() {
        let mut state = stored(&[("concert_pitch", ParamValue::F32(415.0))], None);
        filter(&mut state);
        assert_eq!(state.params.len(), known(&Parameters::default()).len(), "{state:?}");
        assert_eq!(findings(&state), Vec::<String>::new(), "{state:?}");
    }

    #[test]
    fn what_is_damaged_is_told_and_the_rest_is_loaded() {
        for (id, value) in [
            ("concert_pitch", ParamValue::F32(f32::INFINITY)),
            ("concert_pitch", ParamValue::F32(1.0)),
            ("concert_pitch", ParamValue::Bool(true)),
            ("temperament", ParamValue::String("bent".to_owned())),
            ("partials", ParamValue::I32(-1)),
            ("loudness", ParamValue::F32(0.0)),
        ] {
            let mut state =
                stored(&[(id, value.clone()), ("tolerance", ParamValue::F32(7.0))], None);
            filter(&mut state);
            let found = findings(&state);
            assert_eq!(found.len(), 1, "{id} {value:?}: {found:?}");
            assert!(found[0].contains(id), "{id} {value:?}: {found:?}");
            assert!(matches!(state.params["tolerance"], ParamValue::F32(7.0)), "{id} {value:?}");
        }
        for kept in [
            "",
            "null",
            "[1]",
            r#"{"format":1,"zoom":"large"}"#,
            r#"{"format":1,"zoom":9}"#,
            r#"{"format":1,"theme":"plaid"}"#,
            r#"{"format":1,"size":[1300]}"#,
            r#"{"format":1,"size":[1300,-2]}"#,
            r#"{"zoom":1}"#,
            r#"{"format":7,"zoom":1}"#,
        ] {
            let mut state = stored(&[], Some(kept));
            filter(&mut state);
            assert_eq!(findings(&state).len(), 1, "{kept}: {:?}", findings(&state));
        }
    }
}
