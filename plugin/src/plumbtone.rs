//! The plugin itself: what it tells the host, and which part of it runs when.

use std::num::NonZeroU32;
use std::sync::{Arc, Mutex};

use nice_plug::prelude::*;
use nice_plug_egui::{EguiEditor, RepaintNotifier};
use plumbtone_analysis::Analyzer;
use triple_buffer::{Output, triple_buffer};

use crate::analysis::Analysis;
use crate::captures::Press;
use crate::check::Checks;
use crate::controls::Controls;
use crate::convert::index;
use crate::delivery::Delivery;
use crate::editor::{self, Window};
use crate::keys::Keys;
use crate::midi_out::{self, MidiOut};
use crate::parameters::Parameters;
use crate::pool::Place;
use crate::readings_log::ReadingsLog;
use crate::readout::Readout;
use crate::session::Transport;
use crate::state;
use crate::status::Status;
use crate::tap::{Format, Patience, Tap};
use crate::trail::Trail;

/// An instance of the plugin. It belongs to the audio thread while that runs.
///
/// `CONTROLLERS` says whether MIDI comes in with its controllers, to be passed on. In VST3 each of them would be a parameter
/// of its own, 2080 in all, and a host that reads every parameter's texts takes a minute to load them: there, notes come in.
#[derive(Debug)]
pub struct Plumbtone<const CONTROLLERS: bool> {
    parameters: Arc<Parameters>,
    status: Arc<Status>,
    place: Place,
    tap: Option<Tap>,
    midi_out: MidiOut,
    /// For the editor, until the host asks for it.
    readout: Option<Output<Readout>>,
    trail: Arc<Mutex<Trail>>,
    repaint: RepaintNotifier,
}

impl<const CONTROLLERS: bool> Default for Plumbtone<CONTROLLERS> {
    fn default() -> Self {
        let (input, output) = triple_buffer(&Readout::default());
        let repaint = RepaintNotifier::new();
        let log = ReadingsLog::open();
        let status = Arc::new(Status::new(log.is_some()));
        let parameters = Arc::<Parameters>::default();
        let checks = Checks::new(parameters.results.clone());
        let keys = Keys::new(parameters.sheet.clone());
        let press = Press::new(parameters.captures.clone());
        let parts = (checks, keys, press);
        let delivery = Delivery::new(Arc::clone(&status), input, repaint.clone(), log, parts);
        let trail = delivery.trail();
        Self {
            parameters,
            status,
            trail,
            place: Place::take(Analysis::new(Analyzer::new, delivery)),
            tap: None,
            midi_out: MidiOut::new(Self::INPUT_EVENT_CAPACITY),
            readout: Some(output),
            repaint,
        }
    }
}

impl<const CONTROLLERS: bool> Plumbtone<CONTROLLERS> {
    /// Ends the stream. All of it is measured before this returns: the host may take the instance away next.
    fn end(&mut self) {
        if let Some(tap) = &mut self.tap {
            tap.end();
            self.place.drain();
        }
    }
}

impl<const CONTROLLERS: bool> Drop for Plumbtone<CONTROLLERS> {
    fn drop(&mut self) {
        self.end();
        // A report that was begun is finished, whatever the host does next.
        self.parameters.results.finish_reports();
        self.parameters.sheet.finish_reports();
        self.parameters.captures.finish_errands();
    }
}

/// Channels of the sidechain.
const SIDECHAIN: &[NonZeroU32] = &[new_nonzero_u32(2)];

/// A layout with equal main input and output and a stereo sidechain. Only CLAP hosts get the mono one: asked for it by a
/// VST3 host, the framework refuses (it compares the main input with the sidechain), and the host plays a mono track
/// through the stereo one. With a mono sidechain it would accept, and then crash in hosts that switch the sidechain off.
const fn layout(channels: u32, name: &'static str) -> AudioIOLayout {
    let channels = NonZeroU32::new(channels);
    AudioIOLayout {
        main_input_channels: channels,
        main_output_channels: channels,
        aux_input_ports: SIDECHAIN,
        aux_output_ports: &[],
        names: PortNames {
            layout: Some(name),
            main_input: Some("Main"),
            main_output: Some("Main"),
            aux_inputs: &["Sidechain"],
            aux_outputs: &[],
        },
    }
}

impl<const CONTROLLERS: bool> Plugin for Plumbtone<CONTROLLERS> {
    const NAME: &'static str = "Plumbtone";
    const VENDOR: &'static str = "Plumbtone";
    const URL: &'static str = "";
    const EMAIL: &'static str = "";
    const VERSION: &'static str = env!("CARGO_PKG_VERSION");

    const AUDIO_IO_LAYOUTS: &'static [AudioIOLayout] = &[layout(2, "Stereo"), layout(1, "Mono")];
    /// A host that sends a track's MIDI through takes what does not come out as not there.
    const MIDI_INPUT: MidiConfig =
        if CONTROLLERS { MidiConfig::MidiCCs } else { MidiConfig::Basic };
    const MIDI_OUTPUT: MidiConfig = MidiConfig::MidiCCs;
    /// Parameter changes reach the tap at their sample, whatever the block size.
    const SAMPLE_ACCURATE_AUTOMATION: bool = true;

    type Editor = EguiEditor<Window>;
    type SysExMessage = ();
    type BackgroundTask = ();

    fn params(&self) -> Arc<dyn Params> {
        Arc::clone(&self.parameters) as Arc<dyn Params>
    }

    fn editor(&mut self, _async_executor: AsyncExecutor<Self>) -> Option<Self::Editor> {
        let window = Window::new(
            Arc::clone(&self.parameters),
            Arc::clone(&self.status),
            self.place.bell(),
            self.readout.take()?,
            Arc::clone(&self.trail),
        );
        editor::create(window, self.repaint.clone())
    }

    fn filter_state(state: &mut PluginState) {
        state::filter(state);
    }

    fn activate(
        &mut self,
        _audio_io_layout: &AudioIOLayout,
        buffer_config: &BufferConfig,
        context: &mut impl ActivateContext<Self>,
    ) -> bool {
        let format = Format {
            sample_rate_hz: f64::from(buffer_config.sample_rate),
            block_max: index(u64::from(buffer_config.max_buffer_size)),
            patience: patience(context.plugin_api(), buffer_config.process_mode),
        };
        // Hosts activate again and again; only another format needs other rings.
        if self.tap.as_ref().is_none_or(|tap| tap.format() != format) {
            self.end();
            let (tap, intake) = Tap::new(format, Arc::clone(&self.status));
            self.place.install(intake);
            self.tap = Some(tap);
        }
        self.midi_out.start();
        true
    }

    fn reset(&mut self) {
        if let Some(tap) = &mut self.tap {
            tap.start();
        }
        self.midi_out.start();
    }

    fn process(
        &mut self,
        buffer: &mut Buffer<'_>,
        _aux: &mut AuxiliaryBuffers<'_>,
        context: &mut impl ProcessContext<Self>,
    ) -> ProcessStatus {
        let Self { parameters, status, tap, midi_out: output, .. } = self;
        output.take(context, status);
        if let Some(tap) = tap {
            let controls = Controls::of(parameters);
            let transport = Transport::of(context.transport());
            tap.block(buffer.as_slice_immutable(), &controls, &transport, output.notes());
            if midi_out::sends(&parameters.midi) {
                tap.wait_for_turns();
            }
        }
        let due = || tap.as_mut().and_then(Tap::due);
        output.send(&parameters.midi, due, context, status);
        ProcessStatus::Normal
    }

    fn deactivate(&mut self) {
        self.end();
    }
}

impl ClapPlugin for Plumbtone<true> {
    const CLAP_ID: &'static str = "org.plumbtone.plumbtone";
    const CLAP_DESCRIPTION: Option<&'static str> =
        Some("Partials, their distance from the harmonic series, strays and pitch drift");
    const CLAP_MANUAL_URL: Option<&'static str> = None;
    const CLAP_SUPPORT_URL: Option<&'static str> = None;
    const CLAP_FEATURES: &'static [ClapFeature] = &[
        ClapFeature::AudioEffect,
        ClapFeature::Analyzer,
        ClapFeature::Utility,
        ClapFeature::Stereo,
        ClapFeature::Mono,
    ];

    fn remote_controls(&self, context: &mut impl RemoteControlsContext) {
        let Parameters { tuning, analysis, check, midi, .. } = &*self.parameters;
        context.add_section("Plumbtone", |section| {
            section.add_page("Analysis", |page| {
                page.add_param(&analysis.channel);
                page.add_param(&analysis.lowest);
                page.add_param(&analysis.highest);
                page.add_param(&analysis.integration);
                page.add_param(&analysis.partials);
                page.add_param(&tuning.concert_pitch);
                page.add_param(&tuning.temperament);
                page.add_param(&analysis.freeze);
            });
            section.add_page("Captures", |page| {
                page.add_param(&analysis.capture);
            });
            section.add_page("Check", |page| {
                page.add_param(&check.check);
                page.add_param(&check.tolerance);
                page.add_param(&check.reference);
                page.add_param(&check.reference_pitch);
                page.add_param(&midi.output);
                page.add_param(&midi.number);
                page.add_param(&midi.channel);
            });
        });
    }
}

impl Vst3Plugin for Plumbtone<false> {
    const VST3_CLASS_ID: [u8; 16] = *b"PlumbtonePlugin1";
    const VST3_SUBCATEGORIES: &'static [Vst3SubCategory] =
        &[Vst3SubCategory::Fx, Vst3SubCategory::Analyzer, Vst3SubCategory::Tools];
}

/// Whether the tap may wait. The framework passes on a VST3 host's process mode one change late, so that it tells of the
/// render before.
fn patience(api: PluginApi, mode: ProcessMode) -> Patience {
    match (api, mode) {
        (PluginApi::Vst3, _) => Patience::WhenAhead,
        (_, ProcessMode::Offline) => Patience::Always,
        (_, ProcessMode::Realtime | ProcessMode::Buffered) => Patience::Never,
    }
}
