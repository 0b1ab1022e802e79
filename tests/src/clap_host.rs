//! A host for the plugin as CLAP: loads it, connects its ports, drives it block by block.

use std::error::Error;
use std::ffi::{CStr, CString};
use std::path::Path;

use clack_extensions::audio_ports_config::{AudioPortsConfigBuffer, PluginAudioPortsConfig};
use clack_extensions::latency::PluginLatency;
use clack_extensions::params::{ParamInfoBuffer, PluginParams};
use clack_extensions::render::{PluginRender, RenderMode};
use clack_extensions::state::PluginState;
use clack_host::entry::EntryDescriptor;
use clack_host::events::event_types::TransportEvent;
use clack_host::prelude::*;

/// Id of the plugin under test.
const PLUGIN: &CStr = c"org.plumbtone.plumbtone";
/// Channels of the sidechain.
const SIDECHAIN: usize = 2;
/// Events that a block may bring out before the host takes more memory.
const EVENTS_OUT: usize = 4096;

/// Why the plugin could not be driven.
pub type Failure = Box<dyn Error>;

/// A loaded plugin library.
pub struct Library(PluginEntry);

impl std::fmt::Debug for Library {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.debug_tuple("Library").finish_non_exhaustive()
    }
}

impl Library {
    /// Loads a bundle.
    ///
    /// # Errors
    /// A file that is missing or no CLAP.
    #[expect(unsafe_code, reason = "loading a library runs what is in it: our own plugin")]
    pub fn load(bundle: &Path) -> Result<Self, Failure> {
        // SAFETY: the library is the one under test, whose entry comes from its framework.
        Ok(Self(unsafe { PluginEntry::load(bundle)? }))
    }

    /// The plugin as linked into this program.
    ///
    /// # Errors
    /// An entry that refuses.
    #[expect(unsafe_code, reason = "an entry's functions are called as the entry says")]
    pub fn linked(entry: &'static EntryDescriptor) -> Result<Self, Failure> {
        // SAFETY: the entry is a static of the linked plugin, made by its framework.
        Ok(Self(unsafe { PluginEntry::load_from_raw(entry, c"")? }))
    }
}

/// How audio is delivered.
#[derive(Debug, Clone, Copy)]
pub struct Format {
    /// Sample rate in Hz.
    pub sample_rate_hz: f64,
    /// Longest block in samples.
    pub block_max: usize,
    /// 1 or 2.
    pub channels: usize,
    /// Whether the render mode is offline.
    pub offline: bool,
}

impl Default for Format {
    fn default() -> Self {
        Self { sample_rate_hz: 48_000.0, block_max: 512, channels: 2, offline: false }
    }
}

/// An instance of the plugin, on the main thread.
pub struct Instance(PluginInstance<()>);

impl std::fmt::Debug for Instance {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.debug_tuple("Instance").field(&self.0.is_active()).finish()
    }
}

impl Instance {
    /// Makes an instance.
    ///
    /// # Errors
    /// A plugin that cannot be made.
    pub fn new(library: &Library) -> Result<Self, Failure> {
        let host = HostInfo::new("Plumbtone tests", "Plumbtone", "", "1")?;
        Ok(Self(PluginInstance::new(|()| (), |()| (), &library.0, PLUGIN, &host)?))
    }

    /// Activates it and starts processing.
    ///
    /// # Errors
    /// A format that the plugin refuses.
    pub fn start(&mut self, format: Format) -> Result<Running, Failure> {
        self.select_channels(format.channels)?;
        self.set_offline(format.offline)?;
        let configuration = PluginAudioConfiguration {
            sample_rate: format.sample_rate_hz,
            min_frames_count: 1,
            max_frames_count: u32::try_from(format.block_max)?,
        };
        let processor = self.0.activate(|(), ()| (), configuration)?;
        Ok(Running::new(processor.start_processing()?, format))
    }

    /// Stops processing and deactivates.
    pub fn stop(&mut self, running: Running) {
        self.0.deactivate(running.processor.stop_processing());
    }

    fn select_channels(&mut self, channels: usize) -> Result<(), Failure> {
        let handle = self.0.plugin_handle();
        let ports: PluginAudioPortsConfig =
            handle.get_extension().ok_or("the plugin has no port configurations")?;
        let wanted = u32::try_from(channels)?;
        for index in 0..ports.count(&handle) {
            let mut buffer = AudioPortsConfigBuffer::new();
            let Some(found) = ports.get(&handle, index, &mut buffer) else { continue };
            if found.main_input.is_some_and(|port| port.channel_count == wanted) {
                return Ok(ports.select(&handle, found.id)?);
            }
        }
        Err(format!("no port configuration has {channels} channels").into())
    }

    fn set_offline(&mut self, offline: bool) -> Result<(), Failure> {
        let handle = self.0.plugin_handle();
        let render: PluginRender = handle.get_extension().ok_or("the plugin has no render mode")?;
        let mode = if offline { RenderMode::Offline } else { RenderMode::Realtime };
        Ok(render.set(&handle, mode)?)
    }

    /// Latency in samples.
    ///
    /// # Errors
    /// A plugin that does not tell.
    pub fn latency(&mut self) -> Result<u32, Failure> {
        let handle = self.0.plugin_handle();
        let latency: PluginLatency = handle.get_extension().ok_or("the plugin tells no latency")?;
        Ok(latency.get(&handle))
    }

    /// The saved state.
    ///
    /// # Errors
    /// A plugin that cannot save.
    pub fn save(&mut self) -> Result<Vec<u8>, Failure> {
        let handle = self.0.plugin_handle();
        let state: PluginState = handle.get_extension().ok_or("the plugin has no state")?;
        let mut saved = Vec::new();
        state.save(&handle, &mut saved)?;
        Ok(saved)
    }

    /// Loads a state, read in pieces as small as the reader hands them out.
    ///
    /// # Errors
    /// A state that the plugin refuses.
    pub fn load(&mut self, mut stored: impl std::io::Read) -> Result<(), Failure> {
        let handle = self.0.plugin_handle();
        let state: PluginState = handle.get_extension().ok_or("the plugin has no state")?;
        Ok(state.load(&handle, &mut stored)?)
    }

    /// All parameters: id, name and group.
    ///
    /// # Errors
    /// A plugin without parameters.
    pub fn parameters(&mut self) -> Result<Vec<(ClapId, String, String)>, Failure> {
        let handle = self.0.plugin_handle();
        let params: PluginParams = handle.get_extension().ok_or("the plugin has no parameters")?;
        let text = |bytes: &[u8]| String::from_utf8_lossy(bytes).into_owned();
        let all = (0..params.count(&handle)).filter_map(|index| {
            let mut buffer = ParamInfoBuffer::new();
            let info = params.get_info(&handle, index, &mut buffer)?;
            Some((info.id, text(info.name), text(info.module)))
        });
        Ok(all.collect())
    }

    /// The id of the parameter of this name.
    ///
    /// # Errors
    /// A name that no parameter has.
    pub fn parameter(&mut self, name: &str) -> Result<ClapId, Failure> {
        let found = self.parameters()?.into_iter().find(|(_, known, _)| known == name);
        Ok(found.ok_or_else(|| format!("no parameter is called {name}"))?.0)
    }

    /// A parameter's value as the plugin shows it.
    ///
    /// # Errors
    /// A parameter that is not there or shows nothing.
    pub fn shown(&mut self, name: &str) -> Result<String, Failure> {
        let id = self.parameter(name)?;
        let handle = self.0.plugin_handle();
        let params: PluginParams = handle.get_extension().ok_or("the plugin has no parameters")?;
        let value = params.get_value(&handle, id).ok_or("the parameter has no value")?;
        let mut buffer = [0; 256];
        let text = params.value_to_text(&handle, id, value, &mut buffer)?;
        Ok(String::from_utf8_lossy(text).into_owned())
    }

    /// The value that a text stands for, as events carry it.
    ///
    /// # Errors
    /// A text that the parameter does not take.
    pub fn value(&mut self, name: &str, text: &str) -> Result<(ClapId, f64), Failure> {
        let id = self.parameter(name)?;
        let handle = self.0.plugin_handle();
        let params: PluginParams = handle.get_extension().ok_or("the plugin has no parameters")?;
        let value = params.text_to_value(&handle, id, &CString::new(text)?);
        Ok((id, value.ok_or_else(|| format!("{name} does not take {text}"))?))
    }
}

/// A running instance, on the audio thread.
pub struct Running {
    processor: StartedPluginAudioProcessor<()>,
    format: Format,
    inputs: AudioPorts,
    outputs: AudioPorts,
    input: Vec<Vec<f32>>,
    sidechain: Vec<Vec<f32>>,
    output: Vec<Vec<f32>>,
    events_out: EventBuffer,
}

impl std::fmt::Debug for Running {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.debug_struct("Running").field("format", &self.format).finish_non_exhaustive()
    }
}

impl Running {
    fn new(processor: StartedPluginAudioProcessor<()>, format: Format) -> Self {
        let buffers = |channels| vec![vec![0.0; format.block_max]; channels];
        Self {
            processor,
            format,
            inputs: AudioPorts::with_capacity(format.channels + SIDECHAIN, 2),
            outputs: AudioPorts::with_capacity(format.channels, 1),
            input: buffers(format.channels),
            sidechain: buffers(SIDECHAIN),
            output: buffers(format.channels),
            events_out: EventBuffer::with_capacity(EVENTS_OUT),
        }
    }

    /// Resets the plugin's processing.
    pub fn reset(&mut self) {
        self.processor.reset();
    }

    /// Processes one block (its channels are of equal length, at most `block_max`) and lends what came out.
    ///
    /// # Errors
    /// A block that the plugin fails on.
    pub fn process(
        &mut self,
        block: &[&[f32]],
        events: &InputEvents<'_>,
        transport: Option<&TransportEvent>,
    ) -> Result<Vec<&[f32]>, Failure> {
        let length = block[0].len();
        for (buffer, channel) in self.input.iter_mut().zip(block) {
            buffer[..length].copy_from_slice(channel);
        }
        let port = |channels| AudioPortBuffer {
            latency: 0,
            channels: AudioPortBufferType::f32_input_only(channels),
        };
        let inputs = self.inputs.with_input_buffers([
            port(each(&mut self.input, length)),
            port(each(&mut self.sidechain, length)),
        ]);
        let mut outputs = self.outputs.with_output_buffers([AudioPortBuffer {
            latency: 0,
            channels: AudioPortBufferType::f32_output_only(
                self.output.iter_mut().map(|channel| &mut channel[..length]),
            ),
        }]);
        self.events_out.clear();
        let mut out = OutputEvents::from_buffer(&mut self.events_out);
        self.processor.process(&inputs, &mut outputs, events, &mut out, None, transport)?;
        Ok(self.output.iter().map(|channel| &channel[..length]).collect())
    }

    /// The events that came out of the last block.
    #[must_use]
    pub fn events_out(&self) -> &EventBuffer {
        &self.events_out
    }

    /// Plays a sound through the plugin in blocks of these lengths, over and over. Returns whether all that came out is
    /// what went in, bit for bit.
    ///
    /// # Errors
    /// A block that the plugin fails on.
    pub fn play(&mut self, sound: &[Vec<f32>], blocks: &[usize]) -> Result<bool, Failure> {
        let total = sound[0].len();
        let mut lengths = blocks.iter().copied().cycle();
        let (mut from, mut equal) = (0, true);
        while from < total {
            let to = total.min(from + lengths.next().unwrap_or(total));
            let block: Vec<&[f32]> = sound.iter().map(|channel| &channel[from..to]).collect();
            let out = self.process(&block, &InputEvents::empty(), None)?;
            equal &= out.iter().zip(&block).all(|(out, input)| same_bits(out, input));
            from = to;
        }
        Ok(equal)
    }
}

/// Whether two stretches of samples are equal bit for bit.
#[must_use]
pub fn same_bits(a: &[f32], b: &[f32]) -> bool {
    a.len() == b.len() && a.iter().zip(b).all(|(a, b)| a.to_bits() == b.to_bits())
}

fn each(channels: &mut [Vec<f32>], length: usize) -> impl Iterator<Item = InputChannel<'_, f32>> {
    channels.iter_mut().map(move |channel| InputChannel::variable(&mut channel[..length]))
}
