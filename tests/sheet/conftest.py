"""Sheets of the hand-written study, each rendered once a run."""

import importlib.util
from dataclasses import dataclass
from io import BytesIO
from pathlib import Path

import pdfplumber
import pytest

from relaycfg.sheet import render

HERE = Path(__file__).parent
TEMPLATES = HERE.parent.parent / "templates"


def _sample():
    spec = importlib.util.spec_from_file_location("sheet_sample", HERE / "sample.py")
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


@pytest.fixture(scope="session")
def sample():
    return _sample()


@pytest.fixture(scope="session")
def templates():
    return TEMPLATES


@pytest.fixture(scope="session")
def sheets(sample):
    """PDF bytes by kind of study."""
    studies = {
        "plain": sample.study(),
        "letter": sample.study(paper="Letter"),
        "check": sample.checked(),
        "large": sample.study(boards=40, exceptions=12),
    }
    return {kind: render(study, TEMPLATES, "0.1.0") for kind, study in studies.items()}


@dataclass(frozen=True)
class Page:
    """A page as read back: words with their boxes, text lines (no-break spaces as spaces), size, pictures."""

    words: list
    lines: list
    width: float
    height: float
    images: int


@pytest.fixture(scope="session")
def pages(sheets):
    """Every page of every sheet, read back."""
    found = {}
    for kind, data in sheets.items():
        with pdfplumber.open(BytesIO(data)) as pdf:
            found[kind] = [
                Page(
                    page.extract_words(x_tolerance=1),
                    page.extract_text(x_tolerance=1).replace("\u00a0", " ").split("\n"),
                    page.width,
                    page.height,
                    len(page.images),
                )
                for page in pdf.pages
            ]
    return found


@pytest.fixture(scope="session")
def lines(pages):
    """Text lines of every page."""
    return {kind: [page.lines for page in found] for kind, found in pages.items()}
