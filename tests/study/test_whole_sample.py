"""No state is dropped: the classes of a place and its unresolved states add up to the whole sample, on any site."""

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from relaycfg.model.site import Site
from relaycfg.study.breaks import breaks
from relaycfg.study.study import check, derive
from tests.study.yard import load, site

SAMPLES = 150
BETWEEN = ["L1-N", "L2-N", "L3-N", "L1-L2", "L1-L2-L3-N"]
LAWS = [(1.0, 0.0, 0.0), (0.0, 1.0, 0.0), (0.0, 0.0, 1.0), (0.3, 0.3, 0.4)]


def random_site(folder: Path, seed: int) -> Site:
    """The yard with loads of any size, law, usage, group and sign, and boards that mind low volts."""
    rng = np.random.default_rng(seed)
    count = int(rng.integers(3, 14))
    loads = "".join(
        load(str(rng.choice(["Main", "Shed"])), str(rng.choice(BETWEEN)), 1.0, f"load {k}") for k in range(count)
    )
    made = site(folder, loads=loads, earthing=str(rng.choice(["TN-S", "TN-C-S"])))
    drawn = tuple(
        replace(
            old,
            p_w=float(rng.lognormal(7.5, 1)) * (-1 if rng.random() < 0.1 else 1),
            q_var=float(rng.normal(0, 800)),
            zip_p=LAWS[rng.integers(len(LAWS))],
            zip_q=LAWS[rng.integers(len(LAWS))],
            band_low_pu=float(rng.uniform(0.5, 0.85)),
            usage=float(rng.choice([0.0, 0.3, 0.7, 1.0])),
            minds_low_v=bool(rng.random() < 0.4),
        )
        for old in made.loads
    )
    low = replace(made.equipment, sustained_low_v=190.0, sustained_low_s=5.0, low_points=((160.0, 1.0),))
    return replace(made, loads=drawn, equipment=low if rng.random() < 0.7 else made.equipment)


@pytest.mark.parametrize("seed", range(8))
def test_classes_and_unresolved_states_are_the_whole_sample(seed: int, tmp_path: Path) -> None:
    made = random_site(tmp_path, seed)
    derived = derive(made, SAMPLES, seed)
    studies = [derived.breaks, check(made, derived.settings, SAMPLES, seed).breaks]
    for study in studies:
        assert [s.at for s in study.summaries] == list(made.places)
        for s in study.summaries:
            assert s.samples == SAMPLES
            assert sum(c.count for c in s.classes.values()) + s.unresolved == SAMPLES
            assert sum(c.count for n, c in s.classes.items() if not n.startswith("none /")) == s.harmful.count
            assert all(c.of == SAMPLES for c in s.classes.values())
            assert set(s.boards_harmed) | set(s.boards_healthy) == {b.name for b in made.boards}
            assert not set(s.boards_harmed) & set(s.boards_healthy)
    plain = breaks(made, samples=SAMPLES, seed=seed)
    for s in plain.summaries:
        assert s.unresolved + s.harmful.count <= SAMPLES
        if not s.seen:
            assert sum(c.count for c in s.classes.values()) + s.unresolved == SAMPLES
