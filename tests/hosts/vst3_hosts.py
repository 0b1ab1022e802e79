"""Drives the plugin as VST3 in the hosts dawdreamer and pedalboard.

vst3_hosts.py HOST render PLUGIN SOUND RATE   renders SOUND (32-bit floats, mono, played on both channels) offline three
                                              times, with different block lengths where the host allows
vst3_hosts.py HOST pass PLUGIN                checks pass-through, automation and states
vst3_hosts.py dawdreamer lane PLUGIN SOUND RATE TEMPO FOLDER ON-OFF...
                                              renders SOUND twice at a TEMPO with Check on from sample ON to OFF and so
                                              on; leaves FOLDER/1 and FOLDER/2 with a report and results.json

Exits with an error as soon as something is not as it must be. Readings are logged by the plugin itself.
"""

import json
import os
import sys

import numpy as np

import vst3_state

BLOCKS = (512, 480, 4096)

# No window is opened here. Without a name the hosts' toolkit would look for a display of its own accord, and end the process
# with whatever goes wrong there.
os.environ["DISPLAY"] = "none"


def noise(rate, seconds):
    generator = np.random.default_rng(7)
    return (0.2 * generator.standard_normal((2, int(rate * seconds)))).astype(np.float32)


def same(out, sound, what):
    out = np.ascontiguousarray(out, dtype=np.float32)[:, : sound.shape[1]]
    if out.shape != sound.shape or out.tobytes() != sound.tobytes():
        sys.exit(f"output differs from input: {what}")


class Dawdreamer:
    def render(self, plugin, sound, rate):
        for block in BLOCKS:
            same(self.play(plugin, sound, rate, block)[0], sound, f"{rate} Hz, blocks of {block}")

    def play(self, plugin, sound, rate, block, prepare=lambda processor: None, tempo=120.0):
        import dawdreamer

        engine = dawdreamer.RenderEngine(rate, block)
        engine.set_bpm(tempo)
        playback = engine.make_playback_processor("sound", sound)
        processor = engine.make_plugin_processor("plumbtone", plugin)
        prepare(processor)
        engine.load_graph([(playback, []), (processor, ["sound"])])
        engine.render(sound.shape[1] / rate)
        # A processor works only as long as its engine.
        return engine.get_audio(), processor, engine

    def check(self, plugin, folder):
        for rate in (44100, 48000, 96000, 192000):
            for block in (1, 17, 64, 480, 512, 4096):
                sound = noise(rate, 0.05)
                same(self.play(plugin, sound, rate, block)[0], sound, f"{rate} Hz, {block}")
        sound = noise(48000, 0.5)

        def automate(processor):
            names = {p["name"]: p["index"] for p in processor.get_parameters_description()}
            ramp = np.linspace(0.0, 1.0, sound.shape[1])
            for name in ("Concert pitch", "Tolerance", "Channel"):
                processor.set_automation(names[name], ramp)

        out, _, _ = self.play(plugin, sound, 48000, 512, automate)
        same(out, sound, "under automation")
        kept = (0.25, 0.5, 1.0)

        def prepare(processor):
            for index, value in enumerate(kept):
                processor.set_parameter(index, value)

        _, processor, _first = self.play(plugin, sound, 48000, 512, prepare)
        state = f"{folder}/dawdreamer.state"
        processor.save_state(state)
        _, fresh, _second = self.play(plugin, sound, 48000, 512, lambda p: p.load_state(state))
        for index, value in enumerate(kept):
            found = fresh.get_parameter(index)
            if abs(found - value) > 1e-6:
                sys.exit(f"parameter {index} was {value} and is {found} after loading")


    def lane(self, plugin, sound, rate, tempo, folder, stretches):
        block = BLOCKS[0]
        if any(at % block for stretch in stretches for at in stretch):
            sys.exit(f"this host automates block by block: a stretch has to begin and end at a multiple of {block}")
        lane = np.zeros(sound.shape[1], dtype=np.float32)
        for on, off in stretches:
            lane[on:off] = 1.0
        for number in ("1", "2"):
            place = os.path.join(folder, number)
            os.makedirs(place)
            kept = os.path.join(place, "host.state")

            def prepare(processor, place=place, kept=kept):
                processor.save_state(kept)
                state = vst3_state.read(kept)
                checks = json.loads(state["fields"]["checks"])
                checks["reports"] = {"automatic": True, "folder": place, "name": "Lane"}
                state["fields"]["checks"] = json.dumps(checks)
                vst3_state.replace(kept, state)
                processor.load_state(kept)
                names = {p["name"]: p["index"] for p in processor.get_parameters_description()}
                processor.set_automation(names["Check"], lane)
                # Nothing hears it here, but the results and the sound must be the same with it.
                processor.set_parameter(names["MIDI output"], 1.0)

            out, processor, engine = self.play(plugin, sound, rate, block, prepare, tempo)
            same(out, sound, f"render {number} of the lane")
            processor.save_state(kept)
            results = json.loads(vst3_state.read(kept)["fields"]["checks"])["results"]
            with open(os.path.join(place, "results.json"), "w", encoding="utf-8") as file:
                json.dump(results, file)
            os.remove(kept)
            # The report follows when the instance goes.
            del processor, engine


class Pedalboard:
    def render(self, plugin, sound, rate):
        import pedalboard

        for block in BLOCKS:
            instance = pedalboard.load_plugin(plugin)
            out = instance.process(sound, rate, buffer_size=block, reset=True)
            same(out, sound, f"{rate} Hz, blocks of {block}")
            # The readings of a stream are whole once it has ended.
            instance.reset()
            del instance

    def check(self, plugin, folder):
        import pedalboard

        for rate in (44100, 48000, 96000, 192000):
            for block in (1, 17, 64, 480, 512, 4096):
                instance = pedalboard.load_plugin(plugin)
                sound = noise(rate, 0.05)
                out = instance.process(sound, rate, buffer_size=block)
                same(out, sound, f"{rate} Hz, blocks of {block}")
        instance = pedalboard.load_plugin(plugin)
        instance.concert_pitch_hz = 415.0
        sound = noise(48000, 0.2)
        same(instance.process(sound, 48000), sound, "another concert pitch")
        kept = float(instance.concert_pitch_hz)
        fresh = pedalboard.load_plugin(plugin)
        fresh.raw_state = instance.raw_state
        found = float(fresh.concert_pitch_hz)
        if abs(kept - 415.0) > 0.2 or abs(found - kept) > 0.01:
            sys.exit(f"the concert pitch was set to 415, was {kept} and is {found} after loading")


def main():
    host = {"dawdreamer": Dawdreamer, "pedalboard": Pedalboard}[sys.argv[1]]()
    if sys.argv[2] == "render":
        plugin, path, rate = sys.argv[3:6]
        mono = np.fromfile(path, dtype=np.float32)
        host.render(plugin, np.stack([mono, mono]), float(rate))
    elif sys.argv[2] == "lane":
        plugin, path, rate, tempo, folder = sys.argv[3:8]
        mono = np.fromfile(path, dtype=np.float32)
        stretches = [tuple(map(int, stretch.split("-"))) for stretch in sys.argv[8:]]
        host.lane(plugin, np.stack([mono, mono]), float(rate), float(tempo), folder, stretches)
    else:
        import tempfile

        with tempfile.TemporaryDirectory() as folder:
            host.check(sys.argv[3], folder)


main()
