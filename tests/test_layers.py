"""Imports go downwards only: each layer knows the ones before it in `LAYERS` and itself."""

from __future__ import annotations

import ast
import sys
from pathlib import Path

import pytest

PACKAGE = Path(__file__).resolve().parent.parent / "sieve"
LAYERS = ("errors", "exact", "curves", "local", "engine", "proof", "files", "report", "commands", "cli")


def layer_of(module: str) -> int:
    """The layer of a dotted module name inside the package; the bare package (its version) is below all."""
    parts = module.split(".")
    if len(parts) == 1:
        return -1
    if parts[1] == "__main__":
        return len(LAYERS)
    return LAYERS.index(parts[1])


def module_name(path: Path) -> str:
    parts = ["sieve", *path.relative_to(PACKAGE).with_suffix("").parts]
    return ".".join(parts[:-1] if parts[-1] == "__init__" else parts)


def imported_modules(source: str, module: str, is_package: bool) -> list[tuple[int, str]]:
    """Every module a source imports anywhere, with its line; relative names are made absolute.

    `from sieve import x` counts as an import of `sieve.x` when that is a module, as of `sieve` otherwise.
    """
    found: list[tuple[int, str]] = []
    for node in ast.walk(ast.parse(source)):
        if isinstance(node, ast.Import):
            found += [(node.lineno, alias.name) for alias in node.names]
        elif isinstance(node, ast.ImportFrom):
            base = node.module or ""
            if node.level:
                package = module.split(".") if is_package else module.split(".")[:-1]
                package = package[: len(package) - (node.level - 1)]
                base = ".".join([*package, base] if base else package)
            if base == "sieve":
                names = [a.name for a in node.names]
                found += [(node.lineno, f"sieve.{n}" if n in LAYERS else "sieve") for n in names]
            else:
                found.append((node.lineno, base))
    return found


def upward_imports(source: str, module: str, is_package: bool = False) -> list[str]:
    """The imports of a module that reach into a layer above its own."""
    own = layer_of(module)
    bad = []
    for line, name in imported_modules(source, module, is_package):
        if name.split(".")[0] == "sieve" and layer_of(name) > own:
            bad.append(f"{module}:{line} imports {name}")
    return bad


def sources() -> list[Path]:
    return sorted(PACKAGE.rglob("*.py"))


@pytest.mark.parametrize("path", sources(), ids=module_name)
def test_imports_go_downwards(path: Path) -> None:
    module = module_name(path)
    assert upward_imports(path.read_text("utf-8"), module, path.name == "__init__.py") == []


def test_every_part_of_the_package_is_a_layer() -> None:
    parts = {p.stem if p.is_file() else p.name for p in PACKAGE.iterdir() if p.suffix == ".py" or p.is_dir()}
    assert parts - {"__init__", "__main__", "__pycache__"} <= set(LAYERS)


@pytest.mark.parametrize(
    ("source", "module"),
    [
        ("import sieve.engine.plan", "sieve.exact.lattice"),
        ("from sieve.files import case", "sieve.engine.plan"),
        ("from sieve import cli", "sieve.report.text"),
        ("from ..engine import plan", "sieve.local.picard"),
        ("def f():\n    from ..cli import main", "sieve.proof.log"),
    ],
)
def test_an_upward_import_is_seen(source: str, module: str) -> None:
    assert len(upward_imports(source, module)) == 1


def test_downward_imports_are_accepted() -> None:
    source = "from ..exact import lattice\nfrom sieve.local import condition\nfrom sieve import __version__\n"
    assert upward_imports(source, "sieve.engine.plan") == []


def test_the_checker_stands_alone() -> None:
    """The checker runs with the standard library alone, as one file."""
    path = PACKAGE / "proof" / "checker.py"
    if not path.exists():
        pytest.skip("there is no checker yet")
    imports = imported_modules(path.read_text("utf-8"), "sieve.proof.checker", False)
    assert {name.split(".")[0] for _, name in imports} <= set(sys.stdlib_module_names)
