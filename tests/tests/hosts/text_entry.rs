//! Parameters as text, through the host's interface.

use crate::rig::instance;

#[test]
fn parameters_are_named_and_grouped() {
    let found = instance().parameters().expect("parameters");
    let named: Vec<(&str, &str)> =
        found.iter().map(|(_, name, group)| (name.as_str(), group.as_str())).collect();
    let expected = [
        ("Concert pitch", "Tuning"),
        ("Temperament", "Tuning"),
        ("Channel", "Analysis"),
        ("Lowest pitch", "Analysis"),
        ("Highest pitch", "Analysis"),
        ("Integration time", "Analysis"),
        ("Partials", "Analysis"),
        ("Freeze", "Analysis"),
        ("Capture", "Analysis"),
        ("Check", "Check"),
        ("Tolerance", "Check"),
        ("Reference", "Check"),
        ("Reference pitch", "Check"),
        ("MIDI output", "MIDI"),
        ("MIDI number", "MIDI"),
        ("MIDI channel", "MIDI"),
    ];
    assert_eq!(named, expected, "all ids: {found:?}");
}

#[test]
fn notes_frequencies_and_cents_are_understood() {
    let mut instance = instance();
    for (name, text, same_as) in [
        ("Reference pitch", "A3", "220 Hz"),
        ("Reference pitch", "A4 +1200 ct", "0.88 kHz"),
        ("Concert pitch", "0 ct", "440 Hz"),
        ("Tolerance", "5 cents", "5"),
        ("Integration time", "0.4 s", "400 ms"),
    ] {
        let (_, a) = instance.value(name, text).expect("a value");
        let (_, b) = instance.value(name, same_as).expect("a value");
        assert!((a - b).abs() < 1e-6, "{name}: {text} is {a}, {same_as} is {b}");
    }
    for (name, text) in [("Reference pitch", "loud"), ("Tolerance", "A3"), ("Concert pitch", "")] {
        assert!(instance.value(name, text).is_err(), "{name} took {text:?}");
    }
}
