"""From a design to a list of circuit elements: resistors, capacitors, inductors, sources, tubes.

Nodes are names; "0" is ground. `known` nodes have an imposed voltage: "jack" carries the input, the others are constant.
Everything behind the output transformer is referred to its primary.
"""

from dataclasses import dataclass, field
from math import cos, pi, sin, sqrt

import numpy as np
from scipy.optimize import brentq, nnls

from design_file import Keys, gain_control, taper

ASSUMED_SHUNT_CAPACITANCE = 400e-12  # chosen: when a label gives neither leakage nor capacitance
SILICON_DROP = 0.7  # V per conducting diode, chosen: usual silicon drop
COPPER_SHARE = 0.04  # chosen: winding resistance as a share of the label impedance
CORE_LOSS_FACTOR = 20.0  # chosen: core loss resistance as a multiple of the primary impedance


@dataclass
class Netlist:
    resistors: list = field(default_factory=list)  # (a, b, ohms)
    capacitors: list = field(default_factory=list)  # (a, b, farads)
    inductors: list = field(default_factory=list)  # (a, b, henries, ohms in series): current flows a -> b
    currents: list = field(default_factory=list)  # (into node, amperes): constant
    tubes: list = field(default_factory=list)  # (name, plate, screen, grid, cathode, currents function)
    known: dict = field(default_factory=dict)  # node -> constant volts; "jack" is the input
    output: tuple = ()  # ("volts", a, b, 1/n) or ("branch", inductor number, share henries, share ohms, a, b, 1/n)
    rest_of_supply: object = None  # for the rectifier form: (source node, open-circuit law)
    notes: dict = field(default_factory=dict)
    tube_records: dict = field(default_factory=dict)
    ac: bool = True

    def resistor(self, a, b, ohms):
        if a == b:
            return
        if ohms <= 0.0:
            raise ValueError(f"resistor {a}-{b} of {ohms} ohm")
        self.resistors.append((a, b, ohms))

    def capacitor(self, a, b, farads):
        if farads < 0.0:
            raise ValueError(f"capacitor {a}-{b} of {farads} F")
        if farads > 0.0 and a != b:
            self.capacitors.append((a, b, farads))


def branch(net, a, b, keys, inner):
    """A ladder branch of a resistor and/or capacitor and/or pot wired as rheostat between nodes a and b."""
    ohms = keys.number("resistor")
    farads = keys.number("capacitor")
    pot = pot_shares(keys)
    rheostat = None if pot is None else pot["end"] + pot["ohms"] * pot["share"]
    wired = keys.take("wired")
    resistances = [r for r in (ohms, rheostat) if r is not None]
    if len(resistances) + (farads is not None) > 1 and wired not in ("series", "parallel"):
        raise ValueError(f"{keys.where}: wired must be series or parallel")
    if wired == "parallel":
        for r in resistances:
            net.resistor(a, b, r)
        if farads is not None:
            net.capacitor(a, b, farads)
    else:
        total = sum(resistances)
        if resistances and farads is not None:
            net.resistor(a, inner, total)
            net.capacitor(inner, b, farads)
        elif resistances:
            net.resistor(a, b, total)
        elif farads is not None:
            net.capacitor(a, b, farads)
        else:
            raise ValueError(f"{keys.where}: an empty branch")


def pot_shares(keys):
    ohms = keys.number("pot")
    kind = keys.take("taper", "linear")
    midpoint = keys.take("midpoint", 10)
    setting = keys.take("setting", 5)
    end = keys.number("end_resistance", 10.0)
    if ohms is None:
        return None
    return {"ohms": ohms, "end": end, "share": taper(kind, float(midpoint), float(setting) / 10.0)}


def ladder(net, stage, start, bias_node, gain):
    """The input ladder of a stage from node `start`; returns the grid node."""
    running = start
    for element in stage.get("input", []):
        element = dict(element)
        name = element["name"]
        if gain is not None and gain[:2] == (stage["name"], name):
            element["setting"] = gain[2]
        keys = Keys(element, f"{stage['name']}/{name}")
        keys.take("name")
        place = keys.take("place")
        node = f"{stage['name']}/{name}"
        if place == "series":
            branch(net, running, node, keys, node + ":inner")
            running = node
        elif place == "shunt":
            to = keys.take("to", "ground")
            branch(net, running, {"ground": "0", "bias": bias_node}[to], keys, node + ":inner")
        elif place == "divider":
            bright = keys.number("bright", 0.0)
            pot = pot_shares(keys)
            net.resistor(running, node, pot["end"] + pot["ohms"] * (1.0 - pot["share"]))
            net.capacitor(running, node, bright)
            net.resistor(node, "0", pot["end"] + pot["ohms"] * pot["share"])
            running = node
        else:
            raise ValueError(f"{keys.where}: place {place!r}")
        keys.done()
    return running


def transformer_values(table):
    """Values of the output transformer referred to its primary, from a label or from measurement.

    High end: source Rs, shunt C at the plate, r_p, then leakage L into R = n^2 (r_s + load), no magnetizing branch:
        H(w)/H(0) = (Rs + r_p + R) / ((1 + j w Rs C)(r_p + R + j w L) + Rs)
    "3 dB" is read as half power, 1/sqrt(2).
    """
    keys = Keys(table, "transformer")
    primary = keys.number("primary")
    secondary = keys.number("secondary")
    keys.take("taps")
    keys.take("rated_power")
    keys.take("dc_rated")
    low, high = keys.number("low_corner"), keys.number("high_corner")
    drop = keys.number("corner_drop", 3.0)
    source = keys.number("corner_source", primary)
    Lp = keys.number("primary_inductance")
    leakage = keys.number("leakage_inductance")
    shunt = keys.number("shunt_capacitance")
    r_p = keys.number("primary_resistance", COPPER_SHARE * primary)
    r_s = keys.number("secondary_resistance", COPPER_SHARE * secondary)
    core_loss = keys.number("core_loss", CORE_LOSS_FACTOR * primary)
    copper_inside = keys.take("impedance_includes_copper", False)
    keys.done()
    n2 = (primary - r_p) / (secondary + r_s) if copper_inside else primary / secondary
    load = n2 * secondary
    half_power = abs(drop - 3.0) < 1e-9
    excess = 1.0 if half_power else 10.0 ** (drop / 10.0) - 1.0  # 1/|H|^2 - 1 at the corner
    if Lp is None:
        a, b = source + r_p, load + n2 * r_s
        Lp = a * b / (a + b) / (2.0 * pi * low * sqrt(excess))
    if shunt is None and leakage is None:
        shunt = ASSUMED_SHUNT_CAPACITANCE
    R = load + n2 * r_s
    if leakage is None or shunt is None:
        w = 2.0 * pi * high
        limit = (source + r_p + R) ** 2 * (1.0 + excess)  # |denominator|^2 at the corner
        if leakage is None:
            # denominator = Z + j w L (1 + j w Rs C): |.|^2 = quadratic in L
            Z = (1.0 + 1j * w * source * shunt) * (r_p + R) + source
            u = 1j * w * (1.0 + 1j * w * source * shunt)
        else:
            Z = (r_p + R + 1j * w * leakage) + source
            u = 1j * w * source * (r_p + R + 1j * w * leakage)
        a, b, c = abs(u) ** 2, 2.0 * (Z * u.conjugate()).real, abs(Z) ** 2 - limit
        if b * b < 4.0 * a * c:
            raise ValueError("transformer: the high corner cannot be met")
        solved = (-b + sqrt(b * b - 4.0 * a * c)) / (2.0 * a)
        if solved <= 0.0:
            raise ValueError("transformer: the high corner cannot be met")
        if leakage is None:
            leakage = solved
        else:
            shunt = solved
    return {
        "turns_ratio_squared": n2, "primary_inductance": Lp, "leakage_inductance": leakage, "shunt_capacitance": shunt,
        "primary_resistance": r_p, "secondary_resistance": r_s, "core_loss": core_loss,
    }


def coil_pairs(table):
    """The lossy coil |Z| = K w^n (phase n 90 degrees) as five R-L pairs: nonnegative least squares, relative errors."""
    K_at, n = table["coil_at_1khz"], table["coil_exponent"]
    f = np.geomspace(100.0, 20e3, 60)
    poles = 2.0 * pi * np.geomspace(100.0, 20e3, 5)
    jw = 2j * pi * f
    target = K_at * (1j * f / 1e3) ** n
    columns = jw[:, None] / (jw[:, None] + poles[None, :]) / np.abs(target)[:, None]
    right = target / np.abs(target)
    R, _ = nnls(np.vstack([columns.real, columns.imag]), np.concatenate([right.real, right.imag]))
    return [(r, r / p) for r, p in zip(R, poles) if r > 0.0]


def add_load(net, t, load, rail, use_loudspeaker):
    """From node "magnetizing": leakage, secondary copper, load, back to the rail."""
    n2 = t["turns_ratio_squared"]
    top = "magnetizing" if t["primary_resistance"] > 0.0 else net.notes["output_plate"]
    keys = Keys(load, "load")
    resistance = keys.number("resistance")
    driver = keys.take("loudspeaker")
    keys.done()
    copper = n2 * t["secondary_resistance"]
    chain = []
    if use_loudspeaker:
        d = Keys(driver, "load.loudspeaker")
        re, le = d.number("re"), d.number("le", 0.0)
        coil = {"coil_at_1khz": d.number("coil_at_1khz"), "coil_exponent": d.take("coil_exponent")}
        fs, qms, qes, qts = d.number("fs"), d.take("qms"), d.take("qes"), d.take("qts")
        d.done()
        qes = qes if qes is not None else qts * qms / (qms - qts)
        ws = 2.0 * pi * fs
        res = re * qms / qes
        cmes, lces = qes / (ws * re), res / (ws * qms)
        if coil["coil_at_1khz"] is not None:
            chain = [(n2 * r, n2 * l, 0.0) for r, l in coil_pairs(coil)]
        chain.append((n2 * res, n2 * lces, cmes / n2))
        load_ohms, load_henries = n2 * re, n2 * le
        net.notes["loudspeaker"] = {"res": res, "cmes": cmes, "lces": lces, "pairs": len(chain) - 1}
    else:
        load_ohms, load_henries = n2 * resistance, 0.0
    end = "load:0" if chain else rail
    if t["leakage_inductance"] + load_henries > 0.0:
        net.inductors.append((top, end, t["leakage_inductance"] + load_henries, copper + load_ohms))
        net.output = ("branch", len(net.inductors) - 1, load_henries, load_ohms, end, rail, 1.0 / sqrt(n2))
    else:
        middle = "load:top" if copper > 0.0 else top
        net.resistor(top, middle, copper)
        net.resistor(middle, end, load_ohms)
        net.output = ("volts", middle, rail, 1.0 / sqrt(n2))
    for k, (r, l, c) in enumerate(chain):
        a, b = f"load:{k}", (f"load:{k + 1}" if k + 1 < len(chain) else rail)
        net.resistor(a, b, r)
        net.inductors.append((a, b, l, 0.0))
        net.capacitor(a, b, c)


class Rectifier:
    """Full-wave capacitor-input rectifier with a large capacitor, in closed form.

        tan(theta) - theta = pi Rs/(2 RL), Vdc = Vpk cos(theta), RL = Vdc/Idc
        <=> 2 Vpk (sin(theta) - theta cos(theta)) = pi Rs Idc

    A tube rectifier adds V_d/I_pk to Rs, with I_pk = (Vpk - Vdc)/Rs = perveance V_d^1.5.
    Asymptote of O. H. Schade, "Analysis of rectifier operation", Proc. IRE 31:341-361, 1943 (cited from memory).
    """

    def __init__(self, peak, winding, perveance=None):
        self.peak, self.winding, self.perveance = peak, winding, perveance

    def resistance(self, theta):
        if self.perveance is None:
            return self.winding
        drop = self.peak * 2.0 * sin(theta / 2.0) ** 2
        v_d = brentq(lambda v: v + self.winding * self.perveance * v**1.5 - drop, 0.0, drop, xtol=1e-14, rtol=1e-15)
        return drop / (self.perveance * v_d**1.5)

    def volts(self, amperes):
        if amperes <= 0.0:
            return self.peak
        f = lambda th: 2.0 * self.peak * (sin(th) - th * cos(th)) - pi * self.resistance(th) * amperes
        theta = brentq(f, 1e-6, pi / 2.0, xtol=1e-15, rtol=1e-15)
        return self.peak * cos(theta)

    def slope(self, amperes):
        """-dVdc/dIdc by a five-point difference: relative error about 1e-9."""
        h = 1e-3 * amperes
        V = self.volts
        return -(V(amperes - 2 * h) - 8 * V(amperes - h) + 8 * V(amperes + h) - V(amperes + 2 * h)) / (12 * h)


def add_supply(net, supply):
    """Rails; the source is a node of known volts behind a resistance, set later for the rectifier form."""
    keys = Keys(supply, "supply")
    rails = keys.take("rail")
    if "volts" in keys.table:
        net.known["supply"] = keys.number("volts")
        net.notes["supply"] = {"form": "volts behind resistance", "resistance": (ohms := keys.number("resistance"))}
    else:
        rms, winding = keys.number("secondary_rms"), keys.number("winding_resistance")
        kind, perveance = keys.take("rectifier"), keys.number("rectifier_perveance")
        diodes = {"silicon-bridge": 2, "silicon-full-wave": 1, "tube-full-wave": 0}[kind]
        net.rest_of_supply = Rectifier(sqrt(2.0) * rms - diodes * SILICON_DROP, winding, perveance)
        net.known["supply"] = net.rest_of_supply.peak
        ohms = winding
    keys.done()
    for rail in rails:
        k = Keys(rail, f"rail {rail['name']}")
        node = "rail:" + k.take("name")
        parent = k.take("from")
        net.capacitor(node, "0", k.number("capacitor"))
        dropping, choke = k.number("resistor"), k.number("choke")
        choke_resistance = k.number("choke_resistance", 0.0)
        k.done()
        if parent == "source":
            net.notes["source_resistor"] = len(net.resistors)
            net.notes["first_rail"] = node
            net.resistor("supply", node, ohms)
        elif choke is not None:
            net.inductors.append(("rail:" + parent, node, choke, choke_resistance))
        else:
            net.resistor("rail:" + parent, node, dropping)


def add_stage(net, stage, grid, tube, last):
    """Tube with its plate, cathode, screen and strays; returns the plate node."""
    keys = Keys(stage, stage["name"])
    name = keys.take("name")
    for read_elsewhere in ("tube", "input", "grid"):
        keys.take(read_elsewhere)
    sections = keys.take("parallel", 1)
    connection = keys.take("connection", tube.kind)
    p = Keys(keys.take("plate"), f"{name}.plate")
    plate, rail = f"{name}:plate", "rail:" + p.take("rail")
    if (ohms := p.number("resistor")) is not None:
        net.resistor(rail, plate, ohms)
    elif not last:
        raise ValueError(f"{name}: only the last stage drives the transformer")
    p.done()
    cathode = "0"
    if (table := keys.take("cathode")) is not None:
        c = Keys(table, f"{name}.cathode")
        cathode = middle = f"{name}:cathode"
        if (ohms := c.number("unbypassed")) is not None:
            middle = f"{name}:bypassed"
            net.resistor(cathode, middle, ohms)
        net.capacitor(middle, "0", c.number("bypass", 0.0))
        if (ohms := c.number("resistor")) is not None:
            net.resistor(middle, "0", ohms)
        elif (volts := c.number("diode_volts")) is not None:
            ohms = c.number("diode_resistance")
            net.resistor(middle, "0", ohms)
            net.currents.append((middle, volts / ohms))
        c.done()
    screen = None
    if (table := keys.take("screen")) is not None:
        s = Keys(table, f"{name}.screen")
        screen = "rail:" + s.take("rail")
        if (ohms := s.number("resistor", 0.0)) > 0.0:
            net.resistor(screen, f"{name}:screen", ohms)
            screen = f"{name}:screen"
            net.capacitor(screen, "0", s.number("capacitor", 0.0))
        s.done()
    strays = Keys(keys.take("strays", {}), f"{name}.strays")
    c_gp, c_gk, c_pk = (sections * c for c in tube.capacitances)
    net.capacitor(grid, plate, c_gp + strays.number("grid_plate", 0.0))
    net.capacitor(grid, cathode, c_gk + strays.number("grid_cathode", 0.0))
    net.capacitor(plate, cathode, c_pk + strays.number("plate_cathode", 0.0))
    strays.done()
    keys.done()
    net.tubes.append((name, plate, screen, grid, cathode, tube.device(connection, sections)))
    net.tube_records[name] = tube.record | {"connection": connection, "parallel": sections}
    return plate, rail


def build(design, tube_for, gain_setting=None, use_loudspeaker=False):
    """The whole circuit. `tube_for(name)` gives a laws.Tube."""
    known_tables = {"format", "name", "description", "control", "jack", "supply", "stage", "transformer", "load"}
    if extra := set(design) - known_tables:
        raise ValueError(f"tables not understood: {sorted(extra)}")
    net = Netlist()
    net.known["jack"] = 0.0
    control = gain_control(design)
    gain = None if control is None or gain_setting is None else (*control, gain_setting)
    if gain_setting is not None and control is None:
        raise ValueError("a gain setting for a design without gain control")
    from design_file import value
    source = value(design.get("jack", {}).get("source_resistance", 0.0))
    running = "jack"
    if source > 0.0:
        net.resistor("jack", "jack:behind", source)
        running = "jack:behind"
    add_supply(net, design["supply"])
    for k, stage in enumerate(design["stage"]):
        bias = f"{stage['name']}:bias"
        fixed = stage.get("grid", {}).get("fixed_bias")
        if fixed is not None:
            net.known[bias] = value(fixed)
        last = k + 1 == len(design["stage"])
        grid = ladder(net, stage, running, bias, gain)
        running, rail = add_stage(net, stage, grid, tube_for(stage["tube"]), last)
    t = transformer_values(design["transformer"])
    net.notes["transformer"] = t
    net.notes["output_plate"] = running
    middle = running
    net.capacitor(running, "0", t["shunt_capacitance"])
    if t["primary_resistance"] > 0.0:
        middle = "magnetizing"
        net.resistor(running, middle, t["primary_resistance"])
    net.resistor(middle, rail, t["core_loss"])
    net.inductors.append((middle, rail, t["primary_inductance"], 0.0))
    add_load(net, t, design["load"], rail, use_loudspeaker)
    return net
