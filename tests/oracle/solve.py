"""Integration of a circuit's state equation with SciPy's stiff solvers."""

import numpy as np
from scipy.integrate import solve_ivp

from burst import RATE

METHOD = "LSODA"  # Radau agrees within -180 dB (self-test) and takes three to five times as long
RTOL = 1e-10
ATOL_VOLTS = 1e-10
ATOL_AMPERES = 1e-13
MAX_STEP_S = 50e-6  # so that no solver steps across the beginning of a burst
EVALUATION_LIMIT = 10_000_000  # a solver that crawls is an error, not a wait


def integrate(system, y0, burst, method=METHOD, rtol=RTOL, atol_scale=1.0, rate=RATE):
    """States at n/rate (rtol and atol hold for their deviation from rest), n = 0 .. duration*rate, in columns; and the
    solver's tally. One run from start to end: a restart puts LSODA into its nonstiff mode, where it can crawl."""
    atol = atol_scale * np.concatenate(
        [np.full(system.nx, ATOL_VOLTS), np.full(system.size - system.nx, ATOL_AMPERES)]
    )
    derivative, jacobian = system.about(y0)
    evaluations = 0

    def f(t, d):
        nonlocal evaluations
        evaluations += 1
        if evaluations > EVALUATION_LIMIT:
            raise RuntimeError(f"{method} crawls at {t} s")
        return derivative(d, *burst.at(t))

    times = np.arange(int(round(burst.duration * rate)) + 1) / rate
    r = solve_ivp(f, (0.0, times[-1]), np.zeros(system.size), method=method, t_eval=times, rtol=rtol, atol=atol,
                  max_step=MAX_STEP_S, jac=lambda t, d: jacobian(d, burst.at(t)[0]))
    if not r.success:
        raise RuntimeError(f"{method} gave up at {r.t[-1] if len(r.t) else 0.0} s: {r.message}")
    tally = {"method": method, "rtol": rtol, "atol_volts": ATOL_VOLTS * atol_scale, "max_step_s": MAX_STEP_S,
             "evaluations": int(r.nfev), "jacobians": int(r.njev)}
    return times, r.y + y0[:, None], tally
