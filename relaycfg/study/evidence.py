"""Everything settings are judged on, computed once: network, levels, cases, ladders and break scenarios."""

from dataclasses import dataclass

from relaycfg.model.cases import Case
from relaycfg.model.device import Element, Function
from relaycfg.model.site import Relay, Site
from relaycfg.network import LoadStates, Network, Solved, sampled
from relaycfg.study.cases import must_hold_cases
from relaycfg.study.ladder import Ladder
from relaycfg.study.levels import Levels, healthy_taps, supply_levels
from relaycfg.study.ride_through import runs_of
from relaycfg.study.scenarios import Scenarios, all_scenarios


@dataclass(frozen=True)
class Evidence:
    """The base of one study; ``ladders`` has one entry for each element of the device."""

    site: Site
    relay: Relay
    network: Network
    levels: Levels
    states: LoadStates
    cases: tuple[Case, ...]
    ladders: dict[Function, Ladder]
    solved: dict[str, Solved]
    """Every break place at the nominal level, as modelled."""
    scenarios: tuple[Scenarios, ...]
    seed: int
    samples: int


def gather(site: Site, relay: Relay, samples: int, seed: int) -> Evidence:
    """Solve everything that derive and check both need; pure, the same seed gives the same evidence."""
    network = Network(site)
    levels = supply_levels(site, network)
    states = sampled(site, samples, seed)
    healthy = healthy_taps(site, network, levels, states, relay.measures_at)
    cases = must_hold_cases(site, network, levels, healthy, relay.measures_at)
    ladders = {e.function: _ladder(site, relay, cases, e) for e in relay.device.elements}
    solved = {place: network.solve(place, states, levels.nominal) for place in site.places}
    scenarios = all_scenarios(site, relay, network, levels, states, solved)
    return Evidence(site, relay, network, levels, states, cases, ladders, solved, scenarios, seed, samples)


def _ladder(site: Site, relay: Relay, cases: tuple[Case, ...], element: Element) -> Ladder:
    supply = site.supply
    return Ladder(
        element,
        relay,
        supply.frequency_hz,
        supply.nominal_v,
        supply.geometry.line_to_line_ratio,
        runs_of(cases, element, relay.device, supply.geometry, supply.frequency_hz),
        site.judgement,
        len(supply.geometry.names),
    )
