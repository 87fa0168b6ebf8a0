"""Imports point one way, as the table in DEVELOPERS.md says; only the command line prints, only files open files."""

import ast
import re
from pathlib import Path

import pytest

ROOT = Path(__file__).parent.parent
PACKAGE = ROOT / "relaycfg"
LEAVES = {"errors", "units"}
"""Single modules that import nothing of ours; every package that shows or reads things may use them."""
USES_LEAVES = {"files", "text", "sheet"}
FOLDERS = sorted(p.name for p in PACKAGE.iterdir() if p.is_dir() and any(p.glob("*.py")))


def table():
    """Package to the packages it may import, from the table in DEVELOPERS.md."""
    rows = re.findall(r"^\| `(\w+)/` \|[^|]*\|([^|]*)\|$", (ROOT / "DEVELOPERS.md").read_text("utf-8"), re.MULTILINE)
    return {name: set(re.findall(r"\w+", allowed)) - {"nothing", "of", "ours"} for name, allowed in rows}


def parsed(folder):
    return {path: ast.parse(path.read_text("utf-8")) for path in sorted((PACKAGE / folder).rglob("*.py"))}


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


def test_the_table_names_every_package():
    assert set(FOLDERS) <= set(table())


@pytest.mark.parametrize("folder", FOLDERS)
def test_a_package_imports_what_the_table_allows(folder):
    allowed = table()[folder] | {folder} | (LEAVES if folder in USES_LEAVES else set())
    found = {(path.name, name) for path, tree in parsed(folder).items() for name in imported(tree)}
    assert {(module, name) for module, name in found if name not in allowed} == set()


@pytest.mark.parametrize("leaf", sorted(LEAVES))
def test_leaves_import_nothing_of_ours(leaf):
    assert list(imported(ast.parse((PACKAGE / f"{leaf}.py").read_text("utf-8")))) == []


@pytest.mark.parametrize("folder", FOLDERS)
def test_only_the_command_line_prints(folder):
    printing = [
        path.name
        for path, tree in parsed(folder).items()
        for node in ast.walk(tree)
        if (isinstance(node, ast.Name) and node.id == "print")
        or (isinstance(node, ast.Import) and any(a.name in ("click", "logging") for a in node.names))
        or (isinstance(node, ast.ImportFrom) and node.module == "click")
    ]
    assert printing == []


@pytest.mark.parametrize("folder", [f for f in FOLDERS if f != "files"])
def test_only_files_opens_files(folder):
    opening = {"open", "read_text", "write_text", "read_bytes", "write_bytes"}
    opened = [
        f"{path.name}:{node.lineno}"
        for path, tree in parsed(folder).items()
        for node in ast.walk(tree)
        if isinstance(node, ast.Call)
        and (getattr(node.func, "id", None) == "open" or getattr(node.func, "attr", None) in opening)
    ]
    assert opened == []


@pytest.mark.parametrize("folder", ["model", "network", "relay", "study", "text"])
def test_calculation_knows_no_clock(folder):
    clocks = {"time", "datetime", "random"}
    used = [
        path.name
        for path, tree in parsed(folder).items()
        for node in ast.walk(tree)
        if (isinstance(node, ast.Import) and clocks & {a.name.split(".")[0] for a in node.names})
        or (isinstance(node, ast.ImportFrom) and node.module is not None and node.module.split(".")[0] in clocks)
    ]
    assert used == []
