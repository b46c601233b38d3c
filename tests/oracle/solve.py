"""Integration of a circuit's state equation with SciPy's stiff solvers."""

import numpy as np
from scipy.integrate import solve_ivp

from burst import RATE

METHOD = "LSODA"  # Radau agrees within -170 dB (self-test) and takes five times as long
RTOL = 1e-10
ATOL_VOLTS = 1e-10
ATOL_AMPERES = 1e-13


def integrate(system, y0, burst, method=METHOD, rtol=RTOL, atol_scale=1.0, rate=RATE, progress=None):
    """States at n/rate (rtol and atol hold for their deviation from rest), n = 0 .. duration*rate, in columns; and the solver's tally."""
    atol = atol_scale * np.concatenate(
        [np.full(system.nx, ATOL_VOLTS), np.full(system.size - system.nx, ATOL_AMPERES)]
    )
    derivative, jacobian = system.about(y0)
    f = lambda t, d: derivative(d, *burst.at(t))
    jac = lambda t, d: jacobian(d, burst.at(t)[0])
    count = int(round(burst.duration * rate)) + 1
    times = np.arange(count) / rate
    states = np.empty((system.size, count))
    states[:, 0] = 0.0
    tally = {"method": method, "rtol": rtol, "atol_volts": ATOL_VOLTS * atol_scale, "evaluations": 0, "jacobians": 0,
             "factorizations": 0}
    y, begin = np.zeros(system.size), 0.0
    for end in burst.kinks() + [times[-1]]:
        inside = (times > begin) & (times < end)
        wanted = np.concatenate([times[inside], [end]])
        r = solve_ivp(f, (begin, end), y, method=method, t_eval=wanted, rtol=rtol, atol=atol, jac=jac)
        if not r.success:
            raise RuntimeError(f"{method} gave up at {r.t[-1] if len(r.t) else begin}: {r.message}")
        states[:, inside] = r.y[:, :-1]
        y = r.y[:, -1]
        hit = np.nonzero(times == end)[0]
        if len(hit):
            states[:, hit[0]] = y
        tally["evaluations"] += int(r.nfev)
        tally["jacobians"] += int(r.njev)
        tally["factorizations"] += int(r.nlu)
        begin = end
        if progress:
            progress(end, tally)
    return times, states + y0[:, None], tally
