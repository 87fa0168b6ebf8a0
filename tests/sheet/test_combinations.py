"""Page of every on/off combination, and of several relays together."""

import math
from dataclasses import replace
from io import BytesIO

import pdfplumber
import pytest

from relaycfg.errors import InputError
from relaycfg.model.break_results import Share
from relaycfg.model.place_results import HighestVoltage, PlaceAsymmetry, Together
from relaycfg.sheet import render

FOUND = HighestVoltage(
    "source", 399.96, 399.97, "L1", "branch and bound", 22, 45, ("Kiln", "Oven"), "Main", 399.8, 408.6
)


@pytest.fixture
def grown(sample):
    """The hand-written study with combinations, a second relay and asymmetries."""
    study = sample.study()
    first = study.site.relay
    half, most = Share(50, 100, 0.4, 0.6), Share(90, 100, 0.83, 0.94)
    wild = replace(FOUND, at="Main", bound_v=math.inf, loads_on=(), modelled_v=None)
    return replace(
        study,
        site=replace(study.site, relays=(first, replace(first, name="K2"))),
        breaks=replace(study.breaks, highest=(FOUND, wild)),
        together=(Together("source", most, {first.name: half}, half),),
        place_asymmetry=(PlaceAsymmetry("source", 5000.0, {"59": 1.73, "all": 1.31, "47": None}),),
    )


def lines_of(study, templates):
    with pdfplumber.open(BytesIO(render(study, templates, "0.1.0"))) as pdf:
        pages = [page.extract_text(x_tolerance=1).replace("\u00a0", " ") for page in pdf.pages]
    return "\n".join(pages)


def test_every_combination_has_what_was_found_what_is_proved_and_the_loads(grown, templates):
    text = lines_of(grown, templates)
    assert "Constant impedances on one stiff bar only: every on/off combination" in text
    assert "source 400.0 400.0 L1 399.8 408.6 Kiln; Oven" in text
    assert "Main 400.0 not bounded L1 399.8 – nothing" in text


def test_relays_together_are_a_table_with_unseen_places(grown, templates):
    text = lines_of(grown, templates)
    assert "source 50.0 % (40.0 to 60.0) not seen 50.0 % (40.0 to 60.0)" in text


def test_the_least_asymmetry_stands_beside_that_of_a_stiff_source(grown, templates):
    text = lines_of(grown, templates)
    assert "stiff source 2.20 1.90 1.33 never" in text
    assert "source 1.73 – 1.31 never" in text


def test_a_study_without_combinations_says_so(sample, templates):
    assert "every on/off combination\nNot computed in this study." in lines_of(sample.study(), templates)


def test_a_load_name_that_cannot_be_printed_is_refused(grown, templates):
    odd = replace(FOUND, loads_on=("\U0001f525",))
    with pytest.raises(InputError):
        render(replace(grown, breaks=replace(grown.breaks, highest=(odd,))), templates, "0.1.0")
