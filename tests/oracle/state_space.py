"""From circuit elements to an explicit state equation, its rest state and its small-signal response.

Kirchhoff's current law at the unknown nodes v (G conductances, C capacitances, A inductor currents leaving, N tube
currents leaving, s constant currents entering; index k: nodes of known voltage):

    C v' + C_k vk' + G v + G_k vk + A i + N w - s = 0,        L i' = A^T v + A_k^T vk - R i,        w = law(N^T v + N_k^T vk)

The states are the inductor currents and a basis x of the capacitor voltages. Unknown nodes that capacitors join to each
other, but not to ground or to a known node, form floating groups (a node without capacitors is a group of one): of such
a group one node's voltage z is algebraic and the others are counted from it. With v = P x + Q z (Q: one column of ones per
group, so C Q = 0 exactly), the rows Q^T give z from linear elimination, and the rows P^T give x':

    z  = -(Q^T G Q)^-1 Q^T (G P x + G_k vk + A i + N w - s)
    x' = -(P^T C P)^-1 P^T (C_k vk' + G v + G_k vk + A i + N w - s)

so that everything is linear in y = (x, i), the input s, its slope s' and the tube currents w, and the only thing left to
solve is w = law(h(y, s) + H w). H is zero where every tube electrode has a capacitor; otherwise a Newton iteration on
the port voltages runs inside the right-hand side, with the law's exact slopes. Nothing is approximated: an input without
resistance in front of a grid imposes the voltage of the grid's capacitors, and s' enters exactly.
"""

import numpy as np
from scipy.linalg import block_diag

INNER_TOLERANCE = 1e-13  # relative to 1 V + |port volts|: near the rounding of the port voltages
INNER_ITERATIONS = 60
REST_TOLERANCE_VOLTS = 1e-11


class StateSpace:
    def __init__(self, net):
        self.net = net
        self.laws = [t[5] for t in net.tubes]
        self._nodes()
        self._matrices()
        self._reduce()

    # -- nodes, groups ---------------------------------------------------------------------------------------------

    def _nodes(self):
        net = self.net
        names = []
        for a, b, *_ in net.resistors + net.capacitors + net.inductors:
            names += [a, b]
        for node, _ in net.currents:
            names.append(node)
        for _, plate, screen, grid, cathode, _ in net.tubes:
            names += [n for n in (plate, screen, grid, cathode) if n is not None]
        self.known = [n for n in net.known if n in names]
        self.unknown = [n for n in dict.fromkeys(names) if n != "0" and n not in net.known]
        self.index = {n: k for k, n in enumerate(self.unknown)}
        self.known_index = {n: k for k, n in enumerate(self.known)}
        group = {n: n for n in self.unknown}

        def root(n):
            while group[n] != n:
                n = group[n]
            return n

        grounded = set()
        for a, b, _ in net.capacitors:
            inside = [n for n in (a, b) if n in self.index]
            if len(inside) == 2:
                group[root(inside[0])] = root(inside[1])
            elif inside:
                grounded.add(inside[0])
        grounded_roots = {root(n) for n in grounded}
        groups = {}
        for n in self.unknown:
            if root(n) not in grounded_roots:
                groups.setdefault(root(n), []).append(n)
        self.groups = list(groups.values())
        self.references = [g[0] for g in self.groups]

    def _split(self, vector):
        """Rows of unknown and known nodes of an incidence given as {node: weight}."""
        u, k = np.zeros(len(self.unknown)), np.zeros(len(self.known))
        for node, weight in vector.items():
            if node in self.index:
                u[self.index[node]] += weight
            elif node in self.known_index:
                k[self.known_index[node]] += weight
        return u, k

    def _matrices(self):
        net = self.net

        def laplacian(elements, weight):
            full_u = np.zeros((len(self.unknown), len(self.unknown)))
            full_k = np.zeros((len(self.unknown), len(self.known)))
            for a, b, x in elements:
                u, k = self._split({a: 1.0} if b == "0" else {b: -1.0} if a == "0" else {a: 1.0, b: -1.0})
                full_u += weight(x) * np.outer(u, u)
                full_k += weight(x) * np.outer(u, k)
            return full_u, full_k

        self.G, self.Gk = laplacian(net.resistors, lambda r: 1.0 / r)
        self.C, self.Ck = laplacian(net.capacitors, lambda c: c)
        pairs = [self._split({a: 1.0, b: -1.0}) for a, b, *_ in net.inductors]
        self.A = np.array([p[0] for p in pairs]).T.reshape(len(self.unknown), -1)
        self.Ak = np.array([p[1] for p in pairs]).T.reshape(len(self.known), -1)
        self.L = np.array([l[2] for l in net.inductors])
        self.R = np.array([l[3] for l in net.inductors])
        columns = []
        for _, plate, screen, grid, cathode, _ in net.tubes:  # ports in the order grid, screen, plate
            for electrode in (grid, screen, plate):
                ports = {} if electrode is None else {electrode: 1.0}
                if electrode is not None and electrode != cathode:
                    ports[cathode] = ports.get(cathode, 0.0) - 1.0
                columns.append(self._split(ports))
        self.N = np.array([c[0] for c in columns]).T.reshape(len(self.unknown), -1)
        self.Nk = np.array([c[1] for c in columns]).T.reshape(len(self.known), -1)
        self.s = np.zeros(len(self.unknown))
        for node, amperes in net.currents:
            self.s[self.index[node]] += amperes

    # -- reduction -------------------------------------------------------------------------------------------------

    def _reduce(self):
        nu, m = len(self.unknown), len(self.L)
        Q = np.zeros((nu, len(self.groups)))
        for column, g in enumerate(self.groups):
            Q[[self.index[n] for n in g], column] = 1.0
        states = [n for n in self.unknown if n not in self.references]
        P = np.zeros((nu, len(states)))
        for column, n in enumerate(states):
            P[self.index[n], column] = 1.0
        self.state_nodes = states
        nx = len(states)
        self.size = nx + m
        vk = np.array([self.net.known[n] for n in self.known])
        self.jack = np.array([1.0 if n == "jack" else 0.0 for n in self.known])
        constant = vk * (1.0 - self.jack)
        # z = Zy y + Zc + Zs s + Zw w
        if self.groups:
            S = Q.T @ self.G @ Q
            if np.linalg.cond(S) > 1e12:
                raise ValueError(f"no resistive path fixes the voltage of {self.references}")
            solve = lambda b: -np.linalg.solve(S, Q.T @ b)
        else:
            solve = lambda b: np.zeros((0,) + b.shape[1:])
        Zy = solve(np.hstack([self.G @ P, self.A]))
        Zc = solve(self.Gk @ constant - self.s)
        Zs = solve(self.Gk @ self.jack)
        Zw = solve(self.N)
        # v = Vy y + Vc + Vs s + Vw w
        self.Vy = np.hstack([P, np.zeros((nu, m))]) + Q @ Zy
        self.Vc, self.Vs, self.Vw = Q @ Zc, Q @ Zs, Q @ Zw
        self.constant = constant
        # x' and i', first as currents and volts (K, what the rest state is solved from), then over capacitance, inductance
        M = P.T @ self.C @ P
        A_pad = np.hstack([np.zeros((nu, nx)), self.A])
        R_pad = np.hstack([np.zeros((m, nx)), np.diag(self.R)])
        self.Ky = np.vstack([-P.T @ (self.G @ self.Vy + A_pad), self.A.T @ self.Vy - R_pad])
        self.Kc = np.concatenate([
            -P.T @ (self.G @ self.Vc + self.Gk @ constant - self.s), self.A.T @ self.Vc + self.Ak.T @ constant])
        self.Kw = np.vstack([-P.T @ (self.G @ self.Vw + self.N), self.A.T @ self.Vw])
        Ks = np.concatenate([-P.T @ (self.G @ self.Vs + self.Gk @ self.jack), self.A.T @ self.Vs + self.Ak.T @ self.jack])
        Kd = np.concatenate([-P.T @ (self.Ck @ self.jack), np.zeros(m)])
        mass = block_diag(np.linalg.inv(M) if nx else np.zeros((0, 0)), np.diag(1.0 / self.L) if m else np.zeros((0, 0)))
        self.Fy, self.Fc, self.Fw = mass @ self.Ky, mass @ self.Kc, mass @ self.Kw
        self.Fs, self.Fd = mass @ Ks, mass @ Kd
        # port volts
        self.Hy, self.Hw = self.N.T @ self.Vy, self.N.T @ self.Vw
        self.Hc = self.N.T @ self.Vc + self.Nk.T @ constant
        self.Hs = self.N.T @ self.Vs + self.Nk.T @ self.jack
        self.implicit = bool(np.any(self.Hw != 0.0))
        others = self.Hw.copy()
        for j in range(1, len(others), 3):
            others[j, j] = 0.0
        self.lone_screens = not np.any(others != 0.0)
        self._screen_guess = {}
        self._last_ports = None
        self.nx = nx

    def set_supply(self, volts, ohms):
        """Replaces the source behind the first rail (rectifier linearized at rest)."""
        net = self.net
        k = net.notes["source_resistor"]
        a, b, _ = net.resistors[k]
        net.resistors[k] = (a, b, ohms)
        net.known["supply"] = volts
        self._matrices()
        self._reduce()

    # -- tubes -----------------------------------------------------------------------------------------------------

    def _laws(self, ports):
        """Currents w in port order (grid, screen, plate) and their block-diagonal slopes, as plain lists."""
        w, W = [], []
        for k, law in enumerate(self.laws):
            j = 3 * k
            ip, i2, ig, pg, ps, pp, sg, ss, sp, gg, gp = law(ports[j], ports[j + 1], ports[j + 2])
            w += (ig, i2, ip)
            W += ((gg, 0.0, gp), (sg, ss, sp), (pg, ps, pp))
        return w, W

    def _slopes(self, W):
        if not self.laws:
            return np.zeros((0, 0))
        return block_diag(*(W[3 * k : 3 * k + 3] for k in range(len(self.laws))))

    def ports(self, y, s):
        """Tube currents at the state y with the algebraic nodes solved, and the slopes of the laws there."""
        h = self.Hy @ y
        h += self.Hc + self.Hs * s
        if not self.implicit:
            w, W = self._laws(h.tolist())
            return np.array(w), W
        if self.lone_screens:
            return self._solve_lone_screens(h.tolist())
        p = getattr(self, "_last_ports", None)
        if p is None:
            p = h + 0.0
        eye = np.eye(len(p))
        best = np.inf
        for _ in range(INNER_ITERATIONS):
            w, W = self._laws(p.tolist())
            slopes = self._slopes(W)
            residual = p - h - self.Hw @ w
            step = np.linalg.solve(eye - self.Hw @ slopes, residual)
            size = np.max(np.abs(step) / (1.0 + np.abs(p)))
            if size <= INNER_TOLERANCE or (size < 1e-11 and size >= best):
                p = p - step
                self._last_ports = p
                # the currents at the corrected ports, to first order (the step is at rounding level)
                return w - slopes @ step, W
            best = size
            p = p - step * min(1.0, 20.0 / np.max(np.abs(step)))
        raise RuntimeError(f"algebraic nodes did not settle: {residual}")

    def _solve_lone_screens(self, h):
        """The usual case: the only algebraic electrodes are screens behind a resistor alone, p = h - R is."""
        w, W = [], []
        for k, law in enumerate(self.laws):
            j = 3 * k
            vg, base, vp = h[j], h[j + 1], h[j + 2]
            r = self.Hw[j + 1, j + 1]
            p = base if r == 0.0 else self._screen_guess.get(k, base)
            best = float("inf")
            for _ in range(INNER_ITERATIONS):
                ip, i2, ig, pg, ps, pp, sg, ss, sp, gg, gp = law(vg, p, vp)
                if r == 0.0:
                    break
                step = (p - base - r * i2) / (1.0 - r * ss)
                size = abs(step) / (1.0 + abs(p))
                p -= max(-20.0, min(20.0, step))
                if size <= INNER_TOLERANCE or (size < 1e-11 and size >= best):
                    ip, i2 = ip - ps * step, i2 - ss * step
                    self._screen_guess[k] = p
                    break
                best = size
            else:
                raise RuntimeError(f"the screen of tube {k} did not settle")
            w += (ig, i2, ip)
            W += ((gg, 0.0, gp), (sg, ss, sp), (pg, ps, pp))
        return np.array(w), W

    # -- state equation --------------------------------------------------------------------------------------------

    def derivative(self, y, s, ds):
        w, _ = self.ports(y, s)
        return self.Fy @ y + self.Fc + self.Fs * s + self.Fd * ds + self.Fw @ w

    def jacobian(self, y, s):
        return self.Fy + self.Fw @ self._effective(self.ports(y, s)[1]) @ self.Hy

    def _effective(self, W):
        """Slopes of the tube currents over the open port volts h, the algebraic nodes following."""
        slopes = self._slopes(W)
        return slopes @ np.linalg.inv(np.eye(len(slopes)) - self.Hw @ slopes) if self.implicit else slopes

    def about(self, y0):
        """Derivative and Jacobian as functions of the deviation from the rest state y0: rest is then exactly at rest,
        and what the solver sees is not buried in the rounding of hundreds of volts."""
        w0, _ = self.ports(y0, 0.0)
        Fy, Fs, Fd, Fw = self.Fy, self.Fs, self.Fd, self.Fw

        def derivative(d, s, ds):
            w, _ = self.ports(y0 + d, s)
            return Fy @ d + (Fs * s + Fd * ds) + Fw @ (w - w0)

        return derivative, lambda d, s: self.jacobian(y0 + d, s)

    def node_volts(self, y, s):
        w, _ = self.ports(y, s)
        return dict(zip(self.unknown, (self.Vy @ y + self.Vc + self.Vs * s + self.Vw @ w).tolist()))

    def output(self, y, s):
        """Loudspeaker terminal volts for states in columns (or one state) and inputs s."""
        kind, *rest = self.net.output
        y2 = y.reshape(self.size, -1)
        if kind == "volts":
            a, b, scale = rest
            out = []
            for column, level in zip(y2.T, np.atleast_1d(s)):
                v = self.node_volts(column, level) | {"0": 0.0}
                out.append(scale * (v[a] - v[b]))
            return np.array(out)
        number, henries, ohms, a, b, scale = rest
        i = y2[self.nx + number]
        out = ohms * i
        if henries > 0.0 or a != b:
            for j, (column, level) in enumerate(zip(y2.T, np.atleast_1d(s))):
                v = self.node_volts(column, level) | {"0": 0.0}
                slope = self.derivative(column, level, 0.0)[self.nx + number]
                out[j] += henries * slope + v[a] - v[b]
        return scale * out

    # -- rest and small signals ------------------------------------------------------------------------------------

    def _newton(self, y, factor):
        """Rest state with every constant source scaled by `factor`, by Newton on node currents and inductor volts."""
        Hc = self.Hc
        try:
            self.Hc = factor * Hc
            previous = np.inf
            for _ in range(200):
                w, W = self.ports(y, 0.0)
                f = self.Ky @ y + factor * self.Kc + self.Kw @ w
                step = -np.linalg.solve(self.Ky + self.Kw @ self._effective(W) @ self.Hy, f)
                size = np.max(np.abs(step[: self.nx])) if self.nx else 0.0
                y = y + step * min(1.0, 30.0 / max(size, 1e-300))
                if size < REST_TOLERANCE_VOLTS or (size < 1e-7 and size >= previous):
                    return y
                previous = size
            return None
        finally:
            self.Hc = Hc

    def rest(self):
        """The DC state, by stepping the supplies up from zero; the rectifier form is closed around it."""
        y = np.zeros(self.size)
        reached, step = 0.0, 0.1
        while reached < 1.0:
            trial = min(1.0, reached + step)
            found = self._newton(y, trial)
            if found is None:
                step *= 0.5
                if step < 1e-4:
                    raise RuntimeError("no rest state found")
                continue
            y, reached = found, trial
        rectifier = self.net.rest_of_supply
        if rectifier is None:
            return y
        for _ in range(60):
            amperes = self.supply_current(y)
            slope = rectifier.slope(amperes)
            volts = rectifier.volts(amperes)
            self.set_supply(volts + slope * amperes, slope)
            found = self._newton(y, 1.0)
            if found is None:
                raise RuntimeError("no rest state found with the rectifier")
            change = np.max(np.abs(found - y))
            y = found
            if change < 1e-8:
                amperes = self.supply_current(y)
                self.net.notes["supply"] = {
                    "form": "rectifier linearized at rest", "volts_at_rest": rectifier.volts(amperes),
                    "current_at_rest": amperes, "output_resistance": slope,
                }
                return y
        raise RuntimeError("rectifier and circuit did not settle together")

    def supply_current(self, y):
        net = self.net
        a, b, ohms = net.resistors[net.notes["source_resistor"]]
        return (net.known["supply"] - self.node_volts(y, 0.0)[net.notes["first_rail"]]) / ohms

    def transfer(self, y, frequency):
        """Small-signal response per volt at the jack, at the rest state y: complex node volts and output volts."""
        jw = 2j * np.pi * frequency
        slopes = self._effective(self.ports(y, 0.0)[1])
        By = self.Fy + self.Fw @ slopes @ self.Hy
        Bs = self.Fs + self.Fw @ slopes @ self.Hs + jw * self.Fd
        x = np.linalg.solve(jw * np.eye(self.size) - By, Bs)
        w = slopes @ (self.Hy @ x + self.Hs)
        nodes = dict(zip(self.unknown, self.Vy @ x + self.Vs + self.Vw @ w)) | {"jack": 1.0, "0": 0.0}
        kind, *rest = self.net.output
        if kind == "volts":
            a, b, scale = rest
            return nodes, scale * (nodes[a] - nodes[b])
        number, henries, ohms, a, b, scale = rest
        drop = (ohms + jw * henries) * x[self.nx + number]
        return nodes, scale * (drop + nodes.get(a, 0.0) - nodes.get(b, 0.0))
