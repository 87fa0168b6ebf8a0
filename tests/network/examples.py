"""The worked examples as sites: how each recipe's inputs become boards, loads and a break."""

import tomllib
from pathlib import Path
from typing import Any

import numpy as np

from relaycfg.model.site import Load, Site
from relaycfg.network import Network, Solved, connected, healthy_emf
from tests.network.sites import board, cable, impedance, load, site

FILE = Path(__file__).parents[1] / "reference" / "worked-examples.toml"
LINES = ("L1", "L2", "L3")
ORDER = {"abc": "L1-L2-L3", "acb": "L1-L3-L2"}
UNITS = ("v", "a", "w", "deg", "ohm", "percent", "pu", "ratio")


def load_examples() -> dict[str, dict[str, Any]]:
    """All examples by id, known wrong prints among them (their ``expected`` is right)."""
    data = tomllib.loads(FILE.read_text())
    return {e["id"]: e for e in (*data["example"], *data["known_wrong_print"])}


EXAMPLES = load_examples()


def of_recipe(*recipes: str) -> list[str]:
    """Ids of all examples of those recipes."""
    return [name for name, example in EXAMPLES.items() if example["recipe"] in recipes]


def tolerance(example: dict[str, Any], key: str) -> float:
    """The example's tolerance for a key, by the unit the key ends in."""
    return float(example["tolerance"][key.rsplit("_", 1)[-1]])


def close(example: dict[str, Any], key: str, value: Any) -> None:
    """Assert that a computed figure is the example's, angles modulo a turn."""
    difference = np.asarray(value, float) - np.asarray(example["expected"][key], float)
    if key.endswith("_deg"):
        difference = (difference + 180) % 360 - 180
    assert np.all(np.abs(difference) <= tolerance(example, key)), (key, value, example["expected"][key])


def rows(example: dict[str, Any]) -> list[dict[str, float]]:
    """The expected table, one dict a row."""
    columns = example["expected"]["columns"]
    return [dict(zip(columns, row, strict=True)) for row in example["expected"]["rows"]]


def close_row(example: dict[str, Any], row: dict[str, float], **values: float) -> None:
    """Assert that computed figures are those of a row of the table."""
    for key, value in values.items():
        assert abs(value - row[key]) <= tolerance(example, key), (key, value, row)


def volts_of(inputs: dict[str, Any]) -> float:
    """The source's line-to-neutral volts."""
    return float(inputs.get("source_l_n_v") or inputs["source_l_l_v"] / 3**0.5)


def loads_of(inputs: dict[str, Any]) -> list[Load]:
    """Constant-impedance loads at board A."""
    if "load_ohm" in inputs:
        return [
            impedance("A", at, complex(*ohm), volts_of(inputs))
            for at, ohm in zip(LINES, inputs["load_ohm"], strict=True)
            if ohm
        ]
    nominal, pf = inputs["load_nominal_v"], inputs.get("load_pf", 1.0)
    if "load_a" in inputs:
        return [load("A", at, a * nominal) for at, a in zip(LINES, inputs["load_a"], strict=True)]
    tangent = (1 / pf**2 - 1) ** 0.5
    loads = [load("A", at, 1e3 * kw, 1e3 * kw * tangent) for at, kw in zip(LINES, inputs["load_kw"], strict=False)]
    if "star_with_n_kw" in inputs:
        loads.append(load("A", "all", 1e3 * inputs["star_with_n_kw"], to_neutral=True))
    if "three_wire_kw" in inputs:
        p = 1e3 * inputs["three_wire_kw"] * 3 * nominal**2 / inputs["three_wire_nominal_l_l_v"] ** 2
        loads.append(load("A", "all", p, p * (1 / inputs["three_wire_pf"] ** 2 - 1) ** 0.5))
    return loads


def star(inputs: dict[str, Any], loads: list[Load] | None = None, **earth: Any) -> Site:
    """Board S on the source's bar, board A behind a cable whose neutral is the one that breaks.

    The source electrode of 1 ohm only fixes what earth is, unless ``earth`` or the inputs have electrodes.
    """
    electrode, source_electrode = earth.get("electrode"), earth.get("source_electrode", 1.0)
    if "earth_path_ohm" in inputs:
        electrode, source_electrode = inputs["earth_path_ohm"], 0.0
    if "electrode_ohm" in inputs:
        electrode, source_electrode = inputs["electrode_ohm"], inputs["source_electrode_ohm"]
    line, neutral = complex(*inputs.get("line_ohm", (0, 0))), complex(*inputs.get("neutral_ohm", (0, 0)))
    return site(
        [board("S"), board("A", cable=cable(line, neutral), link=electrode is not None, electrode=electrode)],
        loads_of(inputs) if loads is None else loads,
        emf_v=volts_of(inputs),
        nominal_v=inputs.get("load_nominal_v", volts_of(inputs)),
        electrode_ohm=source_electrode,
        earthing="TN-C-S",
        phase_order=ORDER[inputs.get("sequence", "abc")],
    )


def broken(star_site: Site, joint_ohm: float | None = None, place: str = "A") -> Solved:
    """All loads on, the neutral of board A open or with a joint."""
    solved = Network(star_site).solve(place, connected(star_site), healthy_emf(star_site), joint_ohm)
    assert solved.converged.all()
    return solved


def shift(solved: Solved) -> complex:
    """Neutral of board A against the source's, one state."""
    return complex(solved.n_earth[1, 0] - solved.n_earth[0, 0])


def magnitudes(solved: Solved) -> np.ndarray:
    """Line-to-neutral RMS of board A, one state."""
    return np.abs(solved.l_n[1, :, 0])
