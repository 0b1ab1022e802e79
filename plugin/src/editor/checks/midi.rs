//! What is sent to the note output while a check is outside.

use egui::{Sense, Ui, vec2};
use plumbtone_analysis::tuning::NoteName;

use super::super::field::{self, Bench, Field, Place};
use super::super::knob::Knob;
use super::super::parts::say;
use crate::parameters::{MidiOutput, MidiParameters};
use crate::turns::DELAY_S;

/// Height of a line.
const LINE: f32 = 22.0;

const OUTPUT: Field = Field {
    knob: Knob::MidiOutput,
    caption: "MIDI when outside",
    help: "What is sent to the plugin's MIDI output while a check is outside: nothing, a note that is held, or a controller at 127 (0 afterwards). MIDI that comes in passes through either way.",
    place: Place::Edge,
};

const DETAILS: [Field; 2] = [
    Field {
        knob: Knob::MidiNumber,
        caption: "number",
        help: "Which note or controller, 0 to 127; a note can be typed by its name, such as C4.",
        place: Place::Edge,
    },
    Field {
        knob: Knob::MidiChannel,
        caption: "channel",
        help: "On which MIDI channel, 1 to 16.",
        place: Place::Edge,
    },
];

/// Draws it.
pub(super) fn show(ui: &mut Ui, bench: &mut Bench<'_>) {
    ui.add_space(6.0);
    ui.separator();
    line(ui, &OUTPUT, bench);
    let Some(sent) = sent(&bench.parameters.midi) else { return };
    for field in &DETAILS {
        line(ui, field, bench);
    }
    let text = format!(
        "{sent}, {DELAY_S} s after the place in the sound; a little more where the pitch drops out"
    );
    say(ui, &text, bench.palette);
}

fn line(ui: &mut Ui, field: &Field, bench: &mut Bench<'_>) {
    let size = vec2(ui.available_width(), LINE);
    let (rect, _) = ui.allocate_exact_size(size, Sense::hover());
    // Its frame stands out to either side.
    field::field(ui, rect.with_max_x(rect.right() - 8.0), field, bench);
}

/// What is sent, in words.
fn sent(parameters: &MidiParameters) -> Option<String> {
    let (number, channel) = (parameters.number.value(), parameters.channel.value());
    let what = match parameters.output.value() {
        MidiOutput::Off => return None,
        MidiOutput::Note => {
            format!("note {}", NoteName::from_midi(i16::try_from(number).unwrap_or_default()))
        }
        MidiOutput::Controller => format!("controller {number}"),
    };
    Some(format!("{what} on channel {channel}"))
}
