"""The README tells the truth: its commands exist, its key table is the forms' own, its example runs."""

import re
import shlex
from pathlib import Path

import pytest

from relaycfg.cli import main
from tests.readme_tables import rewritten

TOP = Path(__file__).resolve().parent.parent
README = (TOP / "README.md").read_text()


def section(title: str) -> str:
    return README.split(f"\n## {title}\n")[1].split("\n## ")[0]


def blocks(text: str) -> list[str]:
    return [line for block in re.findall(r"```\n(.*?)```", text, re.S) for line in block.strip().splitlines()]


def test_it_opens_with_one_paragraph_that_states_the_job() -> None:
    first = README.split("\n\n")[1]
    for word in ("neutral", "approver", "installer", "PDF", "27", "59", "47", "59N"):
        assert word in first


@pytest.mark.parametrize("title", ["Try it", "Run the tests"])
def test_each_of_the_two_commands_is_one_line(title: str) -> None:
    assert len(blocks(section(title))) == 1


def test_its_tables_are_made_from_the_forms() -> None:
    assert rewritten(README) == README


def test_the_main_command_writes_the_sheet_it_names(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    command = blocks(section("Try it"))[0].split(" && ")[-1]
    words = shlex.split(command)
    assert words[0].endswith("relaycfg")
    monkeypatch.chdir(tmp_path)
    words = [str(TOP / w) if w.startswith("examples/") else w for w in words]
    with pytest.raises(SystemExit) as stop:
        main(words[1:])
    assert stop.value.code == 0
    written = tmp_path / capsys.readouterr().out.strip().splitlines()[-1]
    assert written.read_bytes().startswith(b"%PDF")


def test_every_command_of_the_walk_through_runs_in_order(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.chdir(tmp_path)
    for line in blocks(section("How to use it")):
        words = shlex.split(line.split("#")[0])
        if words[0] == "cd":
            monkeypatch.chdir(tmp_path / words[1])
            continue
        with pytest.raises(SystemExit) as stop:
            main(words[1:])
        assert stop.value.code == 0, (line, capsys.readouterr().err)


def test_the_cautions_defer_and_promise_nothing() -> None:
    text = section("Cautions")
    assert "Local codes and the licensed engineer prevail" in text
    for word in ("safe", "complies"):
        assert not re.search(rf"\b{word}\b", README)
