"""Amounts that look like a slip and load lists that prove nothing are said, and computed all the same."""

import pytest

UNPROVED = "Loads: the load list models no unbalance: nothing about a lost neutral is proved."


def load(name, kw, between="L1-N", more=""):
    return f'[[load]]\nboard = "MB"\nname = "{name}"\nbetween = "{between}"\nkw = {kw}\npf = 1\n{more}'


def test_a_connected_load_far_above_the_rating_asks_for_watts(bench):
    assert bench.read(bench.site + load("Mill", 390) + load("Saw", 390) + load("Fan", 390)).warnings == ()
    assert bench.read(bench.site + "".join(load(f"Mill {i}", 398) for i in range(4))).warnings == (
        "Loads: the connected load is 3.98 times the rating of the source; kW written as W?",
    )


def test_a_single_load_above_the_rating_is_named(bench):
    assert bench.read(bench.site + load("Mill", 500)).warnings == (
        "Load Mill: its 500 kVA is above the 400 kVA of the source; kW written as W?",
    )
    assert bench.read(bench.site + load("Mill", 2400) + load("Saw", 500) + load("Hall", 500)).warnings == (
        "Loads: the connected load is 8.51 times the rating of the source; kW written as W?",
        "Load Mill: its 2400 kVA is above the 400 kVA of the source; kW written as W? So are 2 more.",
    )
    assert bench.read(bench.site + load("Lamps", 5, more="count = 100\n")).warnings == ()


def test_a_source_without_a_rating_is_not_held_against_the_loads(bench):
    plain = 'kind = "transformer"\nrating_kva = 400\nimpedance_percent = 4'
    text = bench.with_(plain, 'kind = "impedance"\nline_ohm = [0.01, 0.01]')
    assert bench.read(text + load("Mill", 5000)).warnings == ()


@pytest.mark.parametrize("change", [("kw = 2\n", "kw = 2\nusage = 0\n"), ('"L1-N"', '"L1-L2"'),
                                    ('"L1-N"', '"L1-L2-L3"'), ('"L1-N"', '"L1-L2-L3-N"')])  # fmt: skip
def test_loads_that_unbalance_nothing_prove_nothing(bench, change):
    assert bench.read(bench.with_(*change)).warnings == (UNPROVED,)
    assert bench.read(bench.with_(*change) + load("Fan", 1, "L2-N")).warnings == ()
