"""The sheet's wording and order from the templates folder: sandboxed, strict, escaping what is put into them."""

import tomllib
from collections.abc import Iterable
from pathlib import Path

from jinja2 import FileSystemLoader, StrictUndefined, Template, TemplateError
from jinja2.sandbox import SandboxedEnvironment
from markupsafe import Markup

from relaycfg.errors import InputError, Problem
from relaycfg.sheet import figures, fonts


class Wording:
    """Texts by name, such as ``decision.scope``: the file, then the keys in it."""

    def __init__(self, folder: Path) -> None:
        """Read every ``.toml`` of ``folder``; InputError where a file is not TOML."""
        self._folder = folder
        self._loader = FileSystemLoader(str(folder))
        self._env = SandboxedEnvironment(loader=self._loader, undefined=StrictUndefined, autoescape=True)
        self._env.filters |= {
            "volts": figures.volts,
            "seconds": figures.seconds,
            "percent": figures.percent,
            "ratio": figures.ratio,
            "plain": figures.plain,
            "share": figures.share,
        }
        self._compiled: dict[str, Template] = {}
        self._texts = {name.removesuffix(".toml"): self._read(name) for name in self._files()}

    def _files(self) -> Iterable[str]:
        return (name for name in self._loader.list_templates() if name.endswith(".toml") and "/" not in name)

    def _read(self, name: str) -> dict[str, object]:
        source = self._loader.get_source(self._env, name)[0]
        try:
            return tomllib.loads(source)
        except tomllib.TOMLDecodeError as error:
            raise self._problem(name.removesuffix(".toml"), str(error), "TOML") from error

    def _problem(self, key: str, given: str, allowed: str) -> InputError:
        file = str(self._folder / f"{key.partition('.')[0]}.toml")
        remedy = "correct the template or use the one shipped with the program"
        return InputError([Problem(file, None, None, key, given, allowed, remedy)])

    def _at(self, key: str) -> object:
        value: object = self._texts
        for part in key.split("."):
            if not isinstance(value, dict) or part not in value:
                raise self._problem(key, "nothing", "a text of this name")
            value = value[part]
        return value

    def _render(self, key: str, source: str, context: dict[str, object]) -> Markup:
        try:
            if "{" in source and source not in self._compiled:
                self._compiled[source] = self._env.from_string(source)
            text = self._compiled[source].render(context) if "{" in source else source
        except TemplateError as error:
            raise self._problem(key, str(error), "a text with the names the sheet hands to it") from error
        if not text.isascii() and (absent := fonts.missing(text)):
            raise InputError([fonts.problem(key, text, c) for c in absent])
        return Markup(text)

    def text(self, key: str, **context: object) -> Markup:
        """One text, ready as paragraph markup: the template's own markup counts, everything put in is escaped."""
        source = self._at(key)
        if not isinstance(source, str):
            raise self._problem(key, repr(source)[:60], "a text")
        return self._render(key, source, context)

    def lines(self, key: str, **context: object) -> list[Markup]:
        """A list of texts, in order."""
        sources = self._at(key)
        if not isinstance(sources, list):
            raise self._problem(key, repr(sources)[:60], "a list of texts")
        return [self._render(key, str(source), context).strip() for source in sources]

    def pairs(self, key: str) -> list[tuple[Markup, Markup]]:
        """A table of texts as (name, text), in the order of the file."""
        table = self._at(key)
        if not isinstance(table, dict):
            raise self._problem(key, repr(table)[:60], "a table of texts")
        return [(Markup(name), Markup(text)) for name, text in table.items()]
