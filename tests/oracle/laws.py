"""Tube laws and their parameters, coded for the oracle alone.

Space current, its division and the knee follow the forms named below; the numbers are the project's own joint
fits to published data sheets (see presets/tubes/*.toml for the sheets behind each set), rounded to four figures.

    S(z) = ln(1 + e^z), vp+ = max(vp, 0), vs+ = max(vs, 0); volts to the cathode, amperes into the electrode

Pentode and beam tetrode (softened control voltage after N. L. Koren, "Improved vacuum tube models", Glass Audio
8(5), 1996; power-law division of current between plate and screen; smooth minimum with a 3/2-power limit line):

    ve = vs+ + D vp+           c = sqrt(KVB + ve^2)/KP       E = c S((ve/MU + vg + VCT)/c)     I0 = E^EX/KG
    x = vp+/(vs+ + 1)          xh = (x + X0)/(1 + X0)        t = MU vg     z = t/sqrt(vs+^2 + t^2 + 1)
    R = DEL xh^M exp(NU z)     A = I0 R/(1 + R)              B = P (vp+/10)^1.5
    ip = A B/(A^s + B^s)^(1/s) is = I0/(1 + R) + TAU (A - ip)

    two sections: I0 = ((1 - W) E(MU)^EX + W E(M2 MU)^EX)/KG

Triode:

    c = sqrt(KVB + vp+^2)/KP   E = c S((vp+/MU + vg + VCT)/c)
    ip = E^EX/KG (1 - exp(-vp+/(V0 + VA S(4 vg)/4)))

Grid current (form of K. Dempwolf and U. Zoelzer, DAFx 2011, with plate dependence and an ended tail):

    u = max(S(C (vg - VO))/C - S(C (-1 - VO))/C, 0)          ig = GG u^XI ((vp+ + 3)/100)^(-Q)

Every `currents` function returns (ip, is, ig, dip_g, dip_s, dip_p, dis_g, dis_s, dis_p, dig_g, dig_p).
"""

from math import exp, log, log1p, sqrt

KVB_PENTODE = 400.0  # V^2, chosen: softness of one grid volt scale at zero screen volts
X0 = 0.05  # chosen: keeps the division ratio finite at zero plate volts
NU = 1.0  # chosen: the largest value for which screen current rises with the grid

PENTODES = {
    # set: MU, EX, KG, KP, VCT, D, DEL, M, P (mA at 10 V), s, TAU[, W, M2]
    "EL84": (19.86, 1.379, 197.4, 129.2, -0.3341, 0.02769, 13.77, 0.5778, 145.2, 0.937, 0.2707),
    "EL84 rows weighted": (20.22, 1.358, 183.7, 119.6, -0.2283, 0.02614, 14.52, 0.5777, 134.5, 0.9335, 0.2747),
    "6V6": (10.33, 1.375, 761.5, 64.56, 1.130, 0.03203, 16.97, 0.8378, 22.38, 3.620, 0.1974),
    "6V6 rows weighted": (9.790, 1.452, 1091, 73.80, 1.566, 0.02079, 16.30, 0.7630, 23.00, 2.805, 0.2381),
    "6V6 two sections": (9.771, 1.343, 560.6, 85.27, 0.3881, 0.03032, 17.31, 0.9236, 28.87, 2.705, 0.1244, 0.2549, 2.815),
    "6L6GC": (9.934, 1.349, 468.8, 38.23, 0.7303, 0.05023, 24.34, 0.8614, 21.78, 6.286, 0.2870),
}
PENTODE_NAMES = ("MU", "EX", "KG", "KP", "VCT", "D", "DEL", "M", "P", "s", "TAU", "W", "M2")

TRIODES = {
    # set: MU, EX, KG, KP, KVB, VCT, V0, VA
    "12AX7": (100.7, 1.497, 959, 815.2, 22900, 0.601, 13.37, 0.7435),
    "12AU7": (21.37, 1.477, 1017.5, 67.93, 1488, 0.6091, 5.951, 1.153),
    "12AT7": (88.32, 1.581, 328.5, 152.3, 179.2, 0.8427, 26.3, 9.502),
    "6SN7": (21.83, 1.083, 376.5, 142.8, 19120, -0.9025, 3.949, 0.987),
}
TRIODE_NAMES = ("MU", "EX", "KG", "KP", "KVB", "VCT", "V0", "VA")

# Grid current: GG, XI, Q, VO, C. Only the 12AT7's is fitted (41 published points: +1 to +8 V grid, 27 to 302 V plate; C is
# assumed). The others are stand-ins: that law scaled by space current at +2 V grid and 100 V plate (and screen), see
# `stand_in_grid` and the self-test; for power tubes Q = 0, the screen shields the grid. VO of EL84 and 12AU7 is moved to
# where their Philips sheets have +0.3 uA; that step is taken from the catalog, not repeated here.
GRID_12AT7 = (2.396e-3, 1.422, 0.218, 0.09, 6.0)
GRID = {
    "12AT7": GRID_12AT7,
    "12AX7": (7.05e-4, 1.422, 0.218, 0.09, 6.0),
    "12AU7": (1.848e-3, 1.422, 0.218, 0.42, 6.0),
    "6SN7": (1.741e-3, 1.422, 0.218, 0.09, 6.0),
    "EL84": (7.284e-3, 1.422, 0.0, 0.29, 6.0),
    "6V6": (4.215e-3, 1.422, 0.0, 0.09, 6.0),
    "6L6GC": (6.999e-3, 1.422, 0.0, 0.09, 6.0),
}

# Interelectrode capacitances in pF: grid-plate, grid-cathode, plate-cathode, from the sheets named.
CAPACITANCES = {
    "12AX7": (1.7, 1.6, 0.46, "Brimar application report VAD/513.5 (March 1950), pp. 2-3; Tung-Sol 12AX7 (Dec 1947)"),
    "12AU7": (1.5, 1.6, 0.5, "Brimar application report VAD/513.4 (Aug 1950), pp. 2-3"),
    "12AT7": (1.5, 2.2, 0.5, "General Electric 12AT7, ET-T1440 (2-57), pp. 1-2"),
    "6SN7": (4.0, 3.0, 1.2, "Tung-Sol 6SN7GT, plate 1584 (31 July 1945), the larger of the two sections each"),
    "6V6": (0.7, 9.5, 7.5, "AWV Radiotron 6V6-GT (Dec 1944)"),
    "EL84": (0.5, 10.8, 6.5, "Philips EL84 (1955), pp. 1 and 6; grid-plate is printed as an upper bound"),
    "6L6GC": (1.5, 12.5, 10.0, "JJ 6L6GC sheet"),
}

# tube name in a design -> default parameter set
DEFAULT_SET = {
    "12AX7": "12AX7", "ECC83": "12AX7", "12AU7": "12AU7", "ECC82": "12AU7", "12AT7": "12AT7", "ECC81": "12AT7",
    "6SN7": "6SN7", "6SN7GT": "6SN7", "EL84": "EL84 rows weighted", "6BQ5": "EL84 rows weighted", "6V6": "6V6 rows weighted",
    "6V6GT": "6V6 rows weighted", "6L6GC": "6L6GC",
}
BASE_TYPE = {"EL84 rows weighted": "EL84", "6V6 rows weighted": "6V6", "6V6 two sections": "6V6"}


def softplus(z):
    """ln(1 + e^z) and its slope, both to full relative precision for any z."""
    if z > 0.0:
        q = exp(-z)
        return z + log1p(q), 1.0 / (1.0 + q)
    if z < -700.0:
        return 0.0, 0.0
    q = exp(z)
    return log1p(q), q / (1.0 + q)


def grid_law(GG, XI, Q, VO, C):
    floor = softplus(C * (-1.0 - VO))[0] / C

    def grid(vg, vp):
        """Grid current and its slopes over grid and plate volts."""
        S, sigma = softplus(C * (vg - VO))
        u = S / C - floor
        if u <= 0.0:
            return 0.0, 0.0, 0.0
        ig = GG * u**XI
        dig_p = 0.0
        if Q != 0.0:
            w = (vp if vp > 0.0 else 0.0) + 3.0
            ig *= (w / 100.0) ** -Q
            if vp > 0.0:
                dig_p = -Q * ig / w
        return ig, ig * XI / u * sigma, dig_p

    return grid


def triode_law(parameters, grid):
    MU, EX, KG, KP, KVB, VCT, V0, VA = (float(p) for p in parameters)

    def currents(vg, vs, vp):
        v = vp if vp > 0.0 else 0.0
        ig, dig_g, dig_p = grid(vg, vp)
        root = sqrt(KVB + v * v)
        c = root / KP
        y = (v / MU + vg + VCT) / c
        S, sigma = softplus(y)
        E = c * S
        if v == 0.0 or E <= 0.0:
            # at vp = 0 the low-plate factor is zero with a finite slope to the right only
            return 0.0, 0.0, ig, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0, dig_g, dig_p
        I0 = E**EX / KG
        slope = EX * I0 / E
        dI_g = slope * sigma
        dI_p = slope * (sigma / MU + (S - y * sigma) * v / (root * KP))
        S4, sigma4 = softplus(4.0 * vg)
        V = V0 + VA * S4 / 4.0
        tail = exp(-v / V)
        F = 1.0 - tail
        ip = I0 * F
        dip_g = dI_g * F - I0 * tail * v / (V * V) * VA * sigma4
        dip_p = dI_p * F + I0 * tail / V
        return ip, 0.0, ig, dip_g, 0.0, dip_p, 0.0, 0.0, 0.0, dig_g, dig_p

    return currents


def pentode_law(parameters, grid):
    MU, EX, KG, KP, VCT, D, DEL, M, P_mA, s, TAU = (float(p) for p in parameters[:11])
    W, M2 = parameters[11:] if len(parameters) > 11 else (0.0, 1.0)
    P = P_mA * 1e-3

    def space_current(ve, vg, c, dc, mu, share):
        y = (ve / mu + vg + VCT) / c
        S, sigma = softplus(y)
        E = c * S
        if E <= 0.0:
            return 0.0, 0.0, 0.0
        I0 = share * E**EX / KG
        slope = EX * I0 / E
        return I0, slope * sigma, slope * (sigma / mu + (S - y * sigma) * dc)

    def currents(vg, vs, vp):
        v2 = vs if vs > 0.0 else 0.0
        v = vp if vp > 0.0 else 0.0
        s_on = 1.0 if vs > 0.0 else 0.0
        p_on = 1.0 if vp > 0.0 else 0.0
        ig, dig_g, dig_p = grid(vg, vp)
        ve = v2 + D * v
        root = sqrt(KVB_PENTODE + ve * ve)
        c = root / KP
        dc = ve / (root * KP)
        I0, dI_g, dI_e = space_current(ve, vg, c, dc, MU, 1.0 - W)
        if W != 0.0:
            J0, dJ_g, dJ_e = space_current(ve, vg, c, dc, MU * M2, W)
            I0 += J0
            dI_g += dJ_g
            dI_e += dJ_e
        if I0 <= 1e-300:
            return 0.0, 0.0, ig, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0, dig_g, dig_p
        dI_s = dI_e * s_on
        dI_p = dI_e * D * p_on
        x = v / (v2 + 1.0)
        t = MU * vg
        w = v2 * v2 + t * t + 1.0
        w15 = w * sqrt(w)
        R = DEL * ((x + X0) / (1.0 + X0)) ** M * exp(NU * t / sqrt(w))
        dlnR_g = NU * MU * (v2 * v2 + 1.0) / w15
        dlnR_s = (-NU * t * v2 / w15 - M / (x + X0) * v / (v2 + 1.0) ** 2) * s_on
        dlnR_p = M / (x + X0) / (v2 + 1.0) * p_on
        plate_share = R / (1.0 + R)
        screen_share = 1.0 / (1.0 + R)
        move = I0 * plate_share * screen_share  # dA/dlnR = -d(I0/(1+R))/dlnR
        A = I0 * plate_share
        dA_g = dI_g * plate_share + move * dlnR_g
        dA_s = dI_s * plate_share + move * dlnR_s
        dA_p = dI_p * plate_share + move * dlnR_p
        if v > 0.0:
            B = P * (0.1 * v) ** 1.5
            if B < 1e-15 * A:
                B = 1e-15 * A
            soft, sigma = softplus(s * log(A / B))
            ip = A * exp(-soft / s)
            f = 1.0 - sigma
            by_A = ip / A * f
            dip_g = by_A * dA_g
            dip_s = by_A * dA_s
            dip_p = by_A * dA_p + 1.5 * ip / v * sigma
        else:
            ip = dip_g = dip_s = dip_p = 0.0
        i2 = I0 * screen_share + TAU * (A - ip)
        dis_g = dI_g * screen_share - move * dlnR_g + TAU * (dA_g - dip_g)
        dis_s = dI_s * screen_share - move * dlnR_s + TAU * (dA_s - dip_s)
        dis_p = dI_p * screen_share - move * dlnR_p + TAU * (dA_p - dip_p)
        return ip, i2, ig, dip_g, dip_s, dip_p, dis_g, dis_s, dis_p, dig_g, dig_p

    return currents


def triode_connected(currents):
    """Screen tied to the plate: one electrode takes both currents."""

    def tied(vg, vs, vp):
        ip, i2, ig, pg, ps, pp, sg, ss, sp, gg, gp = currents(vg, vp, vp)
        return ip + i2, 0.0, ig, pg + sg, 0.0, pp + ps + sp + ss, 0.0, 0.0, 0.0, gg, gp

    return tied


def in_parallel(currents, sections):
    if sections == 1:
        return currents

    def several(vg, vs, vp):
        return tuple(sections * i for i in currents(vg, vs, vp))

    return several


def space_current_at_2_100(name):
    """Total space current in A at +2 V grid, 100 V plate (and screen): what the grid-current stand-ins scale by."""
    none = lambda vg, vp: (0.0, 0.0, 0.0)
    if name in TRIODES:
        return triode_law(TRIODES[name], none)(2.0, 0.0, 100.0)[0]
    i = pentode_law(PENTODES[name], none)(2.0, 100.0, 100.0)
    return i[0] + i[1]


def stand_in_grid(set_name):
    """The 12AT7's grid law scaled by space current; for power tubes without plate dependence."""
    GG, XI, Q, VO, C = GRID_12AT7
    scale = space_current_at_2_100(set_name) / space_current_at_2_100("12AT7")
    if set_name in TRIODES:
        return (GG * scale, XI, Q, VO, C)
    return (GG * scale, XI, 0.0, VO, C)


class Tube:
    """One type: law parameters, grid-current constants, capacitances; `record` is what goes into a result's header."""

    def __init__(self, name, set_name, kind, parameters, grid_constants, capacitances_pf, origin):
        self.name = name
        self.kind = kind
        self.parameters = parameters
        self.grid_constants = tuple(float(g) for g in grid_constants)
        self.capacitances = tuple(1e-12 * c for c in capacitances_pf)
        law = triode_law if kind == "triode" else pentode_law
        self.currents = law(parameters, grid_law(*self.grid_constants))
        names = TRIODE_NAMES if kind == "triode" else PENTODE_NAMES
        self.record = {
            "tube": name, "set": set_name, "kind": kind, "from": origin, "law": dict(zip(names, parameters)),
            "grid_current": dict(zip(("GG", "XI", "Q", "VO", "C"), self.grid_constants)),
            "capacitances_pf": dict(zip(("grid_plate", "grid_cathode", "plate_cathode"), capacitances_pf)),
        }

    def device(self, connection, sections):
        currents = triode_connected(self.currents) if connection == "triode" and self.kind == "pentode" else self.currents
        return in_parallel(currents, sections)


def own_tube(name, set_name=None):
    """A tube from the table above; `set_name` picks another parameter set of the same type."""
    set_name = set_name or DEFAULT_SET[name]
    kind = "triode" if set_name in TRIODES else "pentode"
    parameters = TRIODES[set_name] if kind == "triode" else PENTODES[set_name]
    base = BASE_TYPE.get(set_name, set_name)
    return Tube(name, set_name, kind, parameters, GRID[base], CAPACITANCES[base][:3], "the oracle's own table")


CATALOG_KEYS = {
    "triode": ("amplification_factor", "current_exponent", "inverse_perveance", "cutoff_sharpness", "softness_floor",
               "contact_volts", "low_plate_volts", "low_plate_growth"),
    "pentode": ("screen_amplification_factor", "current_exponent", "inverse_perveance", "cutoff_sharpness",
                "contact_volts", "plate_penetration", "division_ratio", "division_exponent",
                "limit_milliamperes_at_ten_volts", "knee_sharpness", "returned_share"),
}
GRID_KEYS = ("perveance", "current_exponent", "plate_exponent", "onset_volts", "onset_sharpness")


def catalog_tube(entry, origin):
    """A tube from a parsed catalog file (presets/tubes/*.toml)."""
    kind = entry["kind"]
    parameters = [entry["law"][key] for key in CATALOG_KEYS[kind]]
    second = [entry["law"].get(key) for key in ("second_section_share", "second_section_ratio")]
    if None not in second:
        parameters += second
    grid = [entry["grid_current"][key] for key in GRID_KEYS]
    c = entry["capacitances"]
    pf = (c["grid_plate_pf"], c["grid_cathode_pf"], c["plate_cathode_pf"])
    return Tube(entry["name"], entry["name"], kind, parameters, grid, pf, origin)
