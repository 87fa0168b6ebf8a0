"""Random sites against ngspice: constant impedance on the complex network, banded laws on coupled real parts.

Motors and ZIP loads outside their band are compared too, in the doubled network. Where ngspice is not installed a row
says so.
"""

import shutil
import subprocess
from collections.abc import Iterator, Sequence
from pathlib import Path
from tempfile import TemporaryDirectory

from relaycfg.model.site import Site
from relaycfg.network import LoadStates, Network
from tests.reference.engines_drawing import Drawing
from tests.reference.engines_sites import (
    EARTHINGS,
    LAWS,
    cases,
    emf_of,
    heavy_site,
    kind_of,
    random_site,
    states_of,
    with_motors,
)
from tests.reference.engines_tally import LIMIT_V, Answer, Tally
from tests.reference.ngspice_netlist import complex_netlist, doubled_netlist, part
from tests.reference.table import Row

PROGRAM = shutil.which("ngspice")
MISSING = "ngspice is not installed (Debian package ngspice)"
FEW, MANY = 12, 72
FEW_HEAVY, MANY_HEAVY = 4, 20
OPTIONS = ".options reltol=1e-8 vntol=1e-7 abstol=1e-8 itl1=2000 gmin=1e-15"
"""Far below LIMIT_V of some 230 V. Tighter ones are rounding where only the leak holds the site to earth."""
LONGEST_S = 60


Case = tuple[Drawing, str, float | None]
"""A drawn state, the break's place and its joint [ohm]."""


def volts_of(cases: Sequence[Case], doubled: bool) -> list[dict[str, complex] | None]:
    """Potential of every node against earth in every case, all in one run; None where there is no operating point."""
    assert PROGRAM is not None, MISSING
    with TemporaryDirectory() as name:
        folder, script = Path(name), [".control", "set filetype=ascii"]
        for number, (drawing, place, joint_ohm) in enumerate(cases):
            hertz = drawing.site.supply.frequency_hz
            elements = (doubled_netlist if doubled else complex_netlist)(drawing, drawing.broken(place, joint_ohm))
            text = "\n".join([f"case {number}", OPTIONS, *elements, ".end", ""])
            (folder / f"{number}.cir").write_text(text, encoding="utf-8")
            run = "op" if doubled else f"ac lin 1 {hertz} {hertz}"
            script += [f"source {number}.cir", run, f"write {number}.raw all", "destroy all", "remcirc"]
        text = "\n".join(["all cases", *script, "quit", ".endc", ".end", ""])
        (folder / "all.cir").write_text(text, encoding="utf-8")
        command = [PROGRAM, "-n", "-b", "all.cir"]
        subprocess.run(command, cwd=folder, capture_output=True, timeout=LONGEST_S, check=False)
        return [node_volts(folder / f"{number}.raw", case[0], doubled) for number, case in enumerate(cases)]


def node_volts(raw: Path, drawing: Drawing, doubled: bool) -> dict[str, complex] | None:
    """Potential of every node of the drawing from a raw file; None where that has no solution."""
    found = read_raw(raw.read_text(encoding="utf-8")) if raw.exists() else {}
    if not found:
        return None
    found["0"] = 0j
    names = {node: [part(node, which) for which in ("ri" if doubled else ("",))] for node in drawing.nodes}
    phasors = {node: [found[own] for own in names] for node, names in names.items()}
    return {node: parts[0] + 1j * parts[1] if doubled else parts[0] for node, parts in phasors.items()}


def read_raw(text: str) -> dict[str, complex]:
    """Node potentials of an ASCII raw file with one point; empty unless it holds the asked analysis."""
    head, _, body = text.partition("\nValues:\n")
    if "Plotname: AC Analysis" not in head and "Plotname: Operating Point" not in head:
        return {}
    names = [line.split()[1] for line in head.partition("\nVariables:\n")[2].splitlines()]
    values = body.split()[1:]
    phasors = (complex(*map(float, value.split(","))) for value in values)
    return {name[2:-1]: phasor for name, phasor in zip(names, phasors, strict=True) if name.startswith("v(")}


def compare(seed: int) -> Tally:
    """One network in all cases and two load states; with motors where its loads are not constant impedances."""
    law = kind_of(seed)[1]
    made = random_site(seed) if law == "impedance" else with_motors(random_site(seed), seed)
    return compare_site(made, seed, f"network {seed} {kind_of(seed)}", law != "impedance")


def compare_heavy(seed: int) -> Tally:
    """One network that lives on constant power alone."""
    return compare_site(heavy_site(seed), seed, f"heavy network {seed}", True, look=True)


def compare_site(made: Site, seed: int, name: str, doubled: bool, look: bool = False) -> Tally:
    """A site in all cases and two load states, its first motor starting in a third where it has any."""
    tally, network, states, emf = Tally(networks=1), Network(made), states_of(made, seed), emf_of(made)
    if made.motors:
        starting = states.motors[:, [0, 1, 0]].copy()
        starting[0, 2] = 2
        states = LoadStates(states.loads[:, [0, 1, 0]], starting, (*states.names, "starting"))
    drawings = [Drawing(made, emf, states.loads[:, k], states.motors[:, k]) for k in range(states.count)]
    breaks = cases(made)
    found = iter(volts_of([(drawing, *case) for case in breaks for drawing in drawings], doubled))
    for place, joint_ohm in breaks:
        solved = network.solve(place, states, emf, joint_ohm, look_for_roots=look)
        for state, drawing in enumerate(drawings):
            Answer(drawing, network, solved, states, state, place, joint_ohm).enter(tally, next(found), name)
    return tally


def rows(quick: bool = False) -> Iterator[Row]:
    """MANY networks (FEW if quick), a row for each earthing and load law, and those on constant power alone."""
    if PROGRAM is None:
        yield Row("ngspice: NOT COMPARED", MISSING, 0.0, LIMIT_V, "V", "skipped: " + MISSING)
        return
    for earthing, law in ((e, law) for law in dict.fromkeys(LAWS) for e in EARTHINGS):
        tally = Tally()
        for seed in range(FEW if quick else MANY):
            if kind_of(seed) == (earthing, law):
                tally.add(compare(seed))
        worst = float("inf") if tally.unanswered else tally.worst
        yield Row(f"ngspice, {earthing}, {law}", "ngspice", worst, LIMIT_V, "V", tally.note)
    tally = Tally()
    for seed in range(FEW_HEAVY if quick else MANY_HEAVY):
        tally.add(compare_heavy(seed))
    yield Row("ngspice, constant power alone", "ngspice", tally.worst, LIMIT_V, "V", tally.note)
