"""The highest volts over all on/off combinations of the loads, as terminal text, with what is proved of them."""

from collections.abc import Sequence

from relaycfg import units
from relaycfg.model.place_results import HighestVoltage
from relaycfg.text.figures import place
from relaycfg.text.layout import wrapped

BEYOND_V = 1000.0
"""Nothing of a low-voltage system stands beyond it, so that further figures say nothing."""
PROVED_V = 0.1
"""Found and bound closer than this are one figure."""


def highest(results: Sequence[HighestVoltage], most: int, named: bool) -> list[str]:
    """The highest volts over all on/off combinations, place by place; ``named`` lists the loads that are on instead."""
    if named:
        always = "what is always on"
        return [
            line for h in results for line in wrapped(f"{place(h.at)}, on: {'; '.join((always, *h.loads_on))}", "* ")
        ]
    if not results:
        return []
    each = "; ".join(f"{place(h.at)} {_proved(h)} ({units.volts(h.modelled_v)})" for h in results[:most])
    more = f"; and {len(results) - most} more" if len(results) > most else ""
    return wrapped(
        "For constant impedances on one stiff bar only: highest of all on/off combinations, proved (in brackets: that "
        f"one in the network, as modelled; a sampled state may be above it), V: {each}{more}."
    ) + wrapped(f'Shown again, with the loads that are on: --at "{results[0].at}" --state worst')


def _proved(h: HighestVoltage) -> str:
    """What no combination exceeds, with what was found where they differ."""
    if h.bound_v > BEYOND_V:
        return f"above {BEYOND_V:.0f}, loads can cancel each other"
    found, bound = units.volts(h.stiff_v), units.volts(h.bound_v)
    return found if h.bound_v - h.stiff_v < PROVED_V else f"{found} to {bound}"
