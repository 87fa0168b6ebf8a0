"""The sheet's section on closing again, the relay's own wires and what is no lost neutral."""

import re
from io import BytesIO

import pytest
from pypdf import PdfReader

from relaycfg.sheet import render
from relaycfg.study import check
from tests.cautions import bench
from tests.study import yard


@pytest.fixture(scope="module")
def text(tmp_path_factory, templates):
    """All words of a sheet: loads 2:1:1, coil and relay fed L1-N, closing by itself after 30 s, five times."""
    fed = yard.RELAY.replace('kind = "shunt", from = "auxiliary", range_v = [19, 29]',
                             'kind = "undervoltage release", from = "L1-N", range_v = [180, 253]')  # fmt: skip
    fed = fed.replace(
        'supply = { from = "auxiliary", range_v = [19, 29] }', 'supply = { from = "L1-N", range_v = [90, 280] }'
    )
    site = bench.star(tmp_path_factory.mktemp("star"), relay=fed)
    rest = '[reconnect]\nafter_any_trip = "automatic"\ndelay_s = 30\nattempts = 5\n'
    settings = bench.settings(site, bench.stage("displacement", 1, 40.0, 0.5), rest=rest)
    pages = PdfReader(BytesIO(render(check(site, settings, 40, 1), templates, "0.1.0"))).pages
    return " ".join(" ".join(page.extract_text().split()) for page in pages)


def test_the_lock_out_stands_first_and_what_to_prove_follows(text):
    section = text[text.index("Set to close by itself after 30 s: an exception") :]
    assert section.index("Lock it out: by hand after every trip") < section.index("Before closing, prove in this order")
    assert "dead, in ohms; then under a test load" in section


def test_pumping_stands_with_its_figures(text):
    # 30 s wait and some 0.6 s to the open switch: six trips until five closings are used up
    assert "at most 5 times" in text
    assert re.search(r"263\.5 V 59N stage 1 0\.\d+ s 6 6 \(6\) 5", text)
    assert "200 locked out" in text


def test_the_release_names_the_cases_in_which_it_opens_by_itself(text):
    assert "It opens the switch in cases that must hold:" in text
    assert "below its range it opens the switch by itself, which counts as opened" in text
    assert "keeps the switch closed: 0 (< 3/40)" in text


def test_its_own_neutral_wire_is_worked_in_volts(text):
    assert "a lost neutral of 172 / 263 / 263 V reads 230 / 230 / 230 V with V0 0.0 V" in text
    assert "the sound board reads 0 / 398 / 398 V" in text


def test_every_pattern_has_its_message_and_its_row_of_confusion(text):
    for words in (
        "76.7 V 59N stage 1",
        "a line is lost: not the neutral",
        "59N operates too, so it alone proves no lost neutral",
        "How surely readings tell it",
    ):
        assert words in text
    # 2:1:1 is named with and without the volts between lines
    assert re.search(r"neutral lost at source 100\.0 / 100\.0 0\.0 / 0\.0", text)
