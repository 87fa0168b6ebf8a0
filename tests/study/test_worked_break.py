"""The break printed to be followed by hand, and the smallest asymmetry seen against PE: closed forms worked here."""

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from relaycfg.model.device import Function
from relaycfg.model.settings import Settings, Stage
from relaycfg.model.site import Site
from relaycfg.network import Network
from relaycfg.study import check
from relaycfg.study.asymmetry import worked_break
from relaycfg.study.evidence import Evidence, gather
from tests.study import yard


def base_of(site: Site) -> Evidence:
    assert site.relay is not None
    return gather(site, site.relay, 2, 1)


def test_admittances_are_those_of_all_loads_behind_the_break(tmp_path: Path) -> None:
    # 2 x 6 and 2 x 2 kW on L1, 2 x 4 and 2 x 3 on L2, 2 x 3 and 2 x 1 on L3, over 230 V squared; loads between
    # lines carry nothing into the neutral.
    between = yard.UNEQUAL + yard.load("Shed", "L1-L2", 5.0, "welder")
    found = worked_break(base_of(yard.site(tmp_path, loads=between)))
    assert found is not None
    assert found.place == "Main"
    by_hand = np.array([16e3, 14e3, 8e3]) / 230**2
    assert found.admittance_s == pytest.approx(by_hand.tolist())
    emf = 230 * np.exp(-2j * np.pi * np.arange(3) / 3)
    shift = (by_hand * emf).sum() / by_hand.sum()
    assert found.shift_v == pytest.approx(shift)
    assert found.l_n_v == pytest.approx(np.abs(emf - shift).tolist())
    assert found.emf_v == pytest.approx(230.0)


def test_lagging_loads_have_a_lagging_admittance(tmp_path: Path) -> None:
    site = yard.site(tmp_path, loads=yard.load("Main", "L1-N", 4.0, "pump") + yard.load("Main", "L2-N", 4.0, "heater"))
    site = replace(site, loads=(replace(site.loads[0], q_var=3e3), *site.loads[1:]))
    found = worked_break(base_of(site))
    assert found is not None
    assert found.admittance_s == pytest.approx([(4e3 - 3e3j) / 230**2, 4e3 / 230**2, 0.0])


def test_without_anything_to_neutral_there_is_no_break_to_work(tmp_path: Path) -> None:
    base = base_of(yard.site(tmp_path, loads=yard.load("Main", "L1-L2", 5.0, "welder")))
    assert worked_break(base) is None


def test_electrodes_behind_the_break_and_the_source_s_own_make_a_way_back(tmp_path: Path) -> None:
    # 2 ohm at the source in series with 30 and 60 ohm side by side, 20 ohm: 1 / 22 S.
    site = yard.site(tmp_path, earthing="TN-C-S")
    main, shed = site.boards
    boards = (replace(main, electrode_ohm=30.0), replace(shed, electrode_ohm=60.0, neutral_earth_link=True))
    site = replace(site, boards=boards)
    base = replace(base_of(yard.site(tmp_path)), site=site, network=Network(site))
    found = worked_break(base)
    assert found is not None
    assert found.path_s == pytest.approx(1 / 22)
    total = np.array([16e3, 14e3, 8e3]) / 230**2
    emf = 230 * np.exp(-2j * np.pi * np.arange(3) / 3)
    assert found.shift_v == pytest.approx((total * emf).sum() / (total.sum() + 1 / 22))


SHIFT = Settings("R1", "Test relay", "", (Stage(Function.DISPLACEMENT, 1, True, 30.0, 1.0, 0.95),), 0.5, "by hand")


@pytest.mark.parametrize(("at", "ratio"), [("Main", None), ("Shed", 1.4586)])
def test_against_pe_an_asymmetry_shows_where_pe_stays_behind(at: str, ratio: float | None, tmp_path: Path) -> None:
    # k:1:1 moves the neutral by U (k - 1) / (k + 2): 30.5 V of 230 V at the least sensitive is k = 1.4586. With N and
    # PE tied at Main nothing shows there; at the shed, on next to no cable, it does for a break behind that tie only.
    path = yard.write(tmp_path, earthing="TN-C-S", displacement_from="n-to-earth", elements=yard.DISPLACEMENT)
    text = path.read_text().replace('measures_at = "Main"', f'measures_at = "{at}"')
    path.write_text(text.replace("[0.05, 0.01]", "[0.000001, 0.0]"))
    found = check(yard.read(tmp_path), SHIFT, 20, 1).smallest_asymmetry["59N"]
    assert found == (None if ratio is None else pytest.approx(ratio, abs=0.001))
