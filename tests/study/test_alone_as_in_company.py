"""A sampled state shows the same volts alone as in the study, also where it has several solutions."""

from pathlib import Path

import numpy as np
import pytest

from relaycfg.files import read_site
from relaycfg.network import Network, sampled
from relaycfg.study.levels import supply_levels

EXAMPLE = Path(__file__).resolve().parents[2] / "examples" / "workshop" / "site.toml"


@pytest.mark.parametrize("place", ["source", "Office"])
def test_a_state_with_several_solutions_comes_to_rest_alone_where_it_does_in_company(place):
    # Contract: --state "sample N" shows again what the study counted. Samples 256 and 393 once did not.
    site = read_site(EXAMPLE)
    network = Network(site)
    emf = supply_levels(site, network).nominal
    together = network.solve(place, sampled(site, 400, 1), emf, look_for_roots=True)
    chosen = np.flatnonzero(together.several)
    assert len(chosen) > 10
    for k in chosen:
        alone = network.solve(place, sampled(site, 1, 1, start=int(k)), emf)
        assert np.abs(alone.l_n[:, :, 0] - together.l_n[:, :, k]).max() < 1e-4, k
