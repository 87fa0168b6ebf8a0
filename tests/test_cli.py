"""Commands as a user meets them: files, exit codes, what goes to which stream, and no traceback."""

import json
import os
import re
import shutil
import subprocess
import sys
import tomllib
from importlib import resources
from pathlib import Path

import jsonschema
import pytest

import relaycfg.files
from relaycfg import __version__, cli

ROOT = Path(__file__).parent.parent
COMMANDS = ["new", "breaks", "derive", "check", "sheet", "reading"]
FEW = ["--samples", "30"]


def run(capsys, *arguments):
    """Exit code, stdout and stderr of one command."""
    with pytest.raises(SystemExit) as leaving:
        cli.main([str(a) for a in arguments])
    out, err = capsys.readouterr()
    assert "Traceback" not in err
    assert "\x1b" not in out + err
    return leaving.value.code, out, err


@pytest.fixture
def site(tmp_path, monkeypatch, capsys):
    """A starter site, with the current folder in it."""
    folder = tmp_path / "board"
    assert run(capsys, "new", folder)[0] == 0
    monkeypatch.chdir(folder)
    return folder


def hasty_settings(site):
    """Settings that cannot hold: overvoltage inside the band of the supply."""
    relay = tomllib.loads((site / "site.toml").read_text("utf-8"))["relay"][0]["name"]
    device = tomllib.loads((site / "relay.toml").read_text("utf-8"))["name"]
    path = site / "hasty.toml"
    path.write_text(
        f'schema = 1\nfor_relay = "{relay}"\ndevice = "{device}"\n'
        "[[overvoltage]]\nstage = 1\non = true\npickup_v = 245.0\ndelay_s = 0.1\ndropout_ratio = 0.97\n"
    )
    return path


@pytest.mark.parametrize("arguments", [["--help"], *([c, "--help"] for c in COMMANDS)])
def test_help_imports_no_heavy_library(arguments):
    code = (
        "import sys, contextlib\nfrom relaycfg.cli import main\n"
        f"with contextlib.suppress(SystemExit): main({arguments!r})\n"
        "print('heavy:', *sorted({'numpy', 'pydantic', 'reportlab', 'jinja2'} & set(sys.modules)))"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, cwd=ROOT, check=True)
    assert done.stdout.splitlines()[-1] == "heavy:"
    assert "Usage: relaycfg" in done.stdout


@pytest.mark.parametrize("command", [[], *([c] for c in COMMANDS)])
def test_every_help_ends_with_a_command_that_runs(command, capsys, tmp_path, monkeypatch):
    _, out, _ = run(capsys, *command, "--help")
    example = out.splitlines()[-1].split()
    assert example[0] == "relaycfg"
    assert command == [] or example[1] == command[0]
    shutil.copytree(ROOT / "examples", tmp_path / "examples")
    monkeypatch.chdir(tmp_path)
    few = FEW if example[1] not in ("new", "reading") else []
    code, out, err = run(capsys, *example[1:], *few)
    assert code in (0, 1), err
    assert out


def test_new_writes_a_site_on_which_the_other_commands_run(site, capsys):
    assert {"site.toml", "loads.csv", "relay.toml"} <= {p.name for p in site.iterdir()}
    assert run(capsys, "breaks", *FEW)[0] == 0
    code, out, _ = run(capsys, "derive", *FEW)
    assert code in (0, 1)
    assert out.splitlines()[-1] == "settings.toml"
    assert run(capsys, "check", *FEW)[0] in (0, 1)
    code, out, _ = run(capsys, "sheet", "site.toml", "settings.toml", *FEW)
    assert (site / out.splitlines()[-1]).read_bytes().startswith(b"%PDF")


def test_new_writes_over_nothing_without_force(site, capsys):
    before = (site / "site.toml").read_bytes()
    code, out, err = run(capsys, "new", site, "--volts", "120")
    assert (code, out) == (2, "")
    assert "--force" in err
    assert (site / "site.toml").read_bytes() == before
    assert run(capsys, "new", site, "--volts", "120", "--force")[0] == 0
    assert (site / "site.toml").read_bytes() != before


def test_derive_writes_over_nothing_without_force_and_computes_nothing_before(site, capsys, monkeypatch):
    (site / "settings.toml").write_text("mine")
    monkeypatch.setattr("relaycfg.study.derive", None)
    code, out, err = run(capsys, "derive", *FEW)
    assert (code, out) == (2, "")
    assert "settings.toml" in err
    assert (site / "settings.toml").read_text() == "mine"


def test_check_fails_settings_inside_the_band_with_exit_1(site, capsys):
    code, out, _ = run(capsys, "check", "site.toml", hasty_settings(site), *FEW)
    assert code == 1
    assert re.search(r"exceptions? found against the stated criteria", out)


def test_the_sheet_is_written_and_says_so_where_there_are_exceptions(site, capsys):
    code, out, _ = run(capsys, "sheet", "site.toml", hasty_settings(site), "-o", "mine.pdf", *FEW)
    assert code == 1
    assert "Exceptions" in out
    assert out.splitlines()[-1] == "mine.pdf"
    assert (site / "mine.pdf").exists()
    code, out, err = run(capsys, "sheet", "-o", "mine.pdf", *FEW)
    assert (code, out) == (2, "")
    assert "--force" in err


@pytest.mark.parametrize(
    ("number", "revision", "name"),
    [
        ("NY-E-014", "A", "NY-E-014-A.pdf"),
        ("../../etc/x", "B", "etc_x-B.pdf"),
        ("", "", "setting-sheet.pdf"),
        ("Blatt 7/3", "", "Blatt_7_3.pdf"),
        (".", "", "setting-sheet.pdf"),
    ],
)
def test_the_sheet_has_a_plain_file_name(number, revision, name):
    class Stated:
        class document:  # noqa: N801
            pass

    Stated.document.number, Stated.document.revision = number, revision
    assert cli.sheet_name(Stated) == name


@pytest.mark.usefixtures("site")
def test_json_stays_whole_on_stdout_and_fits_the_published_schema(capsys):
    schema = json.loads(resources.files("relaycfg.text").joinpath("result.schema.json").read_text("utf-8"))
    code, out, err = run(capsys, "derive", "--format", "json", "--explain", "--quiet", *FEW)
    assert code in (0, 1)
    result = json.loads(out)
    jsonschema.validate(result, schema)
    assert (result["program"], result["samples"], result["seed"]) == (f"relaycfg {__version__}", 30, 1)
    assert err.splitlines() == ["settings.toml"]
    for arguments in (["breaks", "--at", "source"], ["check"]):
        code, out, _ = run(capsys, *arguments, "--format", "json", *FEW)
        jsonschema.validate(json.loads(out), schema)


@pytest.mark.usefixtures("site")
def test_breaks_can_be_narrowed_to_place_state_and_joint(capsys):
    _, out, _ = run(
        capsys, "breaks", "--at", "source", "--state", "connected", "--joint-ohm", "2", "--format", "json", *FEW
    )
    result = json.loads(out)
    assert [(r["at"], r["state"], r["joint_ohm"]) for r in result["breaks"]] == [("source", "connected", 2.0)]
    assert (result["summary"], result["samples"]) == ([], 0)


@pytest.mark.usefixtures("site")
def test_an_unknown_place_is_refused_with_the_known_ones(capsys):
    code, out, err = run(capsys, "breaks", "--at", "Attic")
    assert (code, out) == (2, "")
    assert re.search(r"'Attic' is no place where the neutral can break; give one of none, source, ", err)


@pytest.mark.usefixtures("site")
def test_all_shows_more(capsys):
    short, long = (run(capsys, "breaks", *more, *FEW)[1] for more in ([], ["--all"]))
    assert len(short.splitlines()) <= 60 < len(long.splitlines())


@pytest.mark.usefixtures("site")
def test_the_same_seed_gives_the_same_bytes_and_another_one_does_not(capsys):
    first, again, other = (run(capsys, "breaks", "--seed", s, *FEW)[1] for s in (1, 1, 2))
    assert first == again != other


@pytest.mark.usefixtures("site")
def test_quiet_leaves_stderr_empty(capsys):
    assert run(capsys, "breaks", *FEW)[2].startswith("relaycfg: ")
    assert run(capsys, "breaks", "--quiet", *FEW)[2] == ""


def test_a_site_may_come_from_standard_input(site, capsys):
    done = subprocess.run(
        [sys.executable, "-m", "relaycfg", "breaks", "-", "--quiet", *FEW],
        input=(site / "site.toml").read_bytes(),
        capture_output=True,
        env=os.environ | {"PYTHONPATH": str(ROOT)},
        check=False,
    )
    assert done.returncode == 0, done.stderr
    assert done.stdout.decode() == run(capsys, "breaks", *FEW)[1]


@pytest.mark.parametrize("command", ["breaks", "derive", "check", "sheet"])
def test_bad_input_is_said_with_its_line_and_writes_nothing(command, site, capsys):
    path = site / "site.toml"
    lines = path.read_text().splitlines()
    at = next(k for k, line in enumerate(lines) if line.startswith("nominal_v"))
    lines[at] = "nominal_v = -230"
    path.write_text("\n".join(lines))
    before = sorted(site.iterdir())
    code, out, err = run(capsys, command)
    assert (code, out) == (2, "")
    assert f"site.toml:{at + 1}:" in err
    assert "nominal_v is -230" in err
    assert sorted(site.iterdir()) == before


@pytest.mark.parametrize("command", ["breaks", "derive", "check", "sheet"])
def test_a_missing_site_is_bad_input(command, tmp_path, monkeypatch, capsys):
    monkeypatch.chdir(tmp_path)
    code, out, err = run(capsys, command)
    assert (code, out) == (2, "")
    assert "site.toml" in err


@pytest.mark.parametrize(
    "arguments",
    [
        ["reading", "172", "263"],
        ["reading", "172", "263", "nan"],
        ["reading", "172", "263", "inf"],
        ["reading", "172", "263", "2630"],
        ["reading", "172", "263", "263,5"],
        ["reading", "172", "263", "263", "--nominal", "0"],
        ["reading", "172", "263", "263", "--line-to-line", "398", "398"],
        ["breaks", "--samples", "0"],
        ["breaks", "--joint-ohm", "nan"],
        ["breaks", "--format", "xml"],
        ["derive", "--all"],
        ["nothing"],
        ["--seed", "1"],
    ],
)
def test_bad_usage_is_exit_2_with_nothing_on_stdout(arguments, capsys):
    code, out, err = run(capsys, *arguments)
    assert (code, out) == (2, "")
    assert "Error:" in err


def test_reading_needs_no_site_file(tmp_path, monkeypatch, capsys):
    monkeypatch.chdir(tmp_path)
    code, out, err = run(capsys, "reading", "172", "263", "263", "--line-to-line", "398", "398", "398")
    assert (code, err) == (0, "")
    assert "very likely: lost or loose neutral" in out


def test_reading_takes_other_nominal_volts(capsys):
    assert "V0 30.0 V" in run(capsys, "reading", "90", "137.48", "137.48", "--nominal", "120")[1]


@pytest.mark.usefixtures("site")
def test_an_error_of_the_programs_own_is_one_sentence(capsys, monkeypatch):
    def broken(*_, **__):
        raise RuntimeError("unexpected")

    monkeypatch.setattr(relaycfg.files, "read_site", broken)
    code, out, err = run(capsys, "breaks")
    assert (code, out) == (2, "")
    assert err == (
        f"relaycfg {__version__} met an error of its own (RuntimeError: unexpected); "
        "please report it with the command and the files used\n"
    )


@pytest.mark.usefixtures("site")
def test_the_traceback_is_there_for_those_who_ask(capsys, monkeypatch):
    monkeypatch.setattr(relaycfg.files, "read_site", None)
    monkeypatch.setenv("RELAYCFG_TRACEBACK", "1")
    with pytest.raises(SystemExit):
        cli.main(["breaks"])
    assert "Traceback" in capsys.readouterr().err


def test_a_reader_that_leaves_early_brings_no_traceback():
    with subprocess.Popen(
        [sys.executable, "-m", "relaycfg", "reading", "172", "263", "263"],
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        cwd=ROOT,
    ) as process:
        process.stdout.close()
        process.stdout = None
        _, err = process.communicate()
    assert err == b""
    assert process.returncode == cli.PIPE_CLOSED


def test_version_names_the_program(capsys):
    assert run(capsys, "--version")[:2] == (0, f"relaycfg {__version__}\n")


def test_linear_algebra_runs_on_one_thread_unless_told(capsys, monkeypatch):
    monkeypatch.delenv("OPENBLAS_NUM_THREADS", raising=False)
    run(capsys, "--version")
    assert os.environ["OPENBLAS_NUM_THREADS"] == "1"
    monkeypatch.setenv("OPENBLAS_NUM_THREADS", "2")
    run(capsys, "--version")
    assert os.environ["OPENBLAS_NUM_THREADS"] == "2"
