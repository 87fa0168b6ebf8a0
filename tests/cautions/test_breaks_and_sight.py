"""Errors a naive tool makes about breaks: balanced ones, roots of a solver, where the relay sits, N against PE."""

from pathlib import Path

import numpy as np
import pytest

from relaycfg.model.device import Function
from relaycfg.network import Network, connected, healthy_emf
from relaycfg.study import breaks, check, derive
from relaycfg.text import breaks_text, derive_text
from tests.cautions import bench
from tests.study import yard

CONSTANT_POWER = "".join(
    f'[[load]]\nboard = "Main"\nname = "supply {k + 1}"\nbetween = "L{k + 1}-N"\nkw = {kw}\npf = 1.0\n'
    f"zip_p = [0.0, 0.0, 1.0]\nband_pu = [0.5, 1.3]\nusage = 1.0\n"
    for k, kw in enumerate((3.0, 2.0, 1.0))
)


def test_claims_detection_of_a_balanced_break(tmp_path: Path) -> None:
    """Equal loads leave V0 at 0: every state is an undetected break, none is cleared, and the text says so first.

    The sharpest settings change nothing: 59 just above the band, 59N at its lowest.
    """
    site = bench.star(tmp_path, bench.shares(4.0, 4.0, 4.0))
    assert bench.at_relay(site).v0_v == pytest.approx(0, abs=1e-6)
    sharpest = bench.settings(
        site, bench.stage("overvoltage", 1, 254.0, 0.05), bench.stage("displacement", 1, 4.0, 0.05)
    )
    for study in (derive(site, 20, 1), check(site, sharpest, 20, 1)):
        (place,) = study.breaks.summaries
        assert place.undetected.count == place.samples == 20
        assert set(place.classes) == {"none / none"}
        assert all(c.seen_percent == 0 for c in study.coverage)
    shown = derive_text(derive(site, 20, 1))
    assert "A break with balanced load moves no voltage: no voltage relay can see it." in shown
    assert shown.index("Not detected") < shown.index("Cover at nominal supply")
    cabled = yard.site(tmp_path, loads=yard.BALANCED)
    assert "not detectable by any voltage element" in breaks_text(cabled, breaks(cabled, samples=20, seed=1))


def test_claims_detection_of_loads_that_differ_and_still_leave_the_neutral_in_place(tmp_path: Path) -> None:
    """Own arithmetic: R on L1, an inductor on L2, a capacitor on L3, |X| = R sqrt 3.

    E1/R + E2/(jX) + E3/(-jX) = U0 (1/R + (a^2 - a) / (jX)) = U0 (1/R - sqrt 3 / X) = 0: no current, no shift.
    """
    reactance = 10 * 3**0.5
    loads = "".join(
        f'[[load]]\nboard = "Main"\nname = "load {k + 1}"\nbetween = "L{k + 1}-N"\nohm = {ohm}\nusage = 1.0\n'
        for k, ohm in enumerate(([10.0, 0.0], [0.0, reactance], [0.0, -reactance]))
    )
    site = bench.star(tmp_path, loads)
    assert bench.at_relay(site).v0_v == pytest.approx(0, abs=1e-3)
    place = derive(site, 20, 1).breaks.summaries[0]
    assert place.undetected.count == 20


def test_takes_any_root_a_solver_finds(tmp_path: Path) -> None:
    """Reference example constant-power-roots, own arithmetic: 3/2/1 kW of constant power, neutral open.

    Its two roots, 149.8 and 102.0 V of shift, are both saddles, and in both some larger load has more volts than a
    smaller one. What is shown has to be another, on the constant-impedance edge of the largest load, flagged; the
    equations alone are solved by all of them.
    """
    site = bench.star(tmp_path, CONSTANT_POWER)
    emf = healthy_emf(site)
    power = np.array([3e3, 2e3, 1e3])
    for shift_v in (149.8, 102.0):
        turns = np.exp(2j * np.pi * np.arange(3600) / 3600)
        currents = (power[:, None] / (emf[:, None] - shift_v * turns).conj()).sum(axis=0)
        assert np.abs(currents).min() < 0.05  # amperes of some 20: a root of plain constant power to its printed digit
    row = bench.broken(site)
    volts = row.relays["R1"].l_n_v
    assert volts[0] == min(volts)
    assert min(abs(row.relays["R1"].v0_v - shift_v) for shift_v in (149.8, 102.0)) > 5
    assert "below band" in row.flags
    assert "several solutions" in row.flags
    assert "unstable" not in row.flags
    assert not Network(site).solve("source", connected(site), emf).unstable[0]


def test_takes_a_state_that_runs_away_for_one_that_stands(tmp_path: Path) -> None:
    """Generation of constant admittance above the loads of a floating star: said to be unstable, or not solved."""
    loads = bench.shares(4.0, 2.0, 1.0) + yard.load("Main", "L1-N", -12.0, "inverter", usage=1.0)
    row = bench.broken(bench.star(tmp_path, loads))
    assert row.status == "unresolved" or "unstable" in row.flags
    (place,) = breaks(bench.star(tmp_path, loads), samples=20, seed=1).summaries
    assert place.unresolved + place.flags["unstable"] >= 20


@pytest.mark.parametrize(("sits", "sees"), [("Main", {"source", "Main"}), ("Shed", {"source", "Main", "Shed"})])
def test_ignores_where_the_relay_sits(tmp_path: Path, sits: str, sees: set[str]) -> None:
    """Only a break upstream of the relay's own neutral tap reaches it; stiff lines, so nothing else moves there."""
    relay = yard.RELAY.replace('measures_at = "Main"', f'measures_at = "{sits}"')
    site = yard.site(tmp_path, relay=relay)
    study = derive(site, 100, 1)
    assert {p.at for p in study.breaks.summaries if p.seen} == sees
    for place in study.breaks.summaries:
        if not place.seen:
            assert place.why_not == f"the break is not upstream of the relay's tap at {sits}"
            assert not any(name.endswith(("in time", "late")) for name in place.classes)
            assert any(f"break at {place.at} is not seen" in f.sentence for f in study.findings)
            row = next(r for r in study.breaks.rows if r.at == place.at)
            assert row.boards["Shed"].v0_v > 20
            assert row.relays["R1"].v0_v < 5


def test_feeds_n_to_pe_to_59n_in_tn_c_s(tmp_path: Path) -> None:
    """Upstream of the split N and PE move together: N-PE reads 0 while L-N is far off; V0 from L-N sees it.

    In TN-S, where PE stays behind, the same device sees the same break.
    """
    seen = {}
    for earthing, measured in (("TN-C-S", "n-to-earth"), ("TN-C-S", "l-n"), ("TN-S", "n-to-earth")):
        folder = tmp_path / f"{earthing} {measured}"
        folder.mkdir()
        site = yard.site(folder, earthing=earthing, displacement_from=measured, elements=yard.DISPLACEMENT)
        settings = bench.settings(site, bench.stage("displacement", 1, 6.0, 0.5))
        study = check(site, settings, 100, 1)
        main = next(p for p in study.breaks.summaries if p.at == "Main")
        seen[earthing, measured] = main.seen
        operated = sum(share.count for name, share in main.classes.items() if not name.endswith("/ none"))
        assert (operated > 0) == main.seen
        if (earthing, measured) == ("TN-C-S", "n-to-earth"):
            assert "N and PE move together" in main.why_not
            row = next(r for r in breaks(site, samples=5, seed=1, state="connected").rows if r.at == "Main")
            assert row.relays["R1"].n_pe_v == pytest.approx(0, abs=1e-6)
            assert row.relays["R1"].v0_v > 20
            sight = [e for e in main.elements if e.function is Function.DISPLACEMENT]
            assert sight[0].share.count == 0
            assert any(f.exception and "break at Main" in f.sentence for f in study.findings)
    assert list(seen.values()) == [False, True, True]
