"""Two legs and two lines of a star in the network: dividers by hand, a centre-tapped transformer by another engine."""

from pathlib import Path

import numpy as np
import pytest
from dss import DSS

from relaycfg.files import read_site
from relaycfg.model.site import SOURCE, Site
from relaycfg.network import Network, connected, corners, healthy_emf

TRANSFORMER = """
[supply]
system = "1ph-3w"
nominal_v = 120
frequency_hz = 60
earthing = "TN-S"
band_at = "source"
[[source]]
kind = "transformer"
no_load_v = 120
rating_kva = 25
impedance_percent = 2.5
x_over_r = 1.25
electrode_ohm = 5
[[board]]
name = "Panel"
fed_from = "source"
[board.cable]
line_ohm = [0.02, 0.01]
neutral_ohm = [0.03, 0.012]
pe_ohm = [0.03, 0.01]
"""
LOADS = (("L1-N", 6.0), ("L2-N", 2.0), ("L1-L2", 4.0))
U_PERCENT, X_OVER_R = 2.5, 1.25


def written(folder: Path, text: str, loads: tuple[tuple[str, float], ...]) -> tuple[Network, Site]:
    """The network of a site with resistive loads at its panel, and the site."""
    tables = "".join(
        f'[[load]]\nboard = "Panel"\nname = "{k} {between}"\nbetween = "{between}"\nkw = {kw}\npf = 1.0\n'
        f'kind = "constant impedance"\n'
        for k, (between, kw) in enumerate(loads)
    )
    (folder / "site.toml").write_text(text + tables)
    site = read_site(folder / "site.toml")
    return Network(site), site


def engine_volts(loads: tuple[tuple[str, float], ...], broken: bool) -> tuple[float, ...]:
    """L1-N, L2-N and L1-L2 at the panel by a general power-flow engine with its own centre-tapped transformer.

    Interlaced halves as remembered from Kersting: primary 0.5 R + j 0.8 X, each half R + j 0.4 X, per unit of 120 V.
    """
    r = U_PERCENT / np.hypot(1, X_OVER_R)
    x = r * X_OVER_R
    lines = [
        "clear",
        "set defaultbasefrequency=60",
        "new circuit.c phases=1 bus1=src basekv=7.2 pu=1 z1=[1e-9 1e-9] z0=[1e-9 1e-9]",
        "new transformer.t phases=1 windings=3 buses=[src.1.0 sec.1.3 sec.3.2] kvs=[7.2 0.12 0.12] "
        f"kvas=[25 25 25] %rs=[{0.5 * r} {r} {r}] xhl={1.2 * x} xht={1.2 * x} xlt={0.8 * x} ppm_antifloat=0 "
        "%noloadloss=0 %imag=0",
        "new reactor.earth phases=1 bus1=sec.3 bus2=sec.0 r=5 x=0",
        "new reactor.l1 phases=1 bus1=sec.1 bus2=panel.1 r=0.02 x=0.01",
        "new reactor.l2 phases=1 bus1=sec.2 bus2=panel.2 r=0.02 x=0.01",
        "new reactor.n phases=1 bus1=sec.3 bus2=panel.3 r=0.03 x=0.012",
        "new reactor.leak phases=1 bus1=panel.3 bus2=panel.0 r=1e6 x=0",
    ]
    nodes = {"L1-N": "1.3", "L2-N": "2.3", "L1-L2": "1.2"}
    for k, (between, kw) in enumerate(loads):
        kilovolts = 0.24 if between == "L1-L2" else 0.12
        lines.append(
            f"new load.l{k} phases=1 bus1=panel.{nodes[between]} conn=delta kv={kilovolts} kw={kw} kvar=0 model=2 "
            "vminpu=0 vmaxpu=10"
        )
    lines += ["set controlmode=off", "set tolerance=1e-10", "set maxiterations=500", "set voltagebases=[7.2 0.24]"]
    lines += ["calcvoltagebases", *(["edit reactor.n enabled=no"] if broken else []), "solve"]
    for line in lines:
        DSS.Text.Command = line
    circuit = DSS.ActiveCircuit
    assert circuit.Solution.Converged
    volts = dict(zip(circuit.AllNodeNames, np.asarray(circuit.AllBusVolts, float).view(complex), strict=True))
    one, two, neutral = (volts[f"panel.{k}"] for k in (1, 2, 3))
    return abs(one - neutral), abs(two - neutral), abs(one - two)


TWO = (("L1-N", 1.0), ("L2-N", 5.0))


@pytest.mark.parametrize(
    ("loads", "place"),
    [(LOADS, "none"), (LOADS[:1], "none"), (LOADS[2:], "none"), (TWO, "none"), (LOADS, "Panel"), (TWO, "Panel")],
)
def test_a_centre_tapped_transformer_gives_the_volts_of_a_general_engine(tmp_path, loads, place):
    """Source: a power-flow engine's three-winding transformer of the same per-unit impedances; 0.01 V.

    Broken, the engine keeps N by a leak of 1 uS to earth besides its loads.
    """
    network, site = written(tmp_path, TRANSFORMER, loads)
    solved = network.solve(place, connected(site), healthy_emf(site))
    l_n = solved.l_n[0, :, 0]
    found = (*np.abs(l_n), abs(l_n[0] - l_n[1]))
    assert found == pytest.approx(engine_volts(loads, place == "Panel"), abs=0.01)
    if place == "none" and len(loads) == 3:
        assert min(found[:2]) < 117


def test_a_leg_alone_meets_the_known_impedance_of_half_the_winding(tmp_path):
    """Source: 1.5 R + j 1.2 X per unit of 120 V (from memory), which the sum of primary and one half gives."""
    _, site = written(tmp_path, TRANSFORMER, LOADS)
    base = 120**2 / 25000
    r = U_PERCENT / 100 / np.hypot(1, X_OVER_R)
    half = complex(1.5 * r, 1.2 * r * X_OVER_R) * base
    assert site.source.line_ohm + site.source.neutral_ohm == pytest.approx(half)
    # Both legs in series are the whole winding: its 2.5 percent of 240^2 / 25000 ohm.
    assert abs(2 * site.source.line_ohm) == pytest.approx(0.025 * 240**2 / 25000)


STAR = """
[supply]
system = "2ph-3w"
nominal_v = 120
frequency_hz = 60
earthing = "TN-S"
band_at = "source"
[[source]]
kind = "transformer"
no_load_v = 120
rating_kva = 75
impedance_percent = 3
x_over_r = 2
zero_sequence_ratio = 0.7
electrode_ohm = 5
[[board]]
name = "Panel"
fed_from = "source"
"""


def test_two_lines_of_a_star_have_the_ohms_of_the_whole_transformer(tmp_path):
    """Source: own arithmetic: 3 percent of 207.85^2 / 75000 ohm a line; Z_N = (Z0 - Z1) / 3, three sharing N."""
    _, site = written(tmp_path, STAR, LOADS)
    line = 0.03 * 3 * 120**2 / 75000
    assert abs(site.source.line_ohm) == pytest.approx(line)
    assert abs(site.source.neutral_ohm) == pytest.approx(0.3 * line / 3)


@pytest.mark.parametrize(("text", "sum_v"), [(TRANSFORMER, 240.0), (STAR, 207.85)])
def test_a_lost_neutral_puts_resistive_legs_in_series_across_the_volts_between_them(tmp_path, text, sum_v):
    """Source: own arithmetic: the two add up, and divide as the resistances; cable and source take a volt or two."""
    network, site = written(tmp_path, text, (("L1-N", 3.0), ("L2-N", 1.0), ("L1-L2", 5.0)))
    first, second = np.abs(network.solve(SOURCE, connected(site), healthy_emf(site)).l_n[0, :, 0])
    between = abs(np.subtract(*network.solve(SOURCE, connected(site), healthy_emf(site)).l_n[0, :, 0]))
    assert first + second == pytest.approx(between, abs=1e-3)
    assert second / first == pytest.approx(3, rel=1e-3)
    assert between == pytest.approx(sum_v, abs=4)


def test_the_corners_of_two_lines_are_four(tmp_path):
    _, site = written(tmp_path, STAR, LOADS)
    names = ("L1 high, L2 high", "L1 high, L2 low", "L1 low, L2 high", "L1 low, L2 low")
    assert corners(site).names == names
