"""Every folder of the cases holds: published and own figures, from site files through the package's own solver."""

from dataclasses import replace
from pathlib import Path

import pytest

from tests.reference.case import check_of, folders, read_case, row_of
from tests.reference.methods import METHODS, measure

FOLDERS = folders()
CHECKS = [(folder, check) for folder in FOLDERS for check in read_case(folder).checks]
W1 = next((folder, check) for folder, check in CHECKS if check.id == "w1-textbook-open-neutral")


@pytest.mark.parametrize("folder", FOLDERS, ids=lambda folder: folder.name)
def test_every_figure_of_the_case_is_within_its_tolerance(folder: Path) -> None:
    """Source: stated in the folder's expected.toml beside each check."""
    checks = read_case(folder).checks
    rows = [row_of(check, measure(folder, check)) for check in checks if not check.not_in_product]
    assert [row for row in rows if not row.holds] == []
    assert len(rows) == sum(not check.not_in_product for check in checks)


def test_every_check_says_where_it_is_from_and_why_its_tolerance() -> None:
    ids = [check.id for _, check in CHECKS]
    assert len(set(ids)) == len(ids) > 90
    for _, check in CHECKS:
        assert min(map(len, (check.shows, check.source, check.clause, check.tolerance_reason))) > 0, check.id
        assert bool(check.wrong_print) == bool(check.why_wrong), check.id
        assert not (check.printed and check.wrong_print), check.id
        assert check.method in METHODS, check.id


@pytest.mark.parametrize("folder", FOLDERS, ids=lambda folder: folder.name)
def test_the_readme_of_a_case_draws_its_circuit_and_names_every_check(folder: Path) -> None:
    text = (folder / "README.md").read_text()
    assert text.count("```") == 2
    for check in read_case(folder).checks:
        assert f"## {check.id}\n" in text
        assert check.source in " ".join(text.split())


@pytest.mark.parametrize("key", W1[1].figures)
def test_a_wrong_expected_figure_does_not_hold(key: str) -> None:
    """Source: own arithmetic: three tolerances are more than one and any difference the right figure may have."""
    folder, check = W1
    wrong = check.figures[key]
    amount = 3 * check.tolerance[key.rsplit("_", 1)[-1]]
    wrong = [wrong[0] + amount, *wrong[1:]] if isinstance(wrong, list) else wrong + amount
    altered = replace(check, figures=check.figures | {key: wrong})
    assert row_of(check, measure(folder, check)).holds
    assert not row_of(altered, measure(folder, altered)).holds


def test_keys_that_nothing_reads_are_refused() -> None:
    folder, check = W1
    with pytest.raises(KeyError, match="vn_x_v"):
        measure(folder, replace(check, figures={"vn_x_v": 1.0}))
    with pytest.raises(ValueError, match="unknown key joint"):
        measure(folder, replace(check, given={"joint": 1.0}))
    for method in METHODS:
        with pytest.raises((ValueError, KeyError)):
            measure(folder, replace(check, method=method, given={"nothing_reads_this": 1.0}))
    table = {name: getattr(check, name) for name in ("id", "shows", "status", "source", "clause", "tolerance_reason")}
    with pytest.raises(TypeError, match="unexpected"):
        check_of(table | {"tolerance": {"v": 1.0}, "expects": {}})
    with pytest.raises(TypeError, match="no tolerance for vn_deg"):
        check_of(table | {"tolerance": {"v": 1.0}, "figures": {"vn_deg": 1.0}})


def test_nothing_is_compared_with_a_known_wrong_print() -> None:
    """Source: own arithmetic: each wrong print lies outside the tolerance of the right figure."""
    wrong = {"x-w3-third-phase": 306.446, "x-400-v-complex": 100.6, "x-380-v-1-2-3": 190.0, "x-india-band": 228.0}
    found = {check.id: check for _, check in CHECKS if check.wrong_print}
    assert found.keys() == wrong.keys()
    for name, volts in wrong.items():
        figures = found[name].figures
        first = {"x-w3-third-phase": lambda f: f["l_n_v"][2], "x-india-band": lambda f: f["low_v"]}
        right = first.get(name, lambda f: f["vn_v"])(figures)
        assert f"{volts:g}" in found[name].wrong_print
        assert abs(right - volts) > found[name].tolerance["v"]
