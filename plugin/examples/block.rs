//! Processes blocks through the plugin itself, without a format's wrapper, for a profiler to count instructions.
//!
//! `block process|copy BLOCKS LENGTH FOLDER`: stereo; `copy` copies the same blocks and does nothing else. The plugin logs
//! its readings into the folder, for it measures nothing that nobody looks at.
#![expect(clippy::print_stdout, reason = "what was done keeps it from being optimised away")]

use std::hint::black_box;
use std::path::Path;

use nice_plug::context::PluginApi;
use nice_plug::prelude::*;
use plumbtone_plugin::readings_log::log_into;

/// The plugin as CLAP hosts get it.
type Plumbtone = plumbtone_plugin::Plumbtone<true>;

const RATE: f32 = 48_000.0;

fn main() -> Result<(), Box<dyn std::error::Error>> {
    let arguments: Vec<String> = std::env::args().skip(1).collect();
    let [what, blocks, length, folder] = arguments.as_slice() else {
        return Err("block process|copy BLOCKS LENGTH FOLDER".into());
    };
    let (blocks, length): (usize, usize) = (blocks.parse()?, length.parse()?);
    let mut left: Vec<f32> = (0..length).map(|n| (n as f32 * 0.05).sin()).collect();
    let mut right = left.clone();
    if what == "copy" {
        let mut copy = [vec![0.0; length], vec![0.0; length]];
        for _ in 0..blocks {
            copy_block(&mut copy, &left, &right);
        }
        println!("{}", black_box(copy)[1][length - 1]);
        return Ok(());
    }
    log_into(Some(Path::new(folder)));
    let mut plugin = Plumbtone::default();
    let config = BufferConfig {
        sample_rate: RATE,
        min_buffer_size: None,
        max_buffer_size: u32::try_from(length)?,
        process_mode: ProcessMode::Offline,
    };
    plugin.activate(&Plumbtone::AUDIO_IO_LAYOUTS[0], &config, &mut Nothing);
    plugin.reset();
    let mut transport = Transport::new(RATE);
    transport.playing = true;
    transport.tempo = Some(120.0);
    transport.time_sig_numerator = Some(4);
    transport.time_sig_denominator = Some(4);
    let mut context = Context(transport);
    for number in 0..blocks {
        let at = (number * length) as f64 / f64::from(RATE);
        context.0.pos_seconds = Some(at);
        context.0.pos_beats = Some(2.0 * at);
        let mut buffer = Buffer::default();
        fill(&mut buffer, &mut left, &mut right);
        process_block(&mut plugin, &mut buffer, &mut context);
    }
    Ok(())
}

#[expect(unsafe_code, reason = "the framework's own way to make a buffer")]
fn fill<'a>(buffer: &mut Buffer<'a>, left: &'a mut [f32], right: &'a mut [f32]) {
    let length = left.len();
    // SAFETY: both slices are of the length given.
    unsafe {
        buffer.set_slices(length, |slices| slices.extend([left, right]));
    }
}

/// What is counted.
#[inline(never)]
fn process_block(plugin: &mut Plumbtone, buffer: &mut Buffer<'_>, context: &mut Context) {
    let mut aux = AuxiliaryBuffers { inputs: &mut [], outputs: &mut [] };
    black_box(plugin.process(buffer, &mut aux, context));
}

/// What it is compared with.
#[inline(never)]
fn copy_block(copy: &mut [Vec<f32>; 2], left: &[f32], right: &[f32]) {
    let [a, b] = copy;
    a.copy_from_slice(left);
    b.copy_from_slice(right);
    black_box(copy);
}

/// A host that does nothing.
struct Nothing;

impl ActivateContext<Plumbtone> for Nothing {
    fn plugin_api(&self) -> PluginApi {
        PluginApi::Clap
    }
    fn execute(&self, (): ()) {}
    fn set_latency_samples(&self, _samples: u32) {}
    fn set_current_voice_capacity(&self, _capacity: u32) {}
}

/// A block's context: the transport and nothing else.
struct Context(Transport);

impl ProcessContext<Plumbtone> for Context {
    fn plugin_api(&self) -> PluginApi {
        PluginApi::Clap
    }
    fn execute_background(&self, (): ()) {}
    fn execute_gui(&self, (): ()) {}
    fn transport(&self) -> &Transport {
        &self.0
    }
    fn next_event(&mut self) -> Option<PluginNoteEvent<Plumbtone>> {
        None
    }
    fn try_send_event(
        &mut self,
        event: PluginNoteEvent<Plumbtone>,
    ) -> Result<(), (PluginNoteEvent<Plumbtone>, nice_plug::context::process::SendEventError)> {
        Err((event, nice_plug::context::process::SendEventError::NoOutputBuffer))
    }
    fn set_latency_samples(&self, _samples: u32) {}
    fn request_restart(&self) {}
    fn set_current_voice_capacity(&self, _capacity: u32) {}
}
