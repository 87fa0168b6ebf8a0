"""One corridor that can be worked by hand: a 59 without errors, two must-hold cases, six break states.

Pickups 240 to 320 V by 20 V, delays 0.1 to 3.1 s by 0.5 s, drop-out 0.98, window 0.02 s, output and breaker 0.04 s.
Standing 245 V; case 7 reaches 270 V for 1 s, case 8 reaches 310 V for 0.2 s. So R is: 240 V never resets (it stands
above), 260 V 1.02 s (case 7), 280 and 300 V 0.22 s (case 8), 320 V nothing; and the fastest secure delays 1.1, 0.6,
0.6, 0.1 s clear in 1.16, 0.66, 0.66, 0.16 s.
"""

from dataclasses import replace
from pathlib import Path

import numpy as np

from relaycfg.model.device import Accuracy, Device, Element, Function, SettableRange
from relaycfg.model.judgement import Judgement
from relaycfg.model.settings import Settings, Stage
from relaycfg.model.site import Feed, Relay
from relaycfg.study.evidence import Evidence, gather
from relaycfg.study.ladder import Ladder
from relaycfg.study.ride_through import Runs
from relaycfg.study.scenarios import Scenarios
from tests.study import yard

OVER = Function.OVERVOLTAGE
AUXILIARY = Feed("auxiliary", 19.0, 29.0)
ELEMENT = Element(
    OVER,
    2,
    SettableRange(240.0, 320.0, 20.0),
    "v",
    None,
    SettableRange(0.1, 3.1, 0.5),
    (0.98,),
    ("instantaneous",),
    0.0,
    Accuracy(0.0, 0.0, 0.0, 0.0, "sum"),
    "l-n",
)
DEVICE = Device("by hand", ("l-n",), "rms", 1.0, 0.0, "per phase", "l-n", (ELEMENT,))
RELAY = Relay("R1", "Main", "Main", "lines and neutral", DEVICE, AUXILIARY, "shunt", AUXILIARY, 0.01, 0.03)
RUNS = Runs(
    np.array([[[270.0, 230.0, 230.0]], [[310.0, 310.0, 310.0]]]),
    np.array([[1.0], [0.2]]),
    ("case 7, long swell", "case 8, short swell (all lines)"),
    (7, 8),
    {7: "case 7, long swell", 8: "case 8, short swell"},
    245.0,
    "case 1, upper limit",
    0.02,
    False,
)
VOLTS = (262.0, 285.0, 285.0, 325.0, 250.0, 230.0)
DEADLINES = (5.0, 0.7, 0.5, 0.5, 5.0, 15.0)
CORE = (False, True, True, True, False, False)


def ladder(element: Element = ELEMENT, runs: Runs = RUNS) -> Ladder:
    """The element on the relay."""
    judgement = Judgement(margin_cap_units=2.0, cover_kept=0.98)
    return Ladder(element, RELAY, 50.0, 230.0, 3**0.5, runs, judgement)


def states(level: str = "nominal", model: str = "as modelled", **changed: object) -> Scenarios:
    """The six states; a deadline of inf harms nothing."""
    deadline_s = np.array(changed.pop("deadline_s", DEADLINES), float)
    volts = np.array(changed.pop("volts", VOLTS), float)
    count = len(volts)
    found = Scenarios(
        "Main",
        level,
        model,
        {OVER: volts},
        deadline_s,
        np.array(CORE[:count], bool),
        np.isfinite(deadline_s),
        np.zeros(count, bool),
        volts,
        np.zeros(count, int),
        np.ones(count, bool),
        np.zeros(count, complex),
        np.zeros((count, 4), complex),
    )
    return replace(found, **changed)  # type: ignore[arg-type]


def evidence(folder: Path, *scenarios: Scenarios, own: Ladder | None = None) -> Evidence:
    """A study of an invented site with this corridor and these states in it."""
    site = yard.site(folder)
    assert site.relay is not None
    base = gather(site, site.relay, 2, 1)
    own = own or ladder()
    return replace(base, relay=own.relay, ladders={own.element.function: own}, scenarios=scenarios)


def stage(pickup: float, delay_s: float, number: int = 1, function: Function = OVER) -> Stage:
    """A stage that is on and trips."""
    return Stage(function, number, True, pickup, delay_s, 0.98)


def settings(*stages: Stage) -> Settings:
    """Settings of these stages."""
    return Settings("R1", "by hand", "", stages, 0.5, "by hand")
