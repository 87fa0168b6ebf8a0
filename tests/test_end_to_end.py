"""From the example's files to the PDF and the JSON: the same figures, the same bytes, the flaws found."""

import io
import json
from pathlib import Path
from typing import Any

import pdfplumber
import pytest

from relaycfg.cli import main

EXAMPLE = Path(__file__).resolve().parent.parent / "examples" / "workshop"
SAMPLES = ["--samples", "500", "--quiet"]


def run(capsys: pytest.CaptureFixture[str], *words: str) -> tuple[int, str]:
    with pytest.raises(SystemExit) as stop:
        main(list(words))
    return int(str(stop.value.code)), capsys.readouterr().out


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return tmp_path_factory.mktemp("example")


def derived(folder: Path, capsys: pytest.CaptureFixture[str]) -> dict[str, Any]:
    settings = folder / "settings.toml"
    code, out = run(
        capsys, "derive", str(EXAMPLE / "site.toml"), "-o", str(settings), "--force", "--format", "json", *SAMPLES
    )
    assert code == 0
    result: dict[str, Any] = json.loads(out)
    return result


def test_derived_settings_pass_their_own_check(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert derived(folder, capsys)["exceptions"] == 0
    code, _ = run(capsys, "check", str(EXAMPLE / "site.toml"), str(folder / "settings.toml"), *SAMPLES)
    assert code == 0


def test_the_sheet_prints_the_figures_of_the_json_and_repeats_its_bytes(
    folder: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    figures = derived(folder, capsys)
    sheets = []
    for name in ("one.pdf", "two.pdf"):
        code, _ = run(capsys, "sheet", str(EXAMPLE / "site.toml"), "-o", str(folder / name), *SAMPLES)
        assert code == 0
        sheets.append((folder / name).read_bytes())
    assert sheets[0] == sheets[1]
    with pdfplumber.open(io.BytesIO(sheets[0])) as pdf:
        first = pdf.pages[0].extract_text()
        text = "\n".join(page.extract_text() for page in pdf.pages)
    for stage in figures["settings"]["stages"]:
        if stage["on"]:
            row = next(
                line for line in first.splitlines() if line.startswith(f"{stage['function']} {stage['stage']} on ")
            )
            pickup = stage["pickup_percent"] if stage["pickup_v"] is None else stage["pickup_v"]
            assert f"{pickup:.1f}" in row
            assert f"{stage['delay_s']:.2f} s" in row or f"{stage['delay_s']:.3f} s" in row
            assert f"{stage['dropout_ratio']:.2f}" in row
    for case in figures["cases"]:
        assert f"{case['highest_l_n_v']:.1f}" in text
        assert f"{case['highest_v0_v']:.1f}" in text


def test_a_switched_pen_is_an_exception_on_page_one(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    for part in EXAMPLE.iterdir():
        if part.is_file():
            (tmp_path / part.name).write_bytes(part.read_bytes())
    site = tmp_path / "site.toml"
    as_repaired = site.read_text()
    site.write_text(as_repaired.replace('poles = "lines" ', 'poles = "lines and neutral" '))
    assert site.read_text() != as_repaired
    run(capsys, "sheet", str(site), "-o", str(tmp_path / "sheet.pdf"), *SAMPLES)
    with pdfplumber.open(tmp_path / "sheet.pdf") as pdf:
        first = " ".join((pdf.pages[0].extract_text() or "").split())
    assert "a PEN is never switched" in first


def test_the_flaws_of_the_existing_settings_are_found(capsys: pytest.CaptureFixture[str]) -> None:
    code, out = run(
        capsys,
        "check",
        str(EXAMPLE / "site-as-found.toml"),
        str(EXAMPLE / "existing-settings.toml"),
        "--format",
        "json",
        *SAMPLES,
    )
    assert code == 1
    exceptions = [f for f in json.loads(out)["findings"] if f["severity"] == "exception"]
    insecure = next(f for f in exceptions if f["about"] == "59 stage 1")
    assert "253.0 V 0.1 s, trips in case" in insecure["sentence"]
    assert "turn U> from 253 to" in insecure["do"]
    blunt = next(f for f in exceptions if f["about"] == "break at source")
    assert "core scenarios not cleared in time" in blunt["sentence"]
    assert "turn U0> from 50 to" in blunt["do"]
    coil = next(f for f in exceptions if f["about"].startswith("trip coil"))
    assert "fed L1-N from the floating system" in coil["sentence"]


def test_breaks_starts_with_what_the_relay_sees_and_stays_short(capsys: pytest.CaptureFixture[str]) -> None:
    code, out = run(capsys, "breaks", str(EXAMPLE / "site.toml"), *SAMPLES)
    assert code == 0
    lines = out.splitlines()
    assert "sees 2 of 4 places where the neutral can break" in lines[0]
    assert len(lines) <= 60
