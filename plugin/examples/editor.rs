//! The editor without a host: `pictures FOLDER [SOUND.wav...]` renders every view from fixed data, or recorded sounds past
//! their middle; `cost` prints what a frame costs on this machine.

#![expect(clippy::print_stdout, reason = "printing is what this program is for")]

#[path = "../tests/editor/scenes.rs"]
mod scenes;

use std::error::Error;
use std::path::{Path, PathBuf};
use std::time::Instant;

use egui::{Context, Pos2, RawInput, Rect, Vec2, vec2};
use egui_kittest::Harness;
use egui_kittest::kittest::Queryable as _;
use plumbtone_analysis::{Analyzer, Reading, Settings, Sink, State};
use plumbtone_plugin::editor::{Theme, install_fonts};
use plumbtone_plugin::readout::Condition;
use plumbtone_plugin::session::SessionPosition;
use scenes::{Scene, strays, string_partials};

const SIZE: Vec2 = vec2(1120.0, 760.0);

/// Frames measured.
const FRAMES: u32 = 300;

type Done = Result<(), Box<dyn Error>>;

fn main() -> Done {
    let mut arguments = std::env::args_os().skip(1);
    match arguments.next().as_deref().and_then(|command| command.to_str()) {
        Some("pictures") => pictures(arguments.map(PathBuf::from)),
        Some("cost") => {
            cost();
            Ok(())
        }
        _ => Err("usage: editor pictures FOLDER [SOUND.wav...] | editor cost".into()),
    }
}

fn pictures(mut arguments: impl Iterator<Item = PathBuf>) -> Done {
    let folder = arguments.next().ok_or("where do the pictures go?")?;
    std::fs::create_dir_all(&folder)?;
    let sounds: Vec<PathBuf> = arguments.collect();
    if sounds.is_empty() {
        fixed(&folder)?;
    }
    for (number, sound) in sounds.iter().enumerate() {
        let name = sound.file_stem().map_or_else(String::new, |name| name.to_string_lossy().into());
        let theme = if number % 2 == 0 { Theme::Dark } else { Theme::Light };
        save(heard(sound, theme)?, SIZE, 1.0, &folder.join(format!("recorded-{name}.png")))?;
    }
    Ok(())
}

fn fixed(folder: &Path) -> Done {
    let dark = || Scene::string(Theme::Dark);
    save(dark(), SIZE, 1.0, &folder.join("editor.png"))?;
    save(dark(), SIZE, 2.0, &folder.join("editor-2x.png"))?;
    save(Scene::string(Theme::Light), SIZE, 1.0, &folder.join("editor-light.png"))?;
    save(dark(), vec2(480.0, 320.0), 1.0, &folder.join("smallest.png"))?;
    save(dark(), vec2(800.0, 560.0), 1.0, &folder.join("small.png"))?;
    save(dark(), vec2(1900.0, 1150.0), 1.0, &folder.join("large.png"))?;
    let mut pinned = dark();
    pinned.screen.pin(Some(7));
    let mut harness = pinned.open(SIZE, 1.0);
    for _ in 0..500 {
        harness.state_mut().advance();
        harness.step();
    }
    keep(&mut harness, &folder.join("pinned.png"))?;
    let mut settings = dark().open(SIZE, 1.0);
    settings.run_steps(2);
    settings.get_by_label("Settings").click();
    settings.run_steps(3);
    keep(&mut settings, &folder.join("settings.png"))?;
    let mut checks = Scene::checked(Theme::Dark).open(SIZE, 1.0);
    checks.run_steps(2);
    checks.get_by_label("Checks").click();
    checks.run_steps(3);
    keep(&mut checks, &folder.join("checks.png"))?;
    let mut keys = Scene::keyboard(Theme::Dark).open(SIZE, 1.0);
    keys.run_steps(2);
    keys.get_by_label("Keys").click();
    keys.run_steps(3);
    keep(&mut keys, &folder.join("keys.png"))?;
    save(Scene::detuned(Theme::Light), SIZE, 1.0, &folder.join("detuned.png"))?;
    let mut compared = Scene::captured(Theme::Dark);
    compared.screen.compare(Some(1), None);
    let mut captures = compared.open(SIZE, 1.0);
    captures.run_steps(2);
    captures.get_by_label("Captures").click();
    captures.run_steps(3);
    keep(&mut captures, &folder.join("captures.png"))?;
    for (state, name) in
        [(State::Several, "several"), (State::Unpitched, "unpitched"), (State::Silent, "silent")]
    {
        let mut scene = dark();
        let centre = scene.readout.reading.centre;
        scene.readout.reading = Reading { state, centre, level_dbfs: -24.3, ..Reading::default() };
        scene.readout.since = centre - 67_200;
        save(scene, SIZE, 1.0, &folder.join(format!("{name}.png")))?;
    }
    save(Scene::empty(Theme::Dark), SIZE, 1.0, &folder.join("waiting.png"))?;
    let mut notices = dark();
    notices.lost_samples = 4_096;
    notices.readout.gaps.non_finite = 37;
    notices.unsound = vec!["partials was I32(-1) and is at its default now".to_owned()];
    save(notices, SIZE, 1.0, &folder.join("notices.png"))?;
    std::fs::write(folder.join("editor.svg"), dark().svg(SIZE))?;
    Ok(())
}

fn save(scene: Scene, size: Vec2, scale: f32, path: &Path) -> Done {
    let mut harness = scene.open(size, scale);
    for frame in 0..6 {
        harness.state_mut().time_s = f64::from(frame);
        harness.step();
    }
    keep(&mut harness, path)
}

fn keep(harness: &mut Harness<'_, Scene>, path: &Path) -> Done {
    harness.render()?.save(path)?;
    println!("{}", path.display());
    Ok(())
}

/// What the engine says of a sound file up to its middle.
fn heard(path: &Path, theme: Theme) -> Result<Scene, Box<dyn Error>> {
    let mut reader = hound::WavReader::open(path)?;
    let spec = reader.spec();
    let scale = 1.0 / (1i64 << (spec.bits_per_sample - 1)) as f32;
    let samples: Vec<f32> = match spec.sample_format {
        hound::SampleFormat::Float => reader.samples::<f32>().collect::<Result<_, _>>()?,
        hound::SampleFormat::Int => reader
            .samples::<i32>()
            .map(|sample| sample.map(|sample| sample as f32 * scale))
            .collect::<Result<_, _>>()?,
    };
    let channels = usize::from(spec.channels);
    let mono: Vec<f32> =
        samples.chunks(channels).map(|frame| frame.iter().sum::<f32>() / channels as f32).collect();
    let rate_hz = f64::from(spec.sample_rate);
    let mut analyzer = Analyzer::new(&Settings::new(rate_hz))?;
    let mut listener = Listener { scene: Scene::empty(theme) };
    listener.scene.readout.condition = Condition::Measuring;
    listener.scene.readout.sample_rate_hz = rate_hz;
    listener.scene.readout.stream = 1;
    if let Ok(mut trail) = listener.scene.trail.lock() {
        trail.grid(analyzer.hop(), rate_hz);
    }
    analyzer.push(&mono[..mono.len() * 6 / 10], &mut listener);
    analyzer.finish(&mut listener);
    Ok(listener.scene)
}

struct Listener {
    scene: Scene,
}

impl Sink for Listener {
    fn reading(&mut self, reading: &Reading) {
        let readout = &mut self.scene.readout;
        let session = SessionPosition::default();
        if let Ok(mut trail) = self.scene.trail.lock() {
            trail.push(1, reading, &session);
            readout.trail_end = trail.next();
        }
        readout.weigh(reading);
        readout.take(reading, session);
    }
}

/// 40 partials and half an hour of drift behind them, at three zooms, and compared with a capture.
fn cost() {
    let mut scene = Scene::captured(Theme::Dark);
    let vibrato =
        |t: f64| Some(2.0 * (5.5 * core::f64::consts::TAU * t).sin() + 3.0 * (0.05 * t).sin());
    scene.play(190_000, vibrato, &string_partials(40), &strays());
    let ctx = Context::default();
    install_fonts(&ctx);
    for (span_s, compared) in [(20.0, None), (300.0, None), (1_800.0, None), (20.0, Some(1))] {
        scene.screen.span(span_s);
        scene.screen.compare(compared, None);
        let (mut drawn_s, mut tessellated_s) = (0.0, 0.0);
        for frame in 0..FRAMES + 20 {
            scene.advance();
            let screen_rect = Some(Rect::from_min_size(Pos2::ZERO, SIZE));
            let input = RawInput { screen_rect, time: Some(scene.time_s), ..RawInput::default() };
            let start = Instant::now();
            let mut output = ctx.run_ui(input, |ui| scene.frame(ui));
            let drawn = start.elapsed().as_secs_f64();
            let shapes = core::mem::take(&mut output.shapes);
            let primitives = ctx.tessellate(shapes, output.pixels_per_point);
            let both = start.elapsed().as_secs_f64();
            assert!(!primitives.is_empty(), "something is drawn");
            output.textures_delta.clear();
            // The first frames make the lettering.
            if frame >= 20 {
                drawn_s += drawn;
                tessellated_s += both - drawn;
            }
        }
        let ms = |s: f64| 1000.0 * s / f64::from(FRAMES);
        println!(
            "{span_s:>5} s of drift shown{}: layout {:.2} ms, tessellation {:.2} ms a frame",
            if compared.is_some() { ", a capture compared" } else { "" },
            ms(drawn_s),
            ms(tessellated_s)
        );
    }
}
