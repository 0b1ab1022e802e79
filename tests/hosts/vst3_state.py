"""A VST3 plugin's own state within the state that a JUCE host keeps: read and replaced.

Such a host keeps XML behind a head of eight bytes; in it the plugin's bytes stand as the host's own Base64, six bits a
character from the lowest bit on, after their number and a dot.
"""

import json
import re
import struct

ALPHABET = ".ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz0123456789+"
COMPONENT = re.compile(r"(<IComponent>)([^<]*)(</IComponent>)")


def decoded(text):
    size, _, characters = text.partition(".")
    bits = sum(ALPHABET.index(c) << (6 * k) for k, c in enumerate(characters))
    return bits.to_bytes(len(characters) * 6 // 8 + 1, "little")[: int(size)]


def encoded(data):
    bits = int.from_bytes(data, "little")
    count = (len(data) * 8 + 5) // 6
    return f"{len(data)}." + "".join(ALPHABET[bits >> (6 * k) & 63] for k in range(count))


def read(path):
    """The plugin's state as JSON, from a host's file."""
    with open(path, "rb") as file:
        text = file.read()[8:].decode("utf-8", "replace")
    data = decoded(COMPONENT.search(text).group(2))
    return json.loads(data[data.index(b"{") : data.rindex(b"}") + 1])


def replace(path, state):
    """Puts another JSON into a host's file."""
    with open(path, "rb") as file:
        whole = file.read()
    text = whole[8:].rstrip(b"\0").decode("utf-8")
    old = decoded(COMPONENT.search(text).group(2))
    data = old[: old.index(b"{")] + json.dumps(state).encode() + old[old.rindex(b"}") + 1 :]
    text = COMPONENT.sub(lambda found: found.group(1) + encoded(data) + found.group(3), text)
    body = text.encode()
    with open(path, "wb") as file:
        file.write(whole[:4] + struct.pack("<I", len(body)) + body + b"\0")
