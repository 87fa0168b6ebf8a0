"""Which mutants are tried: every place of a module before any place twice, and the survivors of an earlier run."""

import ast
import json
import random
import re
from collections import defaultdict
from dataclasses import dataclass
from pathlib import Path

from cosmic_ray.ast import ast_nodes, get_ast
from cosmic_ray.mutating import mutate_code

from tests.mutants.operators import all_operators

TOP = Path(__file__).parents[2]


@dataclass(frozen=True)
class Mutant:
    """One changed module."""

    module: str
    operator: str
    line: int
    code: str


def spared(source: str) -> list[tuple[tuple[int, int], tuple[int, int]]]:
    """Spans (line, column) that no formula stands in: annotations, imports, decorators, raised sentences."""
    spans: list[ast.AST] = []
    for node in ast.walk(ast.parse(source)):
        if isinstance(node, ast.Import | ast.ImportFrom | ast.Raise | ast.JoinedStr):
            spans.append(node)
        spans += [
            part
            for part in (getattr(node, "annotation", None), getattr(node, "returns", None))
            if isinstance(part, ast.AST)
        ]
        spans += getattr(node, "decorator_list", [])
    return [((s.lineno, s.col_offset), (s.end_lineno or 0, s.end_col_offset or 0)) for s in spans]


def sample(module: str, count: int, seed: int) -> list[Mutant]:
    """Some of a module's mutants, spread over its places first and over the operators at a place second."""
    source = (TOP / module).read_text()
    kept, plain = spared(source), ast.dump(ast.parse(source))
    by_place: dict[tuple[int, int], list[tuple[str, int]]] = defaultdict(list)
    operators = all_operators()
    nodes = list(ast_nodes(get_ast(source)))
    for name, operator in operators.items():
        places = [start for node in nodes for start, _ in operator.mutation_positions(node)]
        for occurrence, start in enumerate(places):
            if not any(first <= start < last for first, last in kept):
                by_place[start].append((name, occurrence))
    rng = random.Random(f"{module} {seed}")
    found: list[Mutant] = []
    seen = {plain}
    places_left = sorted(by_place)
    while places_left and len(found) < count:
        rng.shuffle(places_left)
        for place in list(places_left):
            name, occurrence = by_place[place].pop(rng.randrange(len(by_place[place])))
            if not by_place[place]:
                places_left.remove(place)
            code = mutate_code(source, operators[name], occurrence)
            try:
                shape = ast.dump(ast.parse(code or source))
            except SyntaxError:
                continue
            if shape not in seen and len(found) < count:
                seen.add(shape)
                found.append(Mutant(module, name, place[0], code or ""))
    return found


def again(results: Path) -> list[Mutant]:
    """The survivors of an earlier run, made anew from the modules as they are; not those whose line is gone."""
    found = []
    for result in (json.loads(line) for line in results.read_text().splitlines()):
        removed, added = ("\n".join(x[1:] for x in result["diff"] if x[0] == sign) for sign in "-+")
        source = (TOP / result["module"]).read_text()
        starts = [m.start() for m in re.finditer(f"(?m)^{re.escape(removed)}$", source)]
        if result["outcome"] != "killed" and starts:
            start = min(starts, key=lambda at: abs(source.count("\n", 0, at) + 1 - result["line"]))
            code = source[:start] + added + source[start + len(removed) :]
            found.append(Mutant(result["module"], result["operator"], result["line"], code))
    return found
