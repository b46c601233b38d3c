"""The plainest other way: companion models at a fixed step, every unknown node solved at once by Newton.

Shares the list of elements with the oracle and nothing else; second order in the step. It proves the state equations and
their integration, and tells what a renderer built on the trapezoidal rule can reach at best at its rate.
"""

import numpy as np


def trapezoidal(net, system, rest, burst, rate):
    """Companion-model nodal analysis at a fixed step, every unknown node solved by Newton at once: the plainest way."""
    nodes = system.unknown
    index = {n: k for k, n in enumerate(nodes)}
    h = 1.0 / rate
    n, m = len(nodes), len(net.inductors)
    volts0 = system.node_volts(rest, 0.0)
    v = np.array([volts0[x] for x in nodes])
    i_l = np.array(rest[system.nx:])
    known = dict(net.known) | {"0": 0.0}

    def row(a, b):
        r = np.zeros(n)
        if a in index:
            r[index[a]] += 1
        if b in index:
            r[index[b]] -= 1
        return r

    def fixed(a, b, s):
        val = lambda x: s if x == "jack" else known.get(x, 0.0)
        return (0.0 if a in index else val(a)) - (0.0 if b in index else val(b))

    G = np.zeros((n, n))
    for a, b, ohms in net.resistors:
        r = row(a, b)
        G += np.outer(r, r) / ohms
    caps = [(row(a, b), a, b, 2 * c / h) for a, b, c in net.capacitors]
    coils = [(row(a, b), a, b, h / (2 * l + h * r), (2 * l - h * r) / (2 * l + h * r)) for a, b, l, r in net.inductors]
    for r, _, _, g in caps:
        G += g * np.outer(r, r)
    for r, _, _, g, _ in coils:
        G += g * np.outer(r, r)
    ports = []
    for _, plate, screen, grid, cathode, law in net.tubes:
        ports.append(([(row(e, cathode), e) if e else None for e in (grid, screen, plate)], cathode, law))
    total = int(round(burst.duration * rate))
    out = np.zeros((m, total + 1))
    out[:, 0] = i_l
    s = 0.0
    cap_i = [0.0] * len(caps)
    across = lambda r, a, b, v, s: r @ v + fixed(a, b, s)
    cap_v = [across(r, a, b, v, 0.0) for r, a, b, _ in caps]
    coil_v = [across(r, a, b, v, 0.0) for r, a, b, _, _ in coils]
    for step in range(1, total + 1):
        s = burst.at(step * h)[0]
        rhs = np.zeros(n)
        for a, b, ohms in net.resistors:
            rhs -= row(a, b) * fixed(a, b, s) / ohms if (a not in index or b not in index) else 0.0
        for node, amperes in net.currents:
            rhs[index[node]] += amperes
        for (r, a, b, g), vc, ic in zip(caps, cap_v, cap_i):
            rhs += r * (g * vc + ic - g * fixed(a, b, s))
        for (r, a, b, g, k), vl, il in zip(coils, coil_v, i_l):
            rhs -= r * (k * il + g * vl + g * fixed(a, b, s))
        def residual(v):
            f, J = G @ v - rhs, G.copy()
            for electrodes, cathode, law in ports:
                control = [0.0 if e is None else across(e[0], e[1], cathode, v, s) for e in electrodes]
                ip, i2, ig, pg, ps, pp, sg, ss, sp, gg, gp = law(*control)
                for e, i, slopes in zip(electrodes, (ig, i2, ip), ((gg, 0.0, gp), (sg, ss, sp), (pg, ps, pp))):
                    if e is None:
                        continue
                    f += e[0] * i
                    for c, g in zip(electrodes, slopes):
                        if c is not None and g:
                            J += g * np.outer(e[0], c[0])
            return f, J

        f, J = residual(v)
        for iteration in range(200):
            d = np.linalg.solve(J, f)
            share = 1.0
            new_f, new_J = residual(v - d)
            while iteration > 10 and np.abs(new_f).max() > np.abs(f).max() and share > 1e-3:
                share *= 0.5  # a kink of the law between the two points: shorten the step
                new_f, new_J = residual(v - share * d)
            v, f, J = v - share * d, new_f, new_J
            if np.max(np.abs(d)) < 1e-9:
                break
        else:
            raise RuntimeError(f"trapezoidal step {step} did not converge")
        for k, (r, a, b, g) in enumerate(caps):
            new = across(r, a, b, v, s)
            cap_i[k] = g * (new - cap_v[k]) - cap_i[k]
            cap_v[k] = new
        for k, (r, a, b, g, keep) in enumerate(coils):
            new = across(r, a, b, v, s)
            i_l[k] = keep * i_l[k] + g * (new + coil_v[k])
            coil_v[k] = new
        out[:, step] = i_l
    return out
