"""Opens and closes the editor again and again in the host pedalboard while audio runs through the same instance.

editor_host.py PLUGIN TIMES   needs an X display (DISPLAY), xdotool and pedalboard

Each time the window must appear, is resized and closed. The audio must come out bit for bit all the while. Prints how many
times the editor opened, how long the longest opening took, and how much memory the process gained after the first ten.
"""

import ctypes
import os
import subprocess
import sys
import threading
import time

import numpy as np
import pedalboard

RATE = 48_000
BLOCK = 512
WIDTHS = (1120, 480, 800, 1600)
# Long enough for a busy machine; what is waited for ends the wait.
PATIENCE_S = 30.0


def ignore_x_errors():
    """pedalboard's JUCE asks window 0 for a property while it embeds an editor; Xlib would end the process for it."""
    handler = ctypes.CFUNCTYPE(ctypes.c_int, ctypes.c_void_p, ctypes.c_void_p)(lambda display, event: 0)
    ctypes.CDLL("libX11.so.6").XSetErrorHandler(handler)
    return handler


def xdotool(*arguments):
    done = subprocess.run(["xdotool", *map(str, arguments)], capture_output=True, text=True, check=False)
    return done.stdout.split()


def window():
    """The editor's window: the largest visible one of this process."""
    best = None
    for name in xdotool("search", "--onlyvisible", "--pid", os.getpid()):
        shell = dict(line.split("=") for line in xdotool("getwindowgeometry", "--shell", name) if "=" in line)
        size = int(shell.get("WIDTH", 0)) * int(shell.get("HEIGHT", 0))
        if size > 60 * 60 and (best is None or size > best[0]):
            best = (size, name)
    return best and best[1]


def memory_kb():
    with open("/proc/self/statm", encoding="ascii") as file:
        return int(file.read().split()[1]) * 4


class Audio(threading.Thread):
    def __init__(self, plugin):
        super().__init__()
        self.plugin, self.stop, self.differing, self.blocks = plugin, False, 0, 0

    def run(self):
        time_s = np.arange(BLOCK) / RATE
        start = time.monotonic()
        while not self.stop:
            t = time_s + self.blocks * BLOCK / RATE
            tone = sum(0.2 / k * np.sin(2 * np.pi * 220 * k * t) for k in range(1, 9)).astype(np.float32)
            block = np.vstack([tone, tone])
            out = self.plugin.process(block, RATE, buffer_size=BLOCK, reset=False)
            self.differing += out.tobytes() != block.tobytes()
            self.blocks += 1
            time.sleep(max(0.0, start + self.blocks * BLOCK / RATE - time.monotonic()))


class Visitor(threading.Thread):
    """Waits for the window, resizes it, closes it."""

    def __init__(self, number, close):
        super().__init__()
        self.number, self.close, self.opened_s = number, close, None

    def run(self):
        start = time.monotonic()
        found = None
        while found is None and time.monotonic() - start < PATIENCE_S:
            found = window()
        if found is not None:
            self.opened_s = time.monotonic() - start
            width = WIDTHS[self.number % len(WIDTHS)]
            xdotool("windowsize", found, width, width * 2 // 3)
            time.sleep(0.15)
        self.close.set()


def main():
    plugin_path, times = sys.argv[1], int(sys.argv[2])
    _handler = ignore_x_errors()
    plugin = pedalboard.load_plugin(plugin_path)
    audio = Audio(plugin)
    audio.start()
    slowest, settled_kb = 0.0, 0
    for number in range(times):
        close = threading.Event()
        visitor = Visitor(number, close)
        visitor.start()
        plugin.show_editor(close)
        visitor.join()
        if visitor.opened_s is None:
            audio.stop = True
            sys.exit(f"opening {number + 1}: no window")
        slowest = max(slowest, visitor.opened_s)
        if number == 9:
            settled_kb = memory_kb()
    gained = memory_kb() - settled_kb
    audio.stop = True
    audio.join()
    if audio.differing:
        sys.exit(f"{audio.differing} of {audio.blocks} blocks came out changed")
    print(f"opened {times} times, slowest {slowest:.2f} s, {audio.blocks} blocks unchanged, {gained} KiB gained")
    sys.stdout.flush()
    # The host's own threads do not always end.
    os._exit(0)


main()
