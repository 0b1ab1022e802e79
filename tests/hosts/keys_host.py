"""Plays a scale in the host dawdreamer: the same notes go to an instrument and to the plugin after it, as VST3.

keys_host.py PLUGIN FIRST LAST STEP BLOCK   MIDI keys from FIRST to LAST; prints the key sheet that the plugin keeps, as JSON

The instrument is a naive saw in voices, 3 cents an octave wider than the keys about A4. The sound must come through the plugin
bit for bit. The plugin measures because its readings are logged (the environment variable PLUMBTONE_READINGS).
"""

import json
import re
import sys
import tempfile

import dawdreamer
import numpy as np

RATE = 48_000
EVERY_S = 0.9
HELD_S = 0.6
SAW = """
declare nvoices "8";
freq = hslider("freq", 440, 20, 20000, 0.0001);
gain = hslider("gain", 0.5, 0, 1, 0.01);
gate = button("gate");
hz = freq * pow(2.0, 3.0 * log(freq / 440.0) / log(2.0) / 1200.0);
phasor = (+(hz / 48000.0) : \\(x).(x - floor(x))) ~ _;
envelope = gate * 0.02 : + ~ *(0.98);
process = 0.4 * (2.0 * phasor - 1.0) * gain * envelope <: _, _;
"""
# The alphabet of the host's own encoding of bytes, six bits a letter, the lowest first.
LETTERS = ".ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz0123456789+"


def component_state(saved):
    """What the plugin itself saved, out of what the host wrapped around it."""
    found = re.search(rb"<IComponent>(\d+)\.([^<]*)</IComponent>", saved)
    if not found:
        sys.exit("the host's state holds none of the plugin")
    bits = 0
    for place, letter in enumerate(found[2].decode("ascii")):
        bits |= LETTERS.index(letter) << (6 * place)
    size = int(found[1])
    return (bits & ((1 << (8 * size)) - 1)).to_bytes(size, "little")


def main():
    plugin_path = sys.argv[1]
    first, last, step, block = map(int, sys.argv[2:6])
    engine = dawdreamer.RenderEngine(RATE, block)
    saw = engine.make_faust_processor("saw")
    saw.set_dsp_string(SAW)
    saw.num_voices = 8
    if not saw.compile():
        sys.exit("the instrument cannot be made")
    plugin = engine.make_plugin_processor("plumbtone", plugin_path)
    keys = range(first, last + 1, step)
    for number, key in enumerate(keys):
        for processor in (saw, plugin):
            processor.add_midi_note(key, 100, 0.2 + EVERY_S * number, HELD_S)
    saw.record = True
    engine.load_graph([(saw, []), (plugin, ["saw"])])
    engine.render(0.2 + EVERY_S * len(keys) + 0.5)
    sound, out = saw.get_audio(), engine.get_audio()
    if np.ascontiguousarray(out).tobytes() != np.ascontiguousarray(sound).tobytes():
        sys.exit("output differs from the instrument's sound")
    if not np.abs(sound).max() > 0.05:
        sys.exit("the instrument is silent")
    # The last note is whole once the stream has ended, which the next render does.
    for processor in (saw, plugin):
        processor.clear_midi()
    engine.render(0.1)
    with tempfile.NamedTemporaryFile() as file:
        plugin.save_state(file.name)
        state = component_state(file.read())
    print(json.loads(state[state.index(b"{") :])["fields"]["keys"])


main()
