//! Renders the editor: `pictures FOLDER [SOUND.wav...]`. Every view from fixed data, and each sound at its middle.

#[path = "../tests/editor/scenes.rs"]
mod scenes;

use std::error::Error;
use std::path::{Path, PathBuf};

use egui::{Vec2, vec2};
use plumbtone_analysis::{Analyzer, Reading, Settings, Sink};
use plumbtone_plugin::editor::Theme;
use plumbtone_plugin::readout::Condition;
use plumbtone_plugin::session::SessionPosition;
use scenes::Scene;

const SIZE: Vec2 = vec2(1120.0, 760.0);

type Done = Result<(), Box<dyn Error>>;

fn main() -> Done {
    let mut arguments = std::env::args_os().skip(1).map(PathBuf::from);
    let folder = arguments.next().ok_or("usage: pictures FOLDER [SOUND.wav...]")?;
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
    save(pinned, SIZE, 1.0, &folder.join("pinned.png"))?;
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
    listener.scene.trail.lock().map_err(|_| "poisoned")?.grid(analyzer.hop(), rate_hz);
    // Short sounds go round until there are ten seconds of them.
    let most = mono.len().max((10.0 * rate_hz) as usize);
    let heard = if mono.len() < most { mono.iter().copied().cycle().take(most).collect() } else { mono };
    analyzer.push(&heard[..heard.len() * 6 / 10], &mut listener);
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
