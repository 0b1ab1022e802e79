//! The note output: passes on what comes in, unchanged and at its sample, and sends a message of the user's choice while a
//! check is outside. On the audio thread: nothing here allocates, locks or waits.

use nice_plug::context::process::SendEventError;
use nice_plug::midi::{Channel, Key, VoiceID};
use nice_plug::prelude::*;

use crate::convert::index;
use crate::parameters::{MidiOutput, MidiParameters};
use crate::status::Status;
use crate::tap::{Due, Note};

/// How hard a note is played, 0 to 1: a common default.
const VELOCITY: f32 = 100.0 / 127.0;

/// The note output of one instance.
#[derive(Debug)]
pub(crate) struct MidiOut {
    /// What came in with the block, in order.
    input: Vec<NoteEvent<()>>,
    /// Whether the check that is on is outside, as far as it is due.
    outside: bool,
    /// What was switched on and not off again.
    on: Option<Message>,
}

/// What is switched on and off.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Message {
    Note { channel: u8, key: u8 },
    Controller { channel: u8, number: u8 },
}

/// Whether anything is to be sent at all.
pub(crate) fn sends(parameters: &MidiParameters) -> bool {
    parameters.output.value() != MidiOutput::Off
}

impl MidiOut {
    /// With memory for so many events of a block.
    pub(crate) fn new(capacity: usize) -> Self {
        Self { input: Vec::with_capacity(capacity), outside: false, on: None }
    }

    /// A new stream begins: no check is outside in it. What is on is switched off with its first block.
    pub(crate) fn start(&mut self) {
        self.outside = false;
    }

    /// Takes in what comes with a block; what came before was passed on by [`send`](Self::send).
    pub(crate) fn take<P: Plugin<SysExMessage = ()>>(
        &mut self,
        context: &mut impl ProcessContext<P>,
        status: &Status,
    ) {
        while let Some(event) = context.next_event() {
            if self.input.len() == self.input.capacity() {
                // More than is remembered: these are passed on before the block is looked at.
                self.pass(self.input.len(), context, status);
            }
            self.input.push(event);
        }
    }

    /// The keys that went down or up in the block.
    pub(crate) fn notes(&self) -> impl Iterator<Item = Note> {
        self.input.iter().filter_map(note)
    }

    /// Passes on what came in with the block, and in between sends what is due.
    pub(crate) fn send<P: Plugin<SysExMessage = ()>>(
        &mut self,
        parameters: &MidiParameters,
        mut due: impl FnMut() -> Option<Due>,
        context: &mut impl ProcessContext<P>,
        status: &Status,
    ) {
        let mut next = due();
        // Mostly there is nothing to do.
        if next.is_none() && self.input.is_empty() && !self.outside && self.on.is_none() {
            return;
        }
        // What is set may be new with this block.
        self.follow(parameters, 0, context);
        while let Some(Due { offset, late, outside }) = next {
            let earlier =
                self.input.iter().take_while(|event| index(event.timing().into()) < offset);
            self.pass(earlier.count(), context, status);
            self.outside = outside;
            if self.follow(parameters, offset, context) && late {
                status.send_late();
            }
            next = due();
        }
        self.pass(self.input.len(), context, status);
    }

    /// Switches on or off what should be; true when something was. What the host does not take now is tried with the next
    /// block again.
    fn follow<P: Plugin<SysExMessage = ()>>(
        &mut self,
        parameters: &MidiParameters,
        offset: usize,
        context: &mut impl ProcessContext<P>,
    ) -> bool {
        let wanted = if self.outside { Message::of(parameters) } else { None };
        if self.on == wanted {
            return false;
        }
        let timing = u32::try_from(offset).unwrap_or(u32::MAX);
        if let Some(on) = self.on {
            if context.try_send_event(on.event(timing, false)).is_err() {
                return false;
            }
            self.on = None;
        }
        if let Some(wanted) = wanted
            && context.try_send_event(wanted.event(timing, true)).is_ok()
        {
            self.on = Some(wanted);
        }
        true
    }

    /// Passes on the first events of the block.
    fn pass<P: Plugin<SysExMessage = ()>>(
        &mut self,
        count: usize,
        context: &mut impl ProcessContext<P>,
        status: &Status,
    ) {
        if count == 0 {
            return;
        }
        for event in self.input.drain(..count) {
            let sent = context.try_send_event(passed_on(event));
            if matches!(sent, Err((_, SendEventError::HostBufferFull))) {
                status.lose_note();
            }
        }
    }
}

impl Message {
    fn of(parameters: &MidiParameters) -> Option<Self> {
        let [number, channel] = [parameters.number.value(), parameters.channel.value() - 1]
            .map(|value| u8::try_from(value).unwrap_or(0));
        match parameters.output.value() {
            MidiOutput::Off => None,
            MidiOutput::Note => Some(Self::Note { channel, key: number }),
            MidiOutput::Controller => Some(Self::Controller { channel, number }),
        }
    }

    fn event(self, timing: u32, on: bool) -> NoteEvent<()> {
        match self {
            Self::Note { channel, key } => {
                let (voice_id, channel, key) =
                    (VoiceID::Wildcard, Channel::Number(channel), Key::Number(key));
                if on {
                    NoteEvent::NoteOn { timing, voice_id, channel, key, velocity: VELOCITY }
                } else {
                    NoteEvent::NoteOff { timing, voice_id, channel, key, velocity: 0.0 }
                }
            }
            Self::Controller { channel, number } => {
                let value = if on { 1.0 } else { 0.0 };
                NoteEvent::MidiCC { timing, channel, cc: number, value }
            }
        }
    }
}

/// The framework cannot send a choke; the end of the note comes nearest to it.
fn passed_on(event: NoteEvent<()>) -> NoteEvent<()> {
    match event {
        NoteEvent::Choke { timing, voice_id, channel, key } => {
            NoteEvent::NoteOff { timing, voice_id, channel, key, velocity: 0.0 }
        }
        other => other,
    }
}

/// A key that went down or up.
fn note(event: &NoteEvent<()>) -> Option<Note> {
    let (timing, key, down) = match event {
        NoteEvent::NoteOn { timing, key, .. } => (timing, key, true),
        NoteEvent::NoteOff { timing, key, .. } | NoteEvent::Choke { timing, key, .. } => {
            (timing, key, false)
        }
        _ => return None,
    };
    Some(Note { offset: index(u64::from(*timing)), key: key.number()?, down })
}
