"""Imports point down: read from the source, so that imports inside functions count too."""

from __future__ import annotations

import ast
import sys
from pathlib import Path

import pytest

PACKAGE = Path(__file__).resolve().parent.parent / "explorer"

#: From the ground up. A module imports from the lines above its own, never from its own or below.
LAYERS = (
    ("units", "whole", "version", "frozen"),
    ("registry", "exact", "broadening", "keyrate", "atomic"),
    ("inputs", "physics", "domain"),
    ("evaluate", "scatter", "built"),
    ("design", "budget", "published", "reading"),
    ("catalogue",),
    ("maps", "unknowns", "sampling", "combine", "measured", "advice"),
    ("devices",),
    ("yields",),
    ("yield_maps", "limits", "search", "sweep"),
    ("sturdy",),
    ("candidates", "limiting", "prediction", "curves", "sentence", "refusals"),
    ("fabrication",),
    ("question",),
    ("later",),
    ("answers",),
    ("schema",),
    ("record_parts",),
    ("record", "scenario"),
    ("kept", "brief"),
    ("__init__", "sweep_file"),
    ("serve", "sweep_command"),
    ("__main__",),
    ("page",),
)

#: What a formula may import besides the standard library and its own package.
FORMULA_IMPORTS = {"numpy", "scipy", "explorer.registry", "explorer.whole", "explorer.broadening"}

#: What loads slowly or draws: nothing below the page may import it at the top of a module.
WIDGETS = {"ipywidgets", "bqplot", "anywidget", "traitlets", "tornado", "voila", "IPython"}

FILES = sorted(file for file in PACKAGE.rglob("*.py") if file.name != "__pycache__")


def module_of(file: Path) -> str:
    """explorer/physics/coupling.py -> explorer.physics.coupling; a package is named by itself."""
    parts = ["explorer", *file.relative_to(PACKAGE).with_suffix("").parts]
    return ".".join(parts[:-1] if parts[-1] == "__init__" and len(parts) > 2 else parts)


def imports(file: Path) -> set[str]:
    """Full names of all modules that a file imports, wherever in it."""
    found: set[str] = set()
    parts = ["explorer", *file.relative_to(PACKAGE).parts[:-1]]
    for node in ast.walk(ast.parse(file.read_text(encoding="utf-8"))):
        if isinstance(node, ast.Import):
            found |= {alias.name for alias in node.names}
        elif isinstance(node, ast.ImportFrom):
            base = parts[: len(parts) - node.level + 1] if node.level else []
            source = ".".join([*base, *([node.module] if node.module else [])])
            found |= {_full(source, alias.name) for alias in node.names}
    return found


def _full(source: str, name: str) -> str:
    """The module behind `from source import name`, which may be a module itself."""
    inside = PACKAGE.joinpath(*source.split(".")[1:]) if source.startswith("explorer") else None
    if inside and ((inside / f"{name}.py").exists() or (inside / name / "__init__.py").exists()):
        return f"{source}.{name}"
    return source


def part(module: str) -> str:
    """The name in LAYERS: explorer.physics.coupling -> physics; explorer itself -> __init__."""
    names = module.split(".")
    return names[1] if len(names) > 1 else "__init__"


HEIGHT = {name: height for height, layer in enumerate(LAYERS) for name in layer}


def test_every_module_has_its_layer() -> None:
    missing = {part(module_of(file)) for file in FILES} - HEIGHT.keys()
    assert not missing, f"give these modules a place in LAYERS: {sorted(missing)}"


@pytest.mark.parametrize("file", FILES, ids=module_of)
def test_imports_point_down(file: Path) -> None:
    own = part(module_of(file))
    for name in imports(file):
        if not name.startswith("explorer"):
            continue
        other = part(name)
        if other == own:
            continue
        if own in ("serve", "__main__") and other in ("page", "serve"):
            continue  # the command starts the page
        assert HEIGHT[other] < HEIGHT[own], f"{module_of(file)} imports {name}, which lies above it"


@pytest.mark.parametrize("file", FILES, ids=module_of)
def test_nothing_imports_the_page(file: Path) -> None:
    if part(module_of(file)) in ("page", "serve", "__main__"):
        return
    assert not {name for name in imports(file) if name.startswith("explorer.page")}


@pytest.mark.parametrize("file", sorted((PACKAGE / "physics").glob("*.py")), ids=module_of)
def test_formulas_import_numbers_and_decorators_only(file: Path) -> None:
    for name in imports(file):
        inside = name.startswith("explorer.physics")
        allowed = any(name == one or name.startswith(f"{one}.") for one in FORMULA_IMPORTS)
        assert inside or allowed or name.split(".")[0] in sys.stdlib_module_names, name


@pytest.mark.parametrize("file", sorted((PACKAGE / "page" / "panels").glob("*.py")), ids=module_of)
def test_a_panel_imports_neither_the_evaluation_nor_another_panel(file: Path) -> None:
    for name in imports(file):
        assert not name.startswith(("explorer.evaluate", "explorer.physics")), name
        assert not name.startswith("explorer.page.panels") or name == module_of(file), name


@pytest.mark.parametrize("file", FILES, ids=module_of)
def test_widgets_stay_on_the_page(file: Path) -> None:
    if part(module_of(file)) != "page":
        assert not {name.split(".")[0] for name in imports(file)} & WIDGETS


def test_names_in_the_layers_are_given_once() -> None:
    names = [name for layer in LAYERS for name in layer]
    assert len(names) == len(set(names))
