"""Where the neutral of a star balances under the package's load law, stable or not: Newton on its own slope."""

from pathlib import Path
from typing import Any

import numpy as np

from relaycfg.network.branches import build_branches
from relaycfg.network.loadlaw import Law, flow, slope
from tests.reference.setting import setting

STEPS = 50
STILL_V = 1e-9


def equilibrium(folder: Path, given: dict[str, Any]) -> dict[str, Any]:
    """The balance nearest to ``start_v`` [re, im] of a star on an ideal source with its neutral open.

    Source: own arithmetic: dI = a dU + b conj(dU) of every branch, summed over the star; a state that loads would run
    away from has Re a <= |b|. Raises ValueError where Newton does not come to rest.
    """
    start = given.pop("start_v")
    made = setting(folder, given)
    branches = build_branches(made.site)
    order = np.arange(len(branches.board))
    coefficients = branches.coefficients(made.states.loads, made.states.motors, order, False)
    law = Law(*coefficients, branches.low_v[:, None], branches.high_v[:, None])
    feed = branches.feed.sum(axis=0)[:, None]
    shift = branches.see.sum(axis=1)[:, None]
    vn = complex(*start)
    for _ in range(STEPS):
        u = branches.see @ (made.emf - vn)[:, None]
        now = flow(law, u.real, u.imag)
        current = (feed * (now.g_re + 1j * now.g_im) * u).sum()
        a_re, a_im, b_re, b_im = slope(law, now, u.real, u.imag)
        a, b = (feed * (a_re + 1j * a_im) * shift).sum(), (feed * (b_re + 1j * b_im) * shift.conj()).sum()
        step = (a.conjugate() * current - b * current.conjugate()) / (abs(a) ** 2 - abs(b) ** 2)
        vn += step
        if abs(step) < STILL_V:
            l_n = np.abs(made.emf - vn)
            return {
                "vn_v": abs(vn),
                "l_n_v": l_n,
                **{f"l{k + 1}_v": volts for k, volts in enumerate(l_n)},
                "stable": bool(a.real > abs(b)),
            }
    raise ValueError("no balance found from there")
