"""The shape of the program, read off its syntax trees: who may import whom."""

import ast
from pathlib import Path

import pytest

SOURCE = Path(__file__).parent.parent / "src" / "coldglow"
LAYERS = ("describe", "sky", "light", "detect", "plan", "report")
MODULES = sorted(path for path in SOURCE.rglob("*.py") if "data" not in path.relative_to(SOURCE).parts)


def place(path):
    return path.relative_to(SOURCE).parts[0].removesuffix(".py")


def imports(path):
    """Every module named in an import, at the top or inside a function."""
    for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
        if isinstance(node, ast.Import):
            yield from (alias.name for alias in node.names)
        elif isinstance(node, ast.ImportFrom) and node.level == 0:
            yield node.module
            if node.module == "coldglow":
                yield from (f"coldglow.{alias.name}" for alias in node.names)


def own(name):
    """The layer or module of this package that an import names, or ''."""
    parts = name.split(".")
    return parts[1] if parts[0] == "coldglow" and len(parts) > 1 else ""


IN_LAYERS = [path for path in MODULES if place(path) in LAYERS]


@pytest.mark.parametrize("path", IN_LAYERS, ids=lambda path: path.relative_to(SOURCE).as_posix())
def test_a_layer_imports_only_itself_and_the_layers_above(path):
    layer = place(path)
    allowed = {*LAYERS[: LAYERS.index(layer) + 1], "errors", "units", ""}
    if layer == "plan":
        allowed = {"plan", "errors", ""}
    found = {own(name) for name in imports(path)}
    assert found <= allowed, f"{path.name} imports {found - allowed}"


@pytest.mark.parametrize(
    ("library", "home"),
    [("pydantic", {"describe"}), ("astroplan", {"bridges"}), ("astroquery", {"bridges"})],
)
def test_a_library_has_one_home(library, home):
    users = {place(path) for path in MODULES for name in imports(path) if name.split(".")[0] == library}
    assert users <= home


def test_plan_knows_no_astropy():
    for path in MODULES:
        if place(path) == "plan":
            assert not {name.split(".")[0] for name in imports(path)} & {"astropy", "erfa", "yaml"}, path.name


def dotted(path):
    parts = path.relative_to(SOURCE).with_suffix("").parts
    return ".".join(("coldglow", *parts)).removesuffix(".__init__")


def test_no_module_imports_in_a_circle():
    graph = {dotted(path): path for path in MODULES}
    edges = {name: ({*imports(path)} & {*graph}) - {name} for name, path in graph.items()}
    done = set()

    def walk(name, trail):
        assert name not in trail, " -> ".join([*trail, name])
        if name in done:
            return
        for other in edges[name]:
            walk(other, [*trail, name])
        done.add(name)

    for name in graph:
        walk(name, [])
