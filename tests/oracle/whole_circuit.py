#!/usr/bin/env python3
"""Whole-circuit oracle: a design's complete network integrated to tight tolerances, to hold the renderer against.

    python3 whole_circuit.py --cases cases.toml --out results [--only NAME]
    python3 whole_circuit.py --trapezoidal [--only NAME]
    python3 whole_circuit.py --self-test
    python3 whole_circuit.py --inspect designs/rehearsal_nook.toml [--gain 6]

Nothing is shared with the program under test: its own reading of the design file, its own tube laws (laws.py), its own
circuit equations (netlist.py, state_space.py), SciPy's LSODA (checked against Radau and BDF) for time. See README.md.
"""

import argparse
import json
import sys
import time
import tomllib
from pathlib import Path

import numpy as np

import design_file
import laws
import netlist
from burst import FIR, Burst, to_48k
from solve import integrate
from state_space import StateSpace
from trapezoid import trapezoidal

FREQUENCY_HZ = 997.0  # chosen: near 1 kHz and not dividing the rate, which would hide aliases of what is compared
EDGE_S = 0.005

# level re onset (dB), probe re onset (dB or None), probe start, burst start, burst end, duration (s)
LEVELS = {
    "clean": (-12.0, None, 0.0, 0.005, 0.050, 0.080),
    "onset": (0.0, None, 0.0, 0.005, 0.050, 0.080),
    "blocking": (15.0, -12.0, 0.005, 0.020, 0.065, 0.165),
    "deep": (30.0, -12.0, 0.005, 0.020, 0.065, 0.165),
}


def fnv1a64(data):
    h = 0xCBF29CE484222325
    for byte in data:
        h = ((h ^ byte) * 0x100000001B3) & 0xFFFFFFFFFFFFFFFF
    return f"{h:016x}"


def tube_source(catalog, sets):
    """tube name -> Tube: from catalog files where a folder is given, else from the oracle's own table."""
    entries = {}
    if catalog is not None:
        for path in sorted(Path(catalog).glob("*.toml")):
            entry = tomllib.loads(path.read_text())
            for name in [entry["name"], *entry.get("aliases", [])]:
                entries[name] = (entry, f"catalog file {path.name}")

    def tube_for(name):
        if name in sets:
            return laws.own_tube(name, sets[name])
        if name in entries:
            return laws.catalog_tube(*entries[name])
        return laws.own_tube(name)

    return tube_for


def load(path, tube_for, gain_setting=None, loudspeaker=False):
    text = Path(path).read_text()
    net = netlist.build(design_file.read(text), tube_for, gain_setting, loudspeaker)
    system = StateSpace(net)
    return text, net, system, system.rest()


def linear_onset(net, system, rest, frequency=FREQUENCY_HZ):
    """Per stage, the input (V peak) that would bring its grid to its cathode, by the small-signal response."""
    volts = system.node_volts(rest, 0.0) | net.known | {"0": 0.0}
    nodes, _ = system.transfer(rest, frequency)
    return {
        name: (volts[cathode] - volts[grid]) / abs(nodes[grid] - nodes.get(cathode, 0.0))
        for name, _, _, grid, cathode, _ in net.tubes
    }


def run_case(case, folder, out, only_level=None, log=print):
    tube_for = tube_source(folder / case["catalog"] if "catalog" in case else None, case.get("sets", {}))
    gain, speaker = case.get("gain_setting"), case.get("loudspeaker", False)
    text, net, system, rest = load(folder / case["design"], tube_for, gain, speaker)
    onset = design_file.value(case["onset"])
    frequency = case.get("frequency_hz", FREQUENCY_HZ)
    for level_name, (level_db, probe_db, probe_start, burst_start, burst_end, duration) in LEVELS.items():
        if level_name not in case.get("levels", list(LEVELS)) or only_level not in (None, level_name):
            continue
        begun = time.perf_counter()
        amplitude = onset * 10.0 ** (level_db / 20.0)
        probe = 0.0 if probe_db is None else onset * 10.0 ** (probe_db / 20.0)
        burst = Burst(frequency, amplitude, probe, burst_start, burst_end, probe_start, EDGE_S, duration)
        times, states, tally = integrate(system, rest, burst)
        inputs = np.array([burst.at(t)[0] for t in times])
        frames = to_48k(system.output(states, inputs)).astype("<f4")
        name = f"{case['name']}-{level_name}"
        extremes = {}
        for k, node in enumerate(system.state_nodes):
            extremes[node] = [float(states[k].min()), float(states[k].max())]
        header = {
            "about": "loudspeaker terminal volts of the whole circuit; frames are little-endian f32 at 48 kHz",
            "case": case["name"], "level": level_name, "data": name + ".f32", "frames": len(frames),
            "frame_rate_hz": FIR["rate_hz"] // FIR["decimation"],
            "design_name": design_file.read(text)["name"], "design_file": Path(case["design"]).name,
            "design_fnv1a64": fnv1a64(text.encode()), "design_text": text,
            "gain_setting": gain, "load": "loudspeaker" if speaker else "resistance",
            "input": {
                "formula": "sin(2 pi f t) (probe W(t; probe_start, never) + (level - probe) W(t; burst_start, burst_end)); "
                "W(t; a, b) = e((t-a)/edge) e((b-t)/edge); e(u) = 0 below 0, 1 above 1, (1 - cos(pi u))/2 between",
                "frequency_hz": frequency, "onset_v": onset, "level_db_re_onset": level_db, "level_v": amplitude,
                "probe_v": probe, "probe_start_s": probe_start, "burst_start_s": burst_start, "burst_end_s": burst_end,
                "edge_s": EDGE_S, "duration_s": duration,
            },
            "fir": FIR | {"formula": "Kaiser-windowed sinc, sum 1, centered: frame j stands at t = j/48000 s; zeros before t = 0"},
            "solver": tally | {"seconds": round(time.perf_counter() - begun, 1)},
            "rest_node_volts": system.node_volts(rest, 0.0) | {k: v for k, v in net.known.items() if k != "supply"},
            "supply": net.notes["supply"], "transformer": net.notes["transformer"],
            "linear_onset_v": linear_onset(net, system, rest, frequency),
            "gain_at_frequency": abs(system.transfer(rest, frequency)[1]),
            "tubes": net.tube_records, "state_extremes": extremes,
            "output_peak_v": float(np.abs(frames).max()),
        }
        out.mkdir(parents=True, exist_ok=True)
        (out / (name + ".f32")).write_bytes(frames.tobytes())
        (out / (name + ".json")).write_text(json.dumps(header, indent=1) + "\n")
        log(f"{name}: {len(frames)} frames, peak {header['output_peak_v']:.4g} V, {header['solver']['seconds']} s, "
            f"{tally['evaluations']} evaluations")


def trapezoidal_floor(case, folder, out, only_level=None):
    """Error of a plain trapezoidal solution at 384 kHz against the recorded result: what that rule can reach at best."""
    tube_for = tube_source(folder / case["catalog"] if "catalog" in case else None, case.get("sets", {}))
    for level in LEVELS:
        recorded = out / f"{case['name']}-{level}.json"
        if not recorded.exists() or only_level not in (None, level):
            continue
        header = json.loads(recorded.read_text())
        _, net, system, rest = load(folder / case["design"], tube_for, case.get("gain_setting"))
        i = header["input"]
        burst = Burst(i["frequency_hz"], i["level_v"], i["probe_v"], i["burst_start_s"], i["burst_end_s"],
                      i["probe_start_s"], i["edge_s"], i["duration_s"])
        kind, number, _, ohms, _, _, scale = net.output
        frames = to_48k(scale * ohms * trapezoidal(net, system, rest, burst, FIR["rate_hz"])[number])
        reference = np.frombuffer((out / header["data"]).read_bytes(), "<f4").astype(float)
        error = np.sqrt(np.sum((frames - reference) ** 2) / np.sum(reference**2))
        print(f"{case['name']}-{level}: trapezoidal rule at 384 kHz {20 * np.log10(error):.1f} dB", flush=True)


def inspect(path, tube_for, gain):
    _, net, system, rest = load(path, tube_for, gain)
    print(f"{system.nx} capacitor states, {system.size - system.nx} inductor states; "
          f"algebraic nodes: {system.references}{', solved with the tubes' if system.implicit else ''}")
    for node, volts in system.node_volts(rest, 0.0).items():
        print(f"  {node:28s} {volts:11.4f} V")
    for name, (w, record) in zip(net.tube_records, zip(system.ports(rest, 0.0)[0].reshape(-1, 3), net.tube_records.values())):
        print(f"  {name}: set {record['set']}; plate {1e3 * w[2]:.4f} mA, screen {1e3 * w[1]:.4f} mA, grid {1e6 * w[0]:.4g} uA")
    for name, volts in linear_onset(net, system, rest).items():
        print(f"  grid of {name} reaches its cathode at {volts:.4g} V peak (linear)")
    print(f"  gain at {FREQUENCY_HZ:g} Hz: {abs(system.transfer(rest, FREQUENCY_HZ)[1]):.6g}")
    print(f"  {json.dumps(net.notes['transformer'])}\n  {json.dumps(net.notes['supply'])}")


def main():
    here = Path(__file__).resolve().parent
    parser = argparse.ArgumentParser(description="whole-circuit oracle")
    parser.add_argument("--cases", type=Path, default=here / "cases.toml")
    parser.add_argument("--out", type=Path, default=here / "results")
    parser.add_argument("--only", help="one case by name, or case-level")
    parser.add_argument("--trapezoidal", action="store_true", help="hold a plain trapezoidal solution against the recorded results")
    parser.add_argument("--self-test", action="store_true", help="prove the oracle against known answers")
    parser.add_argument("--inspect", type=Path, metavar="DESIGN", help="print a design's rest state")
    parser.add_argument("--gain", type=float, help="gain setting for --inspect")
    parser.add_argument("--catalog", type=Path, help="folder of catalog files for --inspect")
    args = parser.parse_args()
    if args.self_test:
        import self_test
        return self_test.run()
    if args.inspect:
        inspect(args.inspect, tube_source(args.catalog, {}), args.gain)
        return 0
    cases = tomllib.loads(args.cases.read_text())["case"]
    found = False
    for case in cases:
        level = None
        if args.only is not None and args.only != case["name"]:
            level = args.only.removeprefix(case["name"] + "-")
            if level not in LEVELS:
                continue
        found = True
        if args.trapezoidal:
            trapezoidal_floor(case, args.cases.resolve().parent, args.out, level)
            continue
        run_case(case, args.cases.resolve().parent, args.out, level, lambda line: print(line, flush=True))
    if not found:
        print(f"no case {args.only!r}; there are: {', '.join(c['name'] for c in cases)}", file=sys.stderr)
        return 2
    return 0


if __name__ == "__main__":
    sys.exit(main())
