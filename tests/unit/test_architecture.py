"""Who may import whom, read from the source; and what a start of the program loads.

The lower rooms see arrays and frozen dataclasses only: they can be used, tested and replaced
alone. A start that loads nothing heavy is what makes `crowdsim --help` answer at once.
"""

from __future__ import annotations

import ast
from collections.abc import Callable, Iterator
from pathlib import Path

import pytest

import crowdsim

ROOT = Path(crowdsim.__file__).parent
MODULES = {
    ".".join(("crowdsim", *path.relative_to(ROOT).with_suffix("").parts)).removesuffix(".__init__"): path
    for path in sorted(ROOT.rglob("*.py"))
}
LOWER = ("bridge", "crowd", "loads", "dynamics", "response", "guides")
HIGHER = ("scenario", "study", "results", "plots", "console", "cli")
OUTSIDE = ("h5py", "pydantic", "typer", "rich", "pint", "matplotlib")


def imported(path: Path) -> Iterator[tuple[str, bool]]:
    """Every module that a file imports, with whether at module level (type checking left out)."""
    tree = ast.parse(path.read_text(encoding="utf-8"))

    def names(node: ast.AST) -> list[str]:
        if isinstance(node, ast.Import):
            return [alias.name for alias in node.names]
        if isinstance(node, ast.ImportFrom):
            assert node.level == 0, f"{path}: relative import"
            assert node.module is not None
            return [node.module, *(f"{node.module}.{alias.name}" for alias in node.names)]
        return []

    def only_for_types(node: ast.AST) -> bool:
        return isinstance(node, ast.If) and isinstance(node.test, ast.Name) and node.test.id == "TYPE_CHECKING"

    def walk(node: ast.AST, top: bool) -> Iterator[tuple[str, bool]]:
        for child in ast.iter_child_nodes(node):
            if only_for_types(child):
                continue
            yield from ((name, top) for name in names(child))
            yield from walk(child, top and not isinstance(child, ast.FunctionDef | ast.AsyncFunctionDef | ast.Lambda))

    yield from walk(tree, True)


def room(module: str) -> str:
    return module.split(".")[1] if "." in module else ""


def test_the_package_was_found() -> None:
    assert {room(m) for m in MODULES} >= {*LOWER, "scenario", "study", "results", "cli", "errors"}


@pytest.mark.parametrize("module", [m for m in MODULES if room(m) in LOWER])
def test_a_lower_room_never_sees_a_scenario_a_file_or_the_console(module: str) -> None:
    seen = {name for name, _ in imported(MODULES[module])}
    forbidden = {f"crowdsim.{r}" for r in HIGHER} | set(OUTSIDE)
    assert not [s for s in seen for f in forbidden if s == f or s.startswith(f + ".")]


@pytest.mark.parametrize(
    ("rooms", "forbidden"),
    [
        (("bridge",), ("crowd", "loads", "dynamics", "response", "guides")),
        (("crowd",), ("bridge", "loads", "dynamics", "response", "guides")),
        (("loads",), ("bridge", "crowd", "dynamics", "response", "guides")),
        (("dynamics",), ("bridge", "crowd", "loads", "response", "guides")),
        (("response",), ("bridge", "crowd", "loads", "dynamics", "guides")),
        (("guides",), ("bridge", "crowd", "loads", "dynamics", "response")),
        (("scenario",), ("study", "results", "plots", "console", "cli")),
        (("results",), ("scenario", "study", "plots", "console", "cli", "bridge", "crowd", "loads", "dynamics")),
        (("study",), ("plots", "console", "cli")),
        (("plots",), ("console", "cli")),
        (("console",), ("plots", "cli")),
        (("errors",), (*LOWER, *HIGHER)),
    ],
)
def test_imports_point_down_the_path(rooms: tuple[str, ...], forbidden: tuple[str, ...]) -> None:
    for module, path in MODULES.items():
        if room(module) in rooms:
            seen = {room(name) for name, _ in imported(path) if name.startswith("crowdsim.")}
            assert not seen & set(forbidden), module


@pytest.mark.parametrize(
    ("room_of", "shared"),
    [
        ("guides", {"criterion", "catalogue"}),
        ("plots", {"style", "labels", "strip", "save", "draw"}),
        ("console", {"base", "formulas", "verdicts", "screening", "summary", "fits"}),
    ],
)
def test_no_import_sideways(room_of: str, shared: set[str]) -> None:
    """A guide, a figure, a screen stands alone but for what its room shares."""
    for module, path in MODULES.items():
        if room(module) == room_of and module.split(".")[-1] not in ("catalogue", "draw", room_of):
            seen = {name.split(".")[2] for name, _ in imported(path) if name.startswith(f"crowdsim.{room_of}.")}
            assert seen <= shared, module


def test_numba_stands_in_the_kernels_alone() -> None:
    users = {m for m, path in MODULES.items() for name, _ in imported(path) if name.split(".")[0] == "numba"}
    top = {m for m, path in MODULES.items() for name, at in imported(path) if at and name.split(".")[0] == "numba"}
    assert top == {"crowdsim.dynamics.kernels"}
    assert users <= {"crowdsim.dynamics.kernels", "crowdsim.results.writer"}  # the writer stores its version


@pytest.mark.parametrize("module", ["crowdsim", "crowdsim.cli", "crowdsim.errors"])
def test_a_start_loads_nothing_heavy(python: Callable[..., str], module: str) -> None:
    loaded = set(python(f"import sys, {module}; print(*sys.modules)").split())
    assert module in loaded
    heavy = {"numpy", "scipy", "numba", "h5py", "matplotlib", "pydantic", "pint"}
    assert not loaded & heavy


UNITS = """
import sys
from crowdsim.scenario.reader import parse_scenario
parse_scenario({text!r})
print("pint" in sys.modules, "numba" in sys.modules, "h5py" in sys.modules, "matplotlib" in sys.modules)
"""


def test_pint_is_loaded_for_an_unusual_unit_only(python: Callable[..., str], clean: str) -> None:
    assert python(UNITS.format(text=clean)).split() == ["False"] * 4
    usual = clean.replace("length = 48.0", 'length = "48 m"')
    assert python(UNITS.format(text=usual)).split() == ["False"] * 4
    with_units = clean.replace("length = 48.0", 'length = "157.5 ft"')
    assert python(UNITS.format(text=with_units)).split() == ["True", "False", "False", "False"]


def test_every_module_says_what_it_is_for() -> None:
    for module, path in MODULES.items():
        assert ast.get_docstring(ast.parse(path.read_text(encoding="utf-8"))), module
