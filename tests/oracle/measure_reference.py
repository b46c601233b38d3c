"""Harmonic figures and threshold crossings of a few waveforms by NumPy and SciPy.

Writes measure_reference.json beside this file. The figures are computed from their definitions with
numpy.fft, the crossings with scipy.interpolate.PchipInterpolator; nothing here shares code with the
program. Samples are rounded to six decimals, so that both sides start from the same numbers.

    python3 tests/oracle/measure_reference.py
"""

import json
import pathlib
import sys

import numpy
import scipy
from scipy.interpolate import PchipInterpolator

HIGHEST = 10


def waveforms():
    """(name, samples, periods)"""
    random = numpy.random.default_rng(20)

    def turn(n, periods=1):
        return 2 * numpy.pi * periods * numpy.arange(n) / n

    yield "soft asymmetric limiter", numpy.tanh(1.7 * numpy.sin(turn(384) + 0.9) + 0.4), 1
    yield "exponential curve, prime length", numpy.exp(0.8 * numpy.sin(turn(383))) * 60 + 150, 1
    t = turn(4660)
    mixture = sum(
        random.normal() / n**1.5 * numpy.cos(n * t + random.uniform(-3, 3)) for n in range(1, 30)
    )
    yield "twenty-nine random harmonics", mixture, 1
    yield "five periods of noise", numpy.tile(random.normal(size=97), 5), 5
    yield "seven periods, cut unevenly", numpy.maximum(numpy.sin(turn(500, 7)) + 0.3, 0.0), 7
    yield "nine samples", random.normal(size=9), 1


def figures(samples, periods):
    """Amplitudes are peak; phases are those of sines, relative to the fundamental's."""
    n = len(samples)
    spectrum = numpy.fft.rfft(samples) * 2 / n
    count = min(HIGHEST, (n - 1) // 2 // periods)
    line = spectrum[periods * numpy.arange(1, count + 1)]
    peak = numpy.abs(line)
    order = numpy.arange(1, count + 1)
    sine_phase = numpy.angle(line) + numpy.pi / 2
    relative = numpy.degrees(numpy.angle(numpy.exp(1j * (sine_phase - order * sine_phase[0]))))
    # About the fundamental's positive peak: rotate time until its cosine starts there.
    about_peak = line * numpy.exp(-1j * order * numpy.angle(line[0]))
    over = peak[1:] / peak[0]
    dc = samples.mean()
    ac = samples - dc
    m = numpy.arange(n)
    fundamental = peak[0] * numpy.cos(2 * numpy.pi * periods * m / n + numpy.angle(line[0]))

    def rss(values):
        return float(numpy.sqrt(numpy.sum(values**2)))

    return {
        "dc": float(dc),
        "rms": float(ac.std()),
        "fundamental_peak": float(peak[0]),
        "dbc": (20 * numpy.log10(over)).tolist(),
        "phases_deg": relative[1:].tolist(),
        "signed_percent": (100 * over * numpy.sign(about_peak[1:].real)).tolist(),
        "thd_percent": 100 * rss(over),
        "thd_total_percent": 100 * rss(peak[1:]) / rss(peak),
        "residual_percent": float(100 * (ac - fundamental).std() / ac.std()),
        "weighted_rma_percent": 100 * rss(over * order[1:] / 2),
        "weighted_shorter_percent": 100 * rss(over * order[1:] ** 2 / 4),
    }


def crossing_cases():
    """Distortion curves over level, and where they first rise through a mark."""
    random = numpy.random.default_rng(21)
    level = numpy.geomspace(0.01, 5, 12).round(5)
    curves = {
        "even then odd": 2 * level + 6 * level**2,
        "knee": 0.1 * level + 30 * numpy.maximum(level - 0.4, 0),
        "dip": numpy.abs(4 * level - 4 * level**2) + 0.02,
        "rough": numpy.cumsum(random.uniform(0.01, 2, size=12)),
    }
    for name, curve in curves.items():
        curve = curve.round(6)
        for mark in (0.5, 3.0):
            above = curve >= mark
            rises = numpy.flatnonzero(~above[:-1] & above[1:])
            falls = numpy.flatnonzero(above[:-1] & ~above[1:])
            x = numpy.log(level)
            y = numpy.log(curve / mark)
            roots = PchipInterpolator(x, y).roots(extrapolate=False)
            first = None
            if len(rises):
                inside = (roots >= x[rises[0]]) & (roots <= x[rises[0] + 1])
                first = float(numpy.exp(roots[inside][0]))
            yield {
                "name": name,
                "levels": level.tolist(),
                "values": curve.tolist(),
                "mark": mark,
                "first_upward": first,
                "upward": len(rises),
                "downward": len(falls),
            }


def main():
    cases = []
    for name, samples, periods in waveforms():
        samples = samples.round(6)
        cases.append(
            {
                "name": name,
                "periods": periods,
                "samples": samples.tolist(),
                "figures": figures(samples, periods),
            }
        )
    reference = {
        "made_by": f"measure_reference.py, NumPy {numpy.__version__}, SciPy {scipy.__version__}",
        "harmonics": cases,
        "crossings": list(crossing_cases()),
    }
    path = pathlib.Path(__file__).with_suffix(".json")
    path.write_text(json.dumps(reference) + "\n", encoding="utf-8")
    print(path.name, path.stat().st_size, "bytes", file=sys.stderr)


main()
