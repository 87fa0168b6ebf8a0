"""Load states by the names that results print, so that an engineer can show any of them again."""

from relaycfg.model.place_results import HighestVoltage
from relaycfg.model.site import NONE, Site
from relaycfg.network import LoadStates, connected, corners, join, least, sampled
from relaycfg.study.highest_voltage import named_state

SAMPLE, WORST, ON = "sample", "worst", "on:"
SINGLE_STATES = {"connected": connected, "least": least, "corners": corners}


def states_named(
    site: Site, place: str, seed: int, name: str | None, highest: tuple[HighestVoltage, ...]
) -> LoadStates | None:
    """The states to show one by one for a break at ``place``; None where there are none to show.

    ``connected``, ``least`` and ``corners`` (all three without a name), ``sample 17``, ``worst``: the combination with
    the highest volts behind that break (of ``highest``), and ``on: A; B``: what is always on and those loads and
    motors. Raises ValueError for a name of none of these.
    """
    if name == SAMPLE or (name == WORST and place == NONE):
        return None
    if name == WORST:
        return named_state(site, next(h.loads_on for h in highest if h.at == place), WORST)
    if name is not None and name.startswith(ON):
        return named_state(site, names_on(name), name)
    if name is not None and name.startswith(f"{SAMPLE} "):
        return sampled(site, 1, seed, start=int(name.removeprefix(f"{SAMPLE} ")))
    if name is not None and name not in SINGLE_STATES:
        raise ValueError(f"no load state is called {name!r}")
    return join(*(SINGLE_STATES[k](site) for k in SINGLE_STATES if name in (None, k)))


def names_on(name: str) -> tuple[str, ...]:
    """Loads and motors of ``on: A; B``."""
    return tuple(part.strip() for part in name.removeprefix(ON).split(";") if part.strip())
