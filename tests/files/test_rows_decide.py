"""No row is handed out for nothing: with other figures in it, some site is another model or is refused."""

from dataclasses import replace
from random import Random
from types import MappingProxyType

from relaycfg.errors import InputError
from relaycfg.files.tables import Row, shipped
from tests.files.standard_rows import APART
from tests.files.sweep import choices, read_bare, recorded

ONLY_REFUSES_LESS = ["default-star-voltage-tolerance"]
"""Its sentence stands in test_site_sentences.py."""


def lower(value, draw):
    """Every figure lowered by a few percent of its own, so that sums and ratios move too; texts as they are."""
    if isinstance(value, dict):
        return {key: lower(inner, draw) for key, inner in value.items()}
    if isinstance(value, list):
        return [lower(inner, draw) for inner in value]
    if isinstance(value, float):
        return value * draw.uniform(0.955, 0.98) if value else 0.001
    return value


def reads_otherwise(folder, text, before):
    """Whether the text now gives another model, or none; digest and the printed list of inputs do not count."""
    try:
        now = read_bare(folder, text)
    except InputError:
        return True
    return replace(now, digest="", inputs=()) != replace(before, digest="", inputs=())


def test_the_figures_of_every_row_decide_something_in_the_model(tmp_path, monkeypatch):
    read = {}
    for text in choices():
        with recorded() as used:
            read[text] = read_bare(tmp_path, text), used
    draw, idle, tried = Random(1), [], 0
    for row_id, row in list(shipped().items()):
        other = {key: value if key in APART else lower(value, draw) for key, value in row.content.items()}
        if other == dict(row.content):
            assert isinstance(row.value, str), row_id
            continue
        tried += 1
        with monkeypatch.context() as patch:
            patch.setitem(shipped(), row_id, Row(row_id, row.family, MappingProxyType(other)))
            sites = ((text, site) for text, (site, used) in read.items() if row_id in used)
            if not any(reads_otherwise(tmp_path, text, site) for text, site in sites):
                idle.append(row_id)
    assert idle == ONLY_REFUSES_LESS
    assert tried > 100
