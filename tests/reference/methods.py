"""Ways to find a case's figures: solve what is given, or seek the given at which a figure has a value."""

from collections.abc import Callable
from dataclasses import replace
from pathlib import Path
from typing import Any, Protocol

import numpy as np
from scipy.optimize import brentq, minimize_scalar

from relaycfg.model.site import UserCase
from relaycfg.network import Network, motor_start
from relaycfg.network.states import OFF
from relaycfg.relay.quantities import measured_quantities
from tests.reference.allocations import every, sample
from tests.reference.case import Check, Line
from tests.reference.equilibrium import equilibrium
from tests.reference.rectifiers import rectifiers
from tests.reference.setting import setting
from tests.reference.state import State
from tests.reference.unseen import unseen


class Found(Protocol):
    """Figures by key; KeyError where there is none."""

    def __getitem__(self, key: str, /) -> Any: ...


def measure(folder: Path, check: Check) -> list[tuple[Line, dict[str, Any]]]:
    """Every line of a check with what is found for each expected figure.

    Raises KeyError for a figure that the check's method does not have, ValueError for an unknown given key.
    """
    method = METHODS[check.method]
    pairs = []
    for line in check.lines:
        found = method(folder, dict(line.given))
        pairs.append((line, {key: found[key] for key in line.figures}))
    return pairs


def _state(folder: Path, given: dict[str, Any]) -> Found:
    return State(setting(folder, given))


def _seek(folder: Path, given: dict[str, Any]) -> Found:
    """The value of the key ``change`` inside ``between`` at which a figure reaches the value given for it.

    ``until`` names the figure; its value is the key ``reaches_`` and that name. Or ``most`` names a figure that is
    greatest there.
    """
    change, between = given.pop("change"), given.pop("between")
    most, until = given.pop("most", ""), given.pop("until", "")
    target = 0.0 if most else given.pop(f"reaches_{until}")

    def at(value: float) -> State:
        return State(setting(folder, given | {change: value}))

    if most:
        best = minimize_scalar(
            lambda x: -at(x).sought(most), bounds=between, method="bounded", options={"xatol": 1e-7}
        ).x
    else:
        best = brentq(lambda x: at(x).sought(until) - target, *between, xtol=1e-9)
    return _With(at(best), {change.partition(".")[0]: best})


class _With:
    """Figures of a state and the value that was sought."""

    def __init__(self, state: State, sought: dict[str, float]) -> None:
        self._state, self._sought = state, sought

    def __getitem__(self, key: str) -> object:
        return self._sought[key] if key in self._sought else self._state[key]


def _user_case(folder: Path, given: dict[str, Any]) -> Found:
    """What a relay measures in the first segment of the site's [[case]] of that name."""
    name = given.pop("case")
    site = setting(folder, given).site
    case: UserCase = next(c for c in site.user_cases if c.name == name)
    measured = measured_quantities(site.supply.geometry, np.array([*case.segments[0].l_n_v, 0j]))
    unbalance = measured["unbalance_percent"]
    return {
        "l_n_v": measured["l_n_v"],
        "l_l_v": measured["l_l_v"],
        "mean_l_l_v": measured["l_l_v"].mean(),
        "shift_v": measured["v0_v"],
        "naive_sum_v": 3 * measured["v0_v"],
        "lvur_percent": unbalance["line-to-line deviation"],
        "deviation_percent": unbalance["line-to-neutral deviation"],
        "spread_percent": unbalance["spread"],
        "vuf_percent": unbalance["V2/V1"],
    }


def _motor_start(folder: Path, given: dict[str, Any]) -> Found:
    """The dip at the last board while the motor of that name starts, all others being off."""
    name = given.pop("motor")
    made = setting(folder, given)
    motor = [m.name for m in made.site.motors].index(name)
    still = replace(made.states, motors=np.full_like(made.states.motors, OFF))
    volts = np.abs(motor_start(Network(made.site), made.site, motor, still, made.emf).l_n[-1, :, 0])
    return {"dip_percent": 100 * (1 - volts.min() / abs(made.emf[0])), "unequal_v": volts.max() - volts.min()}


def _limits(folder: Path, given: dict[str, Any]) -> Found:
    """The supply's band as resolved."""
    supply = setting(folder, given).site.supply
    return {"low_v": supply.low_v, "high_v": supply.high_v}


def _rods(folder: Path, given: dict[str, Any]) -> Found:
    """Ohms of the board ``one``'s single rod and of the board ``group``'s nine, as the site is read; lambda is 1."""
    one, group = given.pop("one"), given.pop("group")
    site = setting(folder, given).site
    rod_ohm, group_ohm = (site.board(name).electrode_ohm for name in (one, group))
    return {"rod_ohm": rod_ohm, "group_ohm": group_ohm, "alpha_ratio": 9 * group_ohm / rod_ohm - 1}


METHODS: dict[str, Callable[[Path, dict[str, Any]], Found]] = {
    "state": _state,
    "seek": _seek,
    "equilibrium": equilibrium,
    "sample": sample,
    "every": every,
    "unseen": unseen,
    "user case": _user_case,
    "motor start": _motor_start,
    "limits": _limits,
    "rectifiers": rectifiers,
    "rods": _rods,
}
