"""The folders show the way of the data, and nothing crosses it; sizes, names and docstrings."""

from __future__ import annotations

import ast
import importlib
import inspect
import re
import sys
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path

import click
import pytest
from numpydoc.validate import validate

import etl
from etl.cli import main

PACKAGE = Path(etl.__file__).parent
MODULES = sorted(PACKAGE.rglob("*.py"))

#: What each room may use of the others. All may use the errors and the declared tables; files are
#: read in the rooms that read; only the session knows all rooms, and only the command the session.
MAY_USE = {
    "errors": set(),
    "lazily": set(),
    "coding": set(),
    "tables": {"errors", "coding"},
    "cells": set(),
    "measures": {"errors"},
    "files": {"errors", "tables"},
    "study": {"errors", "tables", "coding", "variants"},
    "pseudonyms": {"files"},
    "parsers": {"errors", "tables", "files", "pseudonyms"},
    "trials": {"errors", "tables", "files", "pseudonyms"},
    "regions": {"errors", "lazily", "tables", "files"},
    # A draft is checked by reading the first log as a build would.
    "drafting": {"errors", "tables", "files", "parsers", "study"},
    "screening": {"errors"},
    "lines": {"errors"},
    "readiness": {"errors", "coding"},
    "variants": {"errors", "readiness"},
    # The ledger and the accounts are handed over as plain rows.
    "export": {"errors", "tables", "cells", "screening", "readiness", "variants"},
    "report": {"errors", "lazily", "tables", "readiness", "variants"},
    "handoff": {"errors", "tables", "cells", "coding", "readiness"},
    "session": {
        *("errors", "tables", "files", "study", "parsers", "trials", "regions", "measures"),
        *("pseudonyms", "cells", "coding", "screening", "lines", "export", "report", "readiness"),
        *("handoff", "lazily", "variants"),
    },
    "start": {"cli"},
    "cli": {"etl", "session"},
    "etl": {"drafting", "errors", "lazily", "session", "study"},
}
#: Rooms that are handed parts of the study file: they may name its models, for type checkers only.
MAY_NAME_THE_STUDY = {"parsers", "trials", "regions"}
#: Where a library may be used. Those not listed may be used nowhere.
USED_IN = {
    "numpy": {
        *("files", "parsers", "trials", "regions", "measures", "screening", "export", "report"),
        *("session", "drafting", "lines", "pseudonyms", "coding", "readiness", "study"),
        "variants",
    },
    "pyarrow": {"files", "parsers", "export", "report", "session", "tables", "cells", "drafting"},
    "openpyxl": {"files"},
    "scipy": {"report", "readiness"},
    "jinja2": {"report", "handoff"},
    "markupsafe": {"report"},
    "pandas": {"session"},
    "distributed": {"session"},
    "shapely": {"regions"},
    "pydantic": {"study"},
    "pydantic_core": {"study"},
    "click": {"cli"},
    "rich": {"cli"},
}
MOST_LINES = 400


@dataclass(frozen=True)
class Import:
    """One import: the module that does it, what it imports, and whether only type checkers see."""

    by: Path
    name: str
    for_types_only: bool

    @property
    def room(self) -> str:
        """The room of the importing module."""
        first = self.by.relative_to(PACKAGE).parts[0].removesuffix(".py")
        return "etl" if first == "__init__" else first

    def __str__(self) -> str:
        return f"{self.by.relative_to(PACKAGE.parent).as_posix()} imports {self.name}"


def imports_of(path: Path) -> Iterator[Import]:
    """Every import of a module, also those within functions."""

    def within(node: ast.AST, *, typed: bool) -> Iterator[Import]:
        for child in ast.iter_child_nodes(node):
            names: list[str] = []
            if isinstance(child, ast.Import):
                names = [alias.name for alias in child.names]
            elif isinstance(child, ast.ImportFrom):
                assert child.level == 0, f"a relative import in {path}"
                names = [child.module or ""]
                if names == ["etl"]:
                    names = [f"etl.{alias.name}" for alias in child.names]
            yield from (Import(path, name, typed) for name in names)
            guarded = isinstance(child, ast.If) and "TYPE_CHECKING" in ast.unparse(child.test)
            yield from within(child, typed=typed or guarded)

    yield from within(ast.parse(path.read_text(encoding="utf-8")), typed=False)


IMPORTS = [found for path in MODULES for found in imports_of(path)]


def room_imported(found: Import) -> str:
    """The room that an import of this package reaches into."""
    return found.name.split(".")[1] if "." in found.name else "etl"


def test_every_room_is_known() -> None:
    """A new room must be given its place in the table above."""
    rooms = {path.relative_to(PACKAGE).parts[0].removesuffix(".py") for path in MODULES}
    assert rooms - {"__init__", "__pycache__"} == MAY_USE.keys() - {"etl"}


def test_rooms_use_only_what_they_may() -> None:
    """No room reaches into another that it is not to know."""
    crossing = []
    for found in IMPORTS:
        if found.name.split(".")[0] != "etl":
            continue
        room, other = found.room, room_imported(found)
        if other == room or other in MAY_USE[room]:
            continue
        if other == "study" and room in MAY_NAME_THE_STUDY and found.for_types_only:
            continue
        crossing.append(str(found))
    assert crossing == []


def test_libraries_are_used_only_where_they_belong() -> None:
    """Kernels know numpy alone; only the command knows the terminal; only regions know shapely."""
    standard = {*sys.stdlib_module_names, "etl"}
    strays = [
        str(found)
        for found in IMPORTS
        if (library := found.name.split(".")[0]) not in standard
        and found.room not in USED_IN.get(library, set())
    ]
    assert strays == []


def test_kernels_know_no_files_clocks_or_settings() -> None:
    """The measures compute from arrays: no path, clock, environment or random numbers."""
    kept_out = {"pathlib", "os", "io", "time", "datetime", "random", "logging", "sys", "json"}
    strays = [
        str(found)
        for found in IMPORTS
        if found.room == "measures" and found.name.split(".")[0] in kept_out
    ]
    assert strays == []


def test_only_the_command_prints_and_exits() -> None:
    """Nothing but the command writes to the terminal or ends the process."""
    speaking = {"print", "input", "exit", "quit", "sys.exit", "os._exit"}
    speaking |= {"sys.stdout.write", "sys.stderr.write"}
    strays = []
    for path in MODULES:
        if path in (PACKAGE / "cli.py", PACKAGE / "start.py"):
            continue
        strays += [
            f"{path.name}:{node.lineno}: {ast.unparse(node.func)}"
            for node in ast.walk(ast.parse(path.read_text(encoding="utf-8")))
            if isinstance(node, ast.Call) and ast.unparse(node.func) in speaking
        ]
    assert strays == []


@pytest.mark.parametrize("path", MODULES, ids=lambda path: path.relative_to(PACKAGE).as_posix())
def test_module_is_not_too_long(path: Path) -> None:
    """A module of more than 400 lines has two jobs."""
    assert len(path.read_text(encoding="utf-8").splitlines()) <= MOST_LINES


def test_modules_are_named_after_what_they_do() -> None:
    """No module bears a name that says nothing, or that of a standard module."""
    names = {path.stem for path in MODULES}
    says_nothing = {"util", "utils", "helper", "helpers", "misc", "common", "tools", "base", "core"}
    assert names & says_nothing == set()
    assert names & set(sys.stdlib_module_names) == set()


def test_top_level_holds_what_the_design_names() -> None:
    """Nothing else lies beside the package, but for hidden files and what tools leave behind."""
    named = {
        *("README.md", "DEVELOPERS.md", "pyproject.toml", "LICENSE", "requirements.lock"),
        *("etl", "tests", "region_definitions", "sample_logs"),
    }
    left_behind = {"build", "dist", "out", "venv", "__pycache__"}
    there = {path.name for path in PACKAGE.parent.iterdir() if not path.name.startswith(".")}
    assert {n for n in there - named - left_behind if not n.endswith(".egg-info")} == set()


def defined_in(path: Path) -> Iterator[tuple[str, ast.AST]]:
    """The public functions, classes and methods of a module, with their names."""

    def within(node: ast.AST, prefix: str) -> Iterator[tuple[str, ast.AST]]:
        for child in ast.iter_child_nodes(node):
            if isinstance(child, ast.FunctionDef | ast.ClassDef) and child.name[0] != "_":
                yield prefix + child.name, child
                if isinstance(child, ast.ClassDef):
                    yield from within(child, f"{prefix}{child.name}.")

    yield from within(ast.parse(path.read_text(encoding="utf-8")), "")


def is_stub(node: ast.AST) -> bool:
    """Whether a method only states a type, in a protocol: its class says what it is."""
    body = getattr(node, "body", [])
    return len(body) == 1 and ast.unparse(body[0]) == "..."


@pytest.mark.parametrize("path", MODULES, ids=lambda path: path.relative_to(PACKAGE).as_posix())
def test_everything_public_has_a_docstring(path: Path) -> None:
    """Modules, and public classes, functions and methods say what they are for."""
    assert ast.get_docstring(ast.parse(path.read_text(encoding="utf-8")))
    silent = [
        name for name, node in defined_in(path) if not ast.get_docstring(node) and not is_stub(node)
    ]
    assert silent == []


def documented() -> list[str]:
    """Full names of all public functions, classes and methods of the package."""
    names = []
    for path in MODULES:
        parts = path.relative_to(PACKAGE.parent).with_suffix("").parts
        module = ".".join(parts).removesuffix(".__init__")
        if module != "etl.cli":
            names += [f"{module}.{name}" for name, _ in defined_in(path)]
    return names


def exported() -> list[str]:
    """Full names of the functions that the package and its rooms offer to others."""
    names = set()
    for room in MAY_USE.keys() - {"cli", "start"}:
        module = importlib.import_module("etl" if room == "etl" else f"etl.{room}")
        for name in getattr(module, "__all__", ()):
            offered = getattr(module, name)
            if inspect.isfunction(offered):
                names.add(f"{offered.__module__}.{offered.__qualname__}")
    return sorted(names)


def complaints(name: str, codes: set[str]) -> list[str]:
    """What numpydoc has to say about a docstring, of some kinds."""
    return [message for code, message in validate(name)["errors"] if code in codes]


@pytest.mark.parametrize("name", exported())
def test_offered_function_documents_all_its_parameters(name: str) -> None:
    """Functions that rooms offer list every parameter with a type and what they give back."""
    codes = {"SS01", "PR01", "PR02", "PR03", "PR04", "PR07", "PR10", "RT01", "RT03", "YD01"}
    assert complaints(name, codes) == []


def test_listed_parameters_are_the_real_ones() -> None:
    """Wherever parameters are listed, they are those of the signature, all and in its order."""
    wrong = {}
    for name in documented():
        validated = validate(name)
        if "Parameters\n" not in (validated["docstring"] or ""):
            continue
        found = [m for code, m in validated["errors"] if code in {"PR01", "PR02", "PR03", "PR10"}]
        if found:
            wrong[name] = found
    assert wrong == {}


def test_listed_attributes_are_the_real_ones() -> None:
    """Where a class lists attributes, they are its public fields, all of them."""
    wrong = {}
    for path in MODULES:
        for name, node in defined_in(path):
            text = ast.get_docstring(node) or ""
            if not isinstance(node, ast.ClassDef) or "Attributes\n------" not in text:
                continue
            section = text.partition("Attributes\n----------\n")[2].partition("\n\n")[0]
            heads = re.findall(r"^(\w[\w, ]*?) :", section, re.MULTILINE)
            listed = [part for head in heads for part in head.split(", ")]
            fields = [
                statement.target.id
                for statement in node.body
                if isinstance(statement, ast.AnnAssign)
                and isinstance(statement.target, ast.Name)
                and statement.target.id[0] != "_"
            ]
            if fields and sorted(listed) != sorted(fields):
                wrong[name] = listed, fields
    assert wrong == {}


@pytest.mark.parametrize("name", sorted(main.commands))
def test_command_and_its_options_have_help(name: str) -> None:
    """Each command says what it does, and so does each of its options."""
    command = main.commands[name]
    assert command.help
    silent = [
        option.opts
        for option in command.params
        if isinstance(option, click.Option) and not option.help
    ]
    assert silent == []
