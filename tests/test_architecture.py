"""The floors of the house: who may import whom, and that each module stands alone."""

from __future__ import annotations

import ast
import subprocess
import sys
from pathlib import Path

import pytest

import tscale

ROOT = Path(tscale.__file__).parent

# Floor of every room; a module may import its own floor (without cycles) and those below.
FLOORS = {
    "constants": 1,
    "errors": 1,
    "scales": 1,
    "storage": 1,
    "exact": 1,
    "counts": 2,
    "formats": 2,
    "instants": 2,
    "timecodes": 2,
    "tables": 3,
    "ephemeris": 3,
    "earth": 4,
    "trajectory": 4,
    "surface": 4,
    "body_shape": 4,
    "source": 4,
    "transforms": 5,
    "link": 5,
    "step": 6,
    "edges": 6,
    "clocks": 6,
    "routes": 6,
    "chains": 6,
    "compiled": 6,
    "budget": 6,
    "ledger": 6,
    "provenance": 6,
    "scenarios": 6,
    "files": 7,
    "fits": 7,
    "interop": 7,
    "plots": 7,
    "report": 7,
    "serial": 7,
    "cli": 7,
    "cluster": 7,
    "crosscheck": 7,
    "__main__": 7,
}


def modules() -> dict[str, Path]:
    found = {}
    for path in sorted(ROOT.rglob("*.py")):
        parts = path.relative_to(ROOT).with_suffix("").parts
        name = ".".join(parts[:-1] if parts[-1] == "__init__" else parts)
        if name:
            found[name] = path
    return found


def imports_of(name: str, path: Path, known: dict[str, Path]) -> set[str]:
    """Names of our own modules that a module imports at run time (TYPE_CHECKING blocks apart)."""
    tree = ast.parse(path.read_text(encoding="utf-8"))
    for node in ast.walk(tree):
        if isinstance(node, ast.If) and ast.unparse(node.test) == "TYPE_CHECKING":
            node.body = []
    found = set()
    package = name.split(".") if path.name == "__init__.py" else name.split(".")[:-1]
    for node in ast.walk(tree):
        if isinstance(node, ast.ImportFrom):
            if node.level:
                base = package[: len(package) - (node.level - 1)]
            elif node.module and node.module.split(".")[0] == "tscale":
                base = []
            else:
                continue
            module = (node.module or "").removeprefix("tscale").strip(".")
            target = ".".join([*base, *([module] if module else [])])
            for alias in node.names:
                inner = f"{target}.{alias.name}".strip(".")
                found.add(inner if inner in known else target)
        elif isinstance(node, ast.Import):
            found |= {a.name.removeprefix("tscale.") for a in node.names if a.name.startswith("tscale.")}
    return {f for f in found if f and f in known}


def test_every_room_has_a_floor() -> None:
    assert {name.split(".")[0] for name in modules()} <= set(FLOORS)


@pytest.mark.parametrize("name", sorted(modules()))
def test_imports_go_down_only(name: str) -> None:
    known = modules()
    floor = FLOORS[name.split(".")[0]]
    for target in imports_of(name, known[name], known):
        assert FLOORS[target.split(".")[0]] <= floor, f"{name} (floor {floor}) imports {target} from a higher floor"


def test_no_import_cycles() -> None:
    known = modules()
    graph = {name: imports_of(name, path, known) for name, path in known.items()}
    done: set[str] = set()

    def visit(name: str, trail: tuple[str, ...]) -> None:
        assert name not in trail, f"import cycle: {' -> '.join((*trail[trail.index(name) :], name))}"
        if name not in done:
            for target in graph[name]:
                visit(target, (*trail, name))
            done.add(name)

    for name in graph:
        visit(name, ())


def test_astropy_stays_on_the_top_floor() -> None:
    for name, path in modules().items():
        if FLOORS[name.split(".")[0]] < 7:
            assert "astropy" not in outside_packages(path.read_text(encoding="utf-8")), name


def outside_packages(text: str) -> set[str]:
    """Top names of the packages that a module imports, wherever in it and by whatever spelling."""
    found = set()
    for node in ast.walk(ast.parse(text)):
        if isinstance(node, ast.Import):
            found |= {alias.name.split(".")[0] for alias in node.names}
        elif isinstance(node, ast.ImportFrom) and not node.level:
            found.add((node.module or "").split(".")[0])
        elif isinstance(node, ast.Call) and ast.unparse(node.func) in ("__import__", "importlib.import_module"):
            found |= {str(a.value).split(".")[0] for a in node.args if isinstance(a, ast.Constant)}
    return found


@pytest.mark.parametrize(
    "text",
    [
        "import astropy",
        "import astropy as a",
        "import numpy, astropy.time",
        "def f():\n    import astropy.units as u",
        "from astropy import units",
        "from astropy.time import Time",
        "import importlib\nimportlib.import_module('astropy.time')",
    ],
)
def test_every_spelling_of_an_import_is_seen(text: str) -> None:
    assert "astropy" in outside_packages(text)
    assert "astropy" not in outside_packages("from .astropy import to_instants\nimport astropy_iers_data")


@pytest.mark.parametrize("name", sorted(modules()))
def test_modules_stay_short(name: str) -> None:
    assert len(modules()[name].read_text(encoding="utf-8").splitlines()) < 350


def test_each_room_imports_alone() -> None:
    # One interpreter for all: before each import every module of ours is forgotten again. Without cycles, what holds
    # for a room holds for the modules that it brings in.
    rooms = sorted(name for name in modules() if "." not in name)
    script = (
        "import importlib, sys\n"
        f"for name in {rooms!r}:\n"
        "    for loaded in [m for m in sys.modules if m == 'tscale' or m.startswith('tscale.')]:\n"
        "        del sys.modules[loaded]\n"
        "    importlib.import_module('tscale.' + name)\n"
    )
    done = subprocess.run([sys.executable, "-W", "error", "-c", script], capture_output=True, text=True, check=False)
    assert done.returncode == 0, done.stderr


@pytest.mark.parametrize("name", tscale.__all__)
def test_public_names_resolve(name: str) -> None:
    assert getattr(tscale, name) is not None
