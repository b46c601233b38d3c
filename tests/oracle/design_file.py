"""Reading a design file: component values and the defaults of the format, for the oracle alone.

Values follow IEC 60062 (4K7, 4n7, 4R7) and common SI writing (4.7k, 0.022u, 250V, 15kHz). Levels in dBV and dBu are RMS
scales of a sine and come back as peak volts. Nothing here judges a design: a key that is not understood is an error, a
value out of range is not looked for.
"""

import re
import tomllib
from math import sqrt

PREFIX = {"p": 1e-12, "n": 1e-9, "u": 1e-6, "µ": 1e-6, "μ": 1e-6, "m": 1e-3, "k": 1e3, "K": 1e3, "M": 1e6, "G": 1e9}
DECIMAL = re.compile(r"([+-]?\d+(?:\.\d+)?(?:[eE][+-]?\d+)?)\s*([pnuµμmkKMG]?)\s*(R|Ω|ohm|F|H|Hz|V|A|W|dB|)")
LETTER = re.compile(r"([+-]?\d+)([pnuµμmkKMGR])(\d+)\s*(F|H|V|A|W|Ω|)")
LEVEL = re.compile(r"([+-]?\d+(?:\.\d+)?)\s*(dBV|dBu)")
DBU_VOLTS = sqrt(0.6)  # 0 dBu: 1 mW in 600 ohm


def value(written):
    """A component value in its SI base unit."""
    if isinstance(written, (int, float)) and not isinstance(written, bool):
        return float(written)
    text = written.strip()
    if m := LEVEL.fullmatch(text):
        reference = 1.0 if m[2] == "dBV" else DBU_VOLTS
        return sqrt(2.0) * reference * 10.0 ** (float(m[1]) / 20.0)
    if m := DECIMAL.fullmatch(text):
        return float(m[1]) * PREFIX.get(m[2], 1.0)
    if m := LETTER.fullmatch(text):
        return float(f"{m[1]}.{m[3]}") * PREFIX.get(m[2], 1.0)
    raise ValueError(f"not a component value: {written!r}")


def taper(kind, midpoint_percent, x):
    """Share of a pot's resistance below the wiper at rotation x (0..1); audio: two straight pieces."""
    if kind == "linear":
        return x
    if kind == "reverse-audio":
        return 1.0 - taper("audio", midpoint_percent, 1.0 - x)
    if kind != "audio":
        raise ValueError(f"unknown taper {kind!r}")
    middle = midpoint_percent / 100.0
    return 2.0 * middle * x if x <= 0.5 else middle + (1.0 - middle) * (2.0 * x - 1.0)


def read(text):
    """The design as nested dictionaries, as written."""
    design = tomllib.loads(text)
    if design.get("format") != 1:
        raise ValueError("format must be 1")
    return design


def gain_control(design):
    """(stage name, element name) of the pot that is the gain control, or None."""
    wanted = design.get("control", {}).get("gain")
    if wanted is None:
        return None
    found = [
        (stage["name"], element["name"])
        for stage in design["stage"]
        for element in stage.get("input", [])
        if wanted in (element["name"], f"{stage['name']}/{element['name']}")
    ]
    if len(found) != 1:
        raise ValueError(f"control.gain {wanted!r} names {len(found)} elements")
    return found[0]


class Keys:
    """A table of which every key must be asked for: one that is left over was not understood."""

    def __init__(self, table, where):
        self.table = dict(table)
        self.where = where

    def take(self, key, default=None):
        return self.table.pop(key, default)

    def number(self, key, default=None):
        written = self.table.pop(key, None)
        return default if written is None else value(written)

    def done(self):
        if self.table:
            raise ValueError(f"{self.where}: keys not understood: {sorted(self.table)}")
