"""Imports point one way, as the table in DEVELOPERS.md says; only the command line prints; who opens files is known.

``files`` reads and writes what belongs to the user. ``sheet`` is the one exception: it reads the fonts it is shipped
with and the folder of templates that is handed to it, and nothing else.
"""

import ast
import re
from pathlib import Path

import pytest

ROOT = Path(__file__).parent.parent
PACKAGE = ROOT / "relaycfg"
FOLDERS = sorted(p.name for p in PACKAGE.iterdir() if p.is_dir() and any(p.glob("*.py")))
MODULES = sorted(p.stem for p in PACKAGE.glob("*.py") if not p.stem.startswith("__"))
COMMAND_LINE = {"cli", "commands", "options", "streams"}
EVERYTHING = "everything"
ROW = re.compile(r"^\| ((?:`[\w./]+`(?:, )?)+) \|[^|]*\|([^|]*)\|$", re.MULTILINE)


def table():
    """Package or module to what it may import, from the table in DEVELOPERS.md."""
    text = (ROOT / "DEVELOPERS.md").read_text("utf-8").split("may import")[1].split("\n\n")[0]
    rows = [(re.findall(r"`(\w+)", names), allowed) for names, allowed in ROW.findall(text)]
    return {
        name: set(re.findall(r"\w+", allowed)) - {"nothing", "of", "ours"} for names, allowed in rows for name in names
    }


def parsed(part):
    """Syntax trees of a package, or of a single module of relaycfg."""
    folder = PACKAGE / part
    paths = sorted(folder.rglob("*.py")) if folder.is_dir() else [PACKAGE / f"{part}.py"]
    return {path: ast.parse(path.read_text("utf-8")) for path in paths}


def imported(tree):
    """Names right below relaycfg that a module imports, wherever in the module."""
    for node in ast.walk(tree):
        if isinstance(node, ast.Import):
            names = [alias.name for alias in node.names]
        elif isinstance(node, ast.ImportFrom):
            assert node.level == 0, "imports are absolute"
            names = [node.module] if node.module != "relaycfg" else [f"relaycfg.{alias.name}" for alias in node.names]
        else:
            continue
        yield from (name.split(".")[1] for name in names if name.startswith("relaycfg."))


def modules_imported(tree):
    """Top-level names of every module imported, ours or not."""
    for node in ast.walk(tree):
        if isinstance(node, ast.Import):
            yield from (alias.name.split(".")[0] for alias in node.names)
        elif isinstance(node, ast.ImportFrom) and node.module is not None:
            yield node.module.split(".")[0]


def called(tree):
    """Names of everything called, methods without their object."""
    for node in ast.walk(tree):
        if isinstance(node, ast.Call):
            name = getattr(node.func, "id", None) or getattr(node.func, "attr", None)
            if name is not None:
                yield name


def test_the_table_names_every_package_and_module():
    assert set(table()) == {*FOLDERS, *MODULES}


@pytest.mark.parametrize("part", [*FOLDERS, *MODULES])
def test_a_part_imports_what_the_table_allows(part):
    allowed = table()[part] | {part}
    found = {(path.name, name) for path, tree in parsed(part).items() for name in imported(tree)}
    assert EVERYTHING in allowed or {(module, name) for module, name in found if name not in allowed} == set()


@pytest.mark.parametrize("part", [p for p in (*FOLDERS, *MODULES) if p not in COMMAND_LINE])
def test_only_the_command_line_prints(part):
    printing = [
        path.name
        for path, tree in parsed(part).items()
        if "print" in called(tree) or {"click", "logging"} & set(modules_imported(tree))
    ]
    assert printing == []


OPENERS = {
    *("open", "read_text", "write_text", "read_bytes", "write_bytes", "mkstemp", "NamedTemporaryFile"),
    *("iterdir", "glob", "rglob", "listdir", "scandir", "walk_packages", "joinpath", "mkdir", "unlink"),
    *("FileSystemLoader", "PackageLoader", "ModuleLoader", "load_workbook", "load_table"),
    *("TTFont", "TTFontFile", "EmbeddedType1Face", "ImageReader", "Image", "drawImage", "save"),
    *("fromfile", "loadtxt", "genfromtxt", "savetxt", "memmap"),
}
"""Calls that open files or look into folders, those of the libraries in use among them."""
MAY_OPEN = {"sheet": {("fonts.py", "TTFont"), ("wording.py", "FileSystemLoader")}}
"""The shipped fonts, and the templates folder handed to ``render``."""


@pytest.mark.parametrize("part", [p for p in (*FOLDERS, *MODULES) if p != "files"])
def test_only_files_opens_files_but_for_the_sheets_fonts_and_templates(part):
    opened = {(path.name, name) for path, tree in parsed(part).items() for name in called(tree) if name in OPENERS}
    assert opened == MAY_OPEN.get(part, set())


@pytest.mark.parametrize("part", [p for p in (*FOLDERS, *MODULES) if p != "files"])
def test_nothing_but_files_knows_a_clock_or_chance_of_its_own(part):
    """Files may read dates; the drawn load states come from seeded streams of numpy."""
    clocks = {"time", "datetime", "random", "uuid", "secrets"}
    used = [path.name for path, tree in parsed(part).items() if clocks & set(modules_imported(tree))]
    assert used == []
