"""The test signal, its band limit and its way to 48 kHz.

Input at the jack, in volts (t in s; W a window with raised-cosine edges of `edge` seconds inside start..end):

    s(t) = sin(2 pi f t) [A_probe W(t; probe_start, never) + (A - A_probe) W(t; burst_start, burst_end)]
    W(t; a, b) = e((t - a)/edge) e((b - t)/edge),   e(u) = 0 for u <= 0, 1 for u >= 1, (1 - cos(pi u))/2 between

Its spectrum falls by 18 dB per octave past the edges' corner: band-limited for all purposes at 384 kHz.

The solution is sampled at 384 kHz, low-passed and decimated by 8. Filter: linear-phase FIR, `taps` odd, m = (taps - 1)/2,

    h[k] = c sinc(2 fc/fs (k - m)) I0(beta sqrt(1 - ((k - m)/m)^2))/I0(beta),   sinc(x) = sin(pi x)/(pi x),  sum h = 1

With 2049 taps, beta 14.5 and fc 21 kHz at fs 384 kHz it is flat within 1e-6 dB to 20 kHz and more than 140 dB down
from 22 kHz (checked by the self-test). Stored frame j is sum_k h[k] x[8 j + m - k], x = 0 before the start (rest);
frames that would need samples past the end are not stored. So frame j stands at t = j/48000 s, without delay.
"""

from dataclasses import dataclass
from math import cos, pi, sin

import numpy as np

RATE = 384000
DECIMATION = 8
FIR = {"taps": 2049, "beta": 14.5, "cut_hz": 21000.0, "rate_hz": RATE, "decimation": DECIMATION}


def edge_value(u):
    """The raised-cosine edge and its slope over u."""
    if u <= 0.0:
        return 0.0, 0.0
    if u >= 1.0:
        return 1.0, 0.0
    return 0.5 * (1.0 - cos(pi * u)), 0.5 * pi * sin(pi * u)


@dataclass
class Burst:
    frequency: float
    level: float  # A, V peak
    probe: float  # A_probe, V peak, 0 for none
    burst_start: float
    burst_end: float
    probe_start: float
    edge: float
    duration: float

    def at(self, t):
        """Input and its slope over time."""
        up, dup = edge_value((t - self.burst_start) / self.edge)
        down, ddown = edge_value((self.burst_end - t) / self.edge)
        lift = self.level - self.probe
        envelope = lift * up * down
        slope = lift * (dup * down - up * ddown) / self.edge
        if self.probe:
            on, don = edge_value((t - self.probe_start) / self.edge)
            envelope += self.probe * on
            slope += self.probe * don / self.edge
        w = 2.0 * pi * self.frequency
        carrier = sin(w * t)
        return envelope * carrier, slope * carrier + envelope * w * cos(w * t)


def fir_taps(spec=FIR):
    m = (spec["taps"] - 1) // 2
    k = np.arange(spec["taps"]) - m
    h = np.sinc(2.0 * spec["cut_hz"] / spec["rate_hz"] * k) * np.kaiser(spec["taps"], spec["beta"])
    return h / h.sum()


def to_48k(x, spec=FIR):
    """Band-limited and decimated; as many frames as have all their samples."""
    h = fir_taps(spec)
    m = (spec["taps"] - 1) // 2
    padded = np.concatenate([np.zeros(m), x])
    n = 1 << (len(padded) + len(h)).bit_length()
    filtered = np.fft.irfft(np.fft.rfft(padded, n) * np.fft.rfft(h, n), n)
    centered = filtered[2 * m : len(padded)]  # full support only
    return centered[:: spec["decimation"]]
