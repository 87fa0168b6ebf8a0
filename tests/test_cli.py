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
from relaycfg import __version__, cli, commands, options
from relaycfg.files import limits

ROOT = Path(__file__).parent.parent
README = (ROOT / "README.md").read_text("utf-8")
COMMANDS = ["new", "breaks", "derive", "check", "sheet", "reading"]
EXAMPLE_CODES = {"check": commands.EXCEPTIONS}
"""Exit codes of the commands in the helps where they are not 0: the example's existing settings have exceptions."""
FEW = ["--samples", "30"]
UNNAMED = {"--output"}
"""Options the README leaves to the helps: the long name of -o."""


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


def names_of(command):
    """Long and short names of a command's options, but for --help."""
    return {name for option in command.params for name in option.opts if name.startswith("-")}


def test_the_readme_names_every_option_and_no_other():
    usage = README.split("\n## How to use it\n")[1].split("\n## ")[0]
    named = set(re.findall(r"(?<![\w-])--?[a-z][a-z-]*", usage))
    known = {name for command in cli.program.commands.values() for name in names_of(command)}
    assert named - known - {"--help", "--version"} == set()
    assert known - named - UNNAMED == set()


@pytest.mark.parametrize("name", COMMANDS)
def test_the_row_of_a_command_in_the_readme_names_only_its_options(name):
    row = re.search(rf"^\| `relaycfg {name} ([^|`]*(?:\|[^|`]*)*)` \|", README, re.MULTILINE)
    assert row is not None
    assert set(re.findall(r"(?<![\w-])--?[a-z][a-z-]*", row[1])) <= names_of(cli.program.commands[name])


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
    assert code == EXAMPLE_CODES.get(example[1], commands.DONE), err
    assert out


def test_new_writes_a_site_on_which_the_other_commands_run(site, capsys):
    assert {"site.toml", "loads.csv", "relay.toml"} <= {p.name for p in site.iterdir()}
    assert run(capsys, "breaks", *FEW)[0] == 0
    code, out, _ = run(capsys, "derive", *FEW)
    assert (code, out.splitlines()[-1]) == (0, "settings.toml")
    assert run(capsys, "check", *FEW)[0] == 0
    code, out, _ = run(capsys, "sheet", "site.toml", "settings.toml", *FEW)
    assert code == 0
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


@pytest.mark.parametrize("command", ["derive", "sheet"])
def test_the_help_says_where_the_path_goes(command, capsys):
    out = " ".join(run(capsys, command, "--help")[1].split())
    assert "with --format json on standard error, so that the JSON stays whole" in out


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
    assert commands.sheet_name(Stated) == name


@pytest.mark.usefixtures("site")
def test_json_stays_whole_on_stdout_and_fits_the_published_schema(capsys):
    schema = json.loads(resources.files("relaycfg.text").joinpath("result.schema.json").read_text("utf-8"))
    code, out, err = run(capsys, "derive", "--format", "json", "--explain", "--quiet", *FEW)
    assert code == 0
    result = json.loads(out, parse_constant=pytest.fail)
    jsonschema.validate(result, schema)
    assert (result["program"], result["samples"], result["seed"]) == (f"relaycfg {__version__}", 30, 1)
    assert err.splitlines() == ["settings.toml"]
    for arguments in (["breaks", "--at", "source"], ["check"], ["sheet", "-o", "mine.pdf"]):
        code, out, err = run(capsys, *arguments, "--format", "json", *FEW)
        assert code == 0
        jsonschema.validate(json.loads(out, parse_constant=pytest.fail), schema)
    assert err.splitlines()[-1] == "mine.pdf"


@pytest.mark.usefixtures("site")
def test_breaks_can_be_narrowed_to_place_state_and_joint(capsys):
    _, out, _ = run(
        capsys, "breaks", "--at", "source", "--state", "connected", "--joint-ohm", "2", "--format", "json", *FEW
    )
    result = json.loads(out)
    assert [(r["at"], r["state"], r["joint_ohm"]) for r in result["breaks"]] == [("source", "connected", 2.0)]
    assert (result["summary"], result["samples"]) == ([], 0)


@pytest.mark.usefixtures("site")
def test_a_sampled_state_is_shown_again_by_the_number_it_was_named_with(capsys):
    narrow = ["--at", "source", "--format", "json", *FEW]
    worst = json.loads(run(capsys, "breaks", *narrow)[1])["summary"][0]["worst"][0]
    code, out, _ = run(capsys, "breaks", *narrow, "--state", f"sample {worst['index']}")
    assert code == 0
    (row,) = json.loads(out)["breaks"]
    assert row["state"] == f"sample {worst['index']}"
    line = ("L1", "L2", "L3").index(worst["line"])
    assert row["boards"][worst["board"]]["l_n_v"][line] == pytest.approx(worst["volts"], abs=1e-6)


@pytest.mark.parametrize("state", ["sample -1", "sample x", "sample 1000000", "sample17", "all"])
def test_an_unknown_state_is_refused_with_the_known_ones(state, capsys):
    code, out, err = run(capsys, "breaks", "--state", state)
    assert (code, out) == (2, "")
    assert "is not one of connected, least, corners, sample, worst, a sampled state such as " in err
    assert '"sample 17", or "on: A; B"' in err


@pytest.mark.usefixtures("site")
def test_the_worst_combination_is_shown_again_by_name_and_by_the_loads_it_lists(capsys):
    narrow = ["--at", "source", *FEW]
    (highest,) = json.loads(run(capsys, "breaks", *narrow, "--format", "json")[1])["highest"]
    for state in ("worst", "on: " + "; ".join(highest["loads_on"])):
        (row,) = json.loads(run(capsys, "breaks", *narrow, "--format", "json", "--state", state)[1])["breaks"]
        assert row["state"] == state
        assert max(row["boards"][highest["board"]]["l_n_v"]) == pytest.approx(highest["modelled_v"], abs=1e-6)
    code, out, _ = run(capsys, "breaks", *narrow, "--state", "worst")
    assert code == 0
    assert "star link, on: " + "; ".join(["what is always on", *highest["loads_on"]]) in " ".join(out.split())


@pytest.mark.usefixtures("site")
def test_loads_the_site_has_not_and_a_worst_state_without_a_break_are_refused(capsys):
    code, out, err = run(capsys, "breaks", "--state", "on: Attic fan; Moon lamp")
    assert (code, out) == (2, "")
    assert "the site has no load or motor called Attic fan; Moon lamp; separate names by semicolons" in err
    code, out, err = run(capsys, "breaks", "--at", "none", "--state", "worst")
    assert (code, out) == (2, "")
    assert "the worst state is that of a break; give its place" in err


def second_relay(site):
    """A second relay at a sub-board in the site's own file; the names of both, and of that board."""
    text = (site / "site.toml").read_text("utf-8")
    parsed = tomllib.loads(text)
    first, board = parsed["relay"][0], parsed["board"][-1]["name"]
    more = f'\n[[relay]]\nname = "Second"\nmeasures_at = "{board}"\ndevice = "{first["device"]}"\n'
    (site / "site.toml").write_text(text + more, "utf-8")
    return first["name"], board


def test_a_relay_is_chosen_by_name_and_its_settings_belong_to_it(site, capsys):
    first, board = second_relay(site)
    for chosen, name in (([], first), (["--relay", "Second"], "Second")):
        code, out, _ = run(capsys, "derive", *chosen, "-o", "mine.toml", "--force", *FEW)
        assert code in (0, 1)
        assert out.startswith(f"{name}, ")
        assert tomllib.loads((site / "mine.toml").read_text("utf-8"))["for_relay"] == name
        assert run(capsys, "check", "site.toml", "mine.toml", *chosen, *FEW)[1].startswith(f"{name}, ")
    code, out, err = run(capsys, "check", "site.toml", "mine.toml", *FEW)
    assert (code, out) == (2, "")
    assert f'for_relay is "Second", and {first} is judged; add --relay "Second"' in err
    code, out, _ = run(capsys, "sheet", "--relay", "Second", "-o", "mine.pdf", *FEW)
    assert code in (0, 1)
    assert (site / "mine.pdf").read_bytes().startswith(b"%PDF")
    result = json.loads(run(capsys, "derive", "-o", "mine.toml", "--force", "--format", "json", *FEW)[1])
    assert [t["at"] for t in result["together"]] == [s["at"] for s in result["summary"]]
    assert "Second" in {name for t in result["together"] for name in t["alone"]}
    assert board in {t["at"] for t in result["together"]}


@pytest.mark.parametrize("command", ["breaks", "derive", "check", "sheet"])
def test_an_unknown_relay_is_refused_with_the_known_ones(command, site, capsys):
    first, _ = second_relay(site)
    code, out, err = run(capsys, command, "--relay", "Third")
    assert (code, out) == (2, "")
    assert f"'Third' is no relay of this site; give one of {first}, Second" in err


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
        ["reading", "172"],
        ["reading", "172", "263", "--system", "3ph-4w"],
        ["reading", "172", "263", "263", "--system", "1ph-3w"],
        ["reading", "172", "263", "--line-to-line", "398", "398", "398"],
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


@pytest.mark.parametrize(
    ("arguments", "said"),
    [
        (["reading", "-5", "230", "230"], "-5 is outside 0 to 1500 volts"),
        (["reading", "172,5", "230", "230"], "'172,5' has a decimal comma; write 172.5"),
        (["reading", "x", "230", "230"], "'x' is no number"),
        (["reading", "1", "2", "3", "--nought"], "'--nought' is no option of this command, and no number"),
        (["reading", "1"], "in order L1 L2 L3, or 2 where there are two lines; 1 given"),
        (["reading", "1", "2", "--system", "3ph-4w"], "'3ph-4w' does not have 2 lines"),
        (["reading", "1", "2", "3", "4"], "give 3 readings, line to neutral in order L1 L2 L3, or 2 where"),
        (["reading", "1", "2", "3", "--nominal", "700"], "700 is outside 50 to 600 volts"),
        (["reading", "1", "2", "3", "--line-to-line", "4", "-5", "6"], "-5 is outside 0 to 1500 volts"),
        (["new", "there", "--volts", "49"], "49 is outside 50 to 600 volts"),
        (["new", "there", "--volts", "nan"], "nan is outside 50 to 600 volts"),
        (["breaks", "--samples", "x"], "'x' is no whole number; give 1 to 1000000"),
        (["breaks", "--samples", "0"], "0 is not possible; give 1 to 1000000"),
        (["breaks", "--seed", "-1"], "-1 is not possible; give 0 or more"),
        (["breaks", "--joint-ohm", "0"], "0 is outside 1e-06 to 1e+06 ohms"),
        (["derive", "-o", "-"], "'-' is no file; the result goes to standard output, give a path for the file"),
        (["sheet", "-o", "-"], "'-' is no file; the result goes to standard output, give a path for the file"),
        (["check", "site.toml", "-"], "'-' is no file; only a site is read from standard input"),
        (["sheet", "site.toml", "-"], "'-' is no file; only a site is read from standard input"),
    ],
)
def test_a_wrong_figure_or_path_is_said_in_words_of_the_trade(arguments, said, capsys, tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    code, out, err = run(capsys, *arguments)
    assert (code, out) == (2, "")
    assert said in " ".join(err.split())
    assert "l_n" not in err
    assert list(tmp_path.iterdir()) == []


def test_nominal_volts_are_those_of_a_site_file_and_the_help_says_so(capsys, tmp_path):
    assert options.NOMINAL_V == limits.NOMINAL_V
    for command in ("new", "reading"):
        assert "line to neutral, 50 to 600." in " ".join(run(capsys, command, "--help")[1].split())
    assert run(capsys, "new", tmp_path / "high", "--volts", "600")[0] == 0


def test_the_help_names_every_exit_code(capsys):
    out = " ".join(run(capsys, "--help")[1].split())
    for code in (commands.DONE, commands.EXCEPTIONS, cli.BAD_INPUT, cli.INTERRUPTED, cli.PIPE_CLOSED):
        assert re.search(rf"[:,] {code} \w", out)


def shell(command, site, **more):
    """A command line of relaycfg run by a shell in the folder of a site."""
    return subprocess.run(
        f"{sys.executable} -m relaycfg {command}",
        shell=True,
        cwd=site,
        env=os.environ | {"PYTHONPATH": str(ROOT)},
        capture_output=True,
        text=True,
        check=False,
        **more,
    )


needs_full = pytest.mark.skipif(not Path("/dev/full").exists(), reason="no /dev/full here")


@needs_full
@pytest.mark.parametrize(
    "command", ["derive --quiet", "derive --quiet --format json", "sheet --quiet", "breaks --quiet", "--help"]
)
def test_where_the_result_finds_no_room_nothing_is_written(command, site):
    before = sorted(site.iterdir())
    few = "" if command == "--help" else " --samples 30"
    done = shell(f"{command}{few} > /dev/full", site)
    assert done.returncode == cli.BAD_INPUT
    assert done.stderr == "Error: standard output takes no more (no space left on device); nothing is written\n"
    assert sorted(site.iterdir()) == before


@needs_full
def test_what_is_written_before_the_path_is_refused_is_named(tmp_path):
    done = shell("new there > /dev/full", tmp_path)
    assert done.returncode == cli.BAD_INPUT
    assert done.stderr.startswith(
        "Error: standard output takes no more (no space left on device); written all the same: there/site.toml, "
    )


@needs_full
def test_messages_that_find_no_room_stop_nothing(site):
    done = shell("breaks --samples 30 2> /dev/full", site)
    assert (done.returncode, done.stdout[:12]) == (commands.DONE, "Starter site")
    assert shell("breaks --at Attic 2> /dev/full", site).returncode == cli.BAD_INPUT


@pytest.mark.skipif(os.name != "posix", reason="needs a POSIX shell")
def test_closed_streams_are_said(site):
    done = shell("breaks - <&-", site)
    assert done.returncode == cli.BAD_INPUT
    assert "Error: standard input is closed; give the path of a site" in done.stderr
    done = shell("derive >&-", site)
    assert done.returncode == cli.BAD_INPUT
    assert done.stderr == "Error: standard output is closed; nothing is computed or written\n"
    assert not (site / "settings.toml").exists()


@pytest.mark.parametrize("name", ["site.toml", "loads.csv", "relay.toml", "../board/relay.toml", "link.toml"])
@pytest.mark.parametrize("command", ["derive", "sheet"])
def test_an_input_is_never_written_over(command, name, site, capsys):
    (site / "link.toml").symlink_to(site / "site.toml")
    before = {path.name: path.read_bytes() for path in site.iterdir()}
    code, out, err = run(capsys, command, "-o", name, "--force", "--quiet", *FEW)
    assert (code, out) == (2, "")
    assert f"{name}: one of the files read for it" in err
    assert {path.name: path.read_bytes() for path in site.iterdir()} == before


def test_the_settings_given_are_not_written_over_by_their_sheet(site, capsys):
    path = hasty_settings(site)
    before = path.read_bytes()
    code, out, err = run(capsys, "sheet", "site.toml", path, "-o", path.name, "--force", *FEW)
    assert (code, out) == (2, "")
    assert "hasty.toml: one of the files read for it" in err
    assert path.read_bytes() == before


@pytest.mark.skipif(not Path("/dev/stdin").exists(), reason="standard input has no path here")
@pytest.mark.parametrize("name", ["site.toml", "loads.csv", "relay.toml"])
def test_a_site_from_standard_input_is_not_written_over_either(name, site):
    before = (site / name).read_bytes()
    done = shell(f"derive - -o {name} --force --quiet --samples 30 < site.toml", site)
    assert (done.returncode, done.stdout) == (2, "")
    assert "one of the files read for it" in done.stderr
    assert (site / name).read_bytes() == before


@pytest.mark.usefixtures("site")
def test_shares_of_few_states_come_with_a_note(capsys):
    note = "relaycfg: note: shares of 30 load states mean little; take 200 or more"
    assert note in run(capsys, "breaks", *FEW)[2].splitlines()
    assert "note:" not in run(capsys, "breaks", "--samples", "200")[2]
    assert "note:" not in run(capsys, "breaks", "--state", "least", *FEW)[2]
    assert run(capsys, "derive", "--quiet", *FEW)[2] == ""


@pytest.mark.usefixtures("site")
def test_the_first_message_says_how_much_there_is_to_do(capsys):
    first = run(capsys, "breaks", *FEW)[2].splitlines()[0]
    assert first == "relaycfg: computing every break with 30 drawn load states at 3 places"
    assert run(capsys, "breaks", "--at", "source", *FEW)[2].splitlines()[0].endswith("states at 1 place")


@pytest.mark.parametrize(("samples", "long"), [(2000, False), (1_000_000, True)])
def test_a_long_study_asks_for_patience(samples, long, capsys):
    commands.announce(False, "deriving", samples, 3, commands.STUDY_S)
    said = capsys.readouterr().err
    assert said.startswith(f"relaycfg: deriving with {samples} drawn load states at 3 places")
    assert ("; this takes a while" in said) == long


def test_reading_needs_no_site_file(tmp_path, monkeypatch, capsys):
    monkeypatch.chdir(tmp_path)
    code, out, err = run(capsys, "reading", "172", "263", "263", "--line-to-line", "398", "398", "398")
    assert (code, err) == (0, "")
    assert "very likely: lost or loose neutral" in out


@pytest.mark.parametrize(
    "words",
    [
        ("160", "80", "--line-to-line", "240"),
        ("160", "80", "--nominal", "120", "--line-to-line", "240"),
        ("--system", "1ph-3w", "160", "80", "--line-to-line=240"),
    ],
)
def test_reading_takes_two_lines_with_the_one_voltage_between_them(words, capsys):
    code, out, _ = run(capsys, "reading", *words)
    assert code == 0
    assert "between lines 240 V; nominal 120 V" in out
    assert "Neutral displaced by 40.0 V" in out
    assert "1.0 : 2.0 on L1 : L2" in out


def test_reading_goes_on_taking_three_voltages_between_three_lines_in_any_order(capsys):
    first = run(capsys, "reading", "172", "263", "263", "--line-to-line", "398", "398", "398")
    assert first == run(capsys, "reading", "--line-to-line", "398", "398", "398", "172", "263", "263")
    assert first[0] == 0


@pytest.mark.parametrize(("system", "between"), [("1ph-3w", "240 V"), ("2ph-3w", "208 V")])
def test_new_writes_a_site_of_two_lines_that_every_command_runs_on(system, between, tmp_path, monkeypatch, capsys):
    assert run(capsys, "new", str(tmp_path / "new"), "--system", system)[0] == 0
    monkeypatch.chdir(tmp_path / "new")
    assert f"not the {between} between lines" in Path("site.toml").read_text("utf-8")
    for command in ("breaks", "derive", "check", "sheet"):
        code, out, err = run(capsys, command, "--samples", "50")
        assert (code, err.count("warning")) == (0, 0), (command, out, err)


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
