"""Mutation operators: a choice of cosmic-ray's own, and those of a program of phasors."""

from abc import abstractmethod
from collections.abc import Iterator
from typing import Any, ClassVar

import cosmic_ray.plugins
from cosmic_ray.operators.operator import Operator
from parso.python.tree import Name, Number

GENERAL = (
    *(f"ReplaceBinaryOperator_{pair}" for pair in ("Add_Sub", "Sub_Add", "Mul_Div", "Div_Mul", "Pow_Mul", "Mod_Add")),
    *(f"ReplaceBinaryOperator_{pair}" for pair in ("FloorDiv_Mul", "BitAnd_BitOr", "BitOr_BitAnd")),
    *(f"ReplaceComparisonOperator_{pair}" for pair in ("Lt_LtE", "LtE_Lt", "Gt_GtE", "GtE_Gt", "Lt_Gt", "Gt_Lt")),
    *(f"ReplaceComparisonOperator_{pair}" for pair in ("LtE_GtE", "GtE_LtE", "Eq_NotEq", "NotEq_Eq", "Is_IsNot")),
    *(f"ReplaceUnaryOperator_{pair}" for pair in ("USub_UAdd", "Delete_Not", "Delete_Invert")),
    *(f"Replace{pair}" for pair in ("TrueWithFalse", "FalseWithTrue", "AndWithOr", "OrWithAnd", "BreakWithContinue")),
    *("ReplaceContinueWithBreak", "ReplaceComparisonOperator_IsNot_Is"),
    *("AddNot", "NumberReplacer", "ZeroIterationForLoop"),
)
"""Names in cosmic-ray's core."""

PAIRS = (
    "min max, minimum maximum, any all, real imag, re im, low_v high_v, sin cos, argmin argmax, vstack hstack, "
    "zeros ones, zeros_like ones_like, RUNNING STARTING, neutral pe, first last, start end, pickup dropout, "
    "lengths blocked, mean sum"
)
"""Names that are easily taken for each other."""
TWINS = {a: b for pair in PAIRS.split(", ") for a, b in (pair.split(), pair.split()[::-1])}


class Rewrite(Operator):
    """Replaces a node by other text; a subclass gives the texts."""

    @abstractmethod
    def texts(self, node: Any) -> list[str]:
        """Texts that may stand in the node's place."""

    def mutation_positions(self, node: Any) -> Iterator[tuple[Any, Any]]:
        """One position a text."""
        for _ in self.texts(node):
            yield node.start_pos, node.end_pos

    def mutate(self, node: Any, index: int) -> Any:
        """The text as a leaf, behind whatever space the node had."""
        return Name(node.get_first_leaf().prefix + self.texts(node)[index], node.start_pos)

    @classmethod
    def examples(cls) -> tuple[()]:
        """None; the run itself shows them."""
        return ()


class TwinName(Rewrite):
    """A function, attribute or variable by its counterpart: min and max, real and imag, any and all."""

    def texts(self, node: Any) -> list[str]:
        """The twin of a name that is not being defined."""
        defined = node.type == "name" and (node.is_definition() or node.parent.type in ("param", "import_as_names"))
        return [TWINS[node.value]] if node.type == "name" and node.value in TWINS and not defined else []


class DropCall(Rewrite):
    """Without abs, conj, conjugate or the transpose."""

    def texts(self, node: Any) -> list[str]:
        """The bare argument of abs, the bare operand of conj and T."""
        if node.type not in ("power", "atom_expr"):
            return []
        code, parts = node.get_code(include_prefix=False), [c.get_code() for c in node.children]
        texts = [code.replace(ending, "", 1) for ending in (".conj()", ".conjugate()", ".T") if ending in code]
        if parts[-1].startswith("(") and parts[:-1] in (["np", ".abs"], ["abs"]):
            texts.append(parts[-1])
        return texts


class SwapArguments(Rewrite):
    """The last two arguments of a call the other way round, such as np.where's two answers."""

    EITHER_WAY = ("maximum", "minimum", "hypot", "min", "max")

    def texts(self, node: Any) -> list[str]:
        """The call with its last two positional arguments exchanged."""
        if node.type not in ("power", "atom_expr") or node.children[-1].type != "trailer":
            return []
        inside = node.children[-1].children[1:-1]
        if not inside or inside[0].type != "arglist" or node.children[-1].children[0].value != "(":
            return []
        given = [c.get_code(include_prefix=False) for c in inside[0].children if c.type != "operator"]
        if len(given) < 2 or any(c.type == "argument" for c in inside[0].children):
            return []
        head = "".join(c.get_code() for c in node.children[:-1]).strip()
        if head.rsplit(".", 1)[-1] in self.EITHER_WAY:
            return []
        return [f"{head}({', '.join([*given[:-2], given[-1], given[-2]])})"]


class SwapAnswers(Rewrite):
    """Either answer of a conditional expression whatever the condition."""

    def texts(self, node: Any) -> list[str]:
        """First answer, second answer."""
        if node.type != "ternary":
            return []
        return [f"({node.children[k].get_code(include_prefix=False)})" for k in (0, 4)]


class Scale(Rewrite):
    """A number by its double, or its half."""

    def texts(self, node: Any) -> list[str]:
        """Only where that is another number of the same kind."""
        if not isinstance(node, Number) or node.value in ("0", "0.0", "0j"):
            return []
        value = float(node.value) if "j" not in node.value else None
        if value is None:
            return [f"(-{node.value})"]
        return [repr(2 * value), repr(value / 2)] if "." in node.value or "e" in node.value else []


class Augmented(Rewrite):
    """+= by -=, *= by /=, and either by a plain assignment."""

    OTHERS: ClassVar = {"+=": ("-=", "="), "-=": ("+=", "="), "*=": ("/=", "="), "|=": ("&=", "=")}

    def texts(self, node: Any) -> list[str]:
        """Other operators of assignment."""
        return list(self.OTHERS.get(node.value, ())) if node.type == "operator" else []


class DropStatement(Rewrite):
    """An assignment into something, or a bare call, left out."""

    def texts(self, node: Any) -> list[str]:
        """``pass`` in its place."""
        if node.type == "expr_stmt":
            target, operator = node.children[0], node.children[1]
            inside = target.type in ("power", "atom_expr")
            augmented = operator.type == "operator" and operator.value in Augmented.OTHERS
            return ["pass"] if inside or augmented else []
        bare = node.type in ("power", "atom_expr") and node.parent.type == "simple_stmt"
        return ["pass"] if bare else []


class ReturnZero(Rewrite):
    """A function that returns nothing but zero."""

    def texts(self, node: Any) -> list[str]:
        """``return 0`` for any other."""
        return ["return 0"] if node.type == "return_stmt" and node.children[1].get_code().strip() != "0" else []


OWN = (TwinName, DropCall, SwapArguments, SwapAnswers, Scale, Augmented, DropStatement, ReturnZero)


def all_operators() -> dict[str, Operator]:
    """Every operator by its name."""
    found: dict[str, Operator] = {}
    for name in GENERAL:
        found[name] = cosmic_ray.plugins.get_operator(f"core/{name}")()
    return found | {kind.__name__: kind() for kind in OWN}
