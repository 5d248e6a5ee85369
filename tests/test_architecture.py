"""The arrows between the modules, and where a thing may stand: parsed from the source tree.

A module that is new has to be entered in ``MAY_IMPORT``; that is the moment to decide where it
belongs. DEVELOPERS.md says the same in words.
"""

import ast
import fnmatch
import graphlib
import sys
from collections.abc import Iterator
from dataclasses import dataclass
from functools import cache
from pathlib import Path

import pytest

from thermo_fix import constants

ROOT = Path(__file__).parents[1]
PACKAGE = ROOT / "thermo_fix"

STAGES = {"sheet", "read", "correct", "find", "measure", "grade", "report", "results"}
"""Folders of the data flow. None knows another."""

PHYSICS = {"radiometry", "thermal", "uncertainty"}
"""Pure functions: no files, no images, no sheet."""

BELOW_STAGES = PHYSICS | {
    "cautions",
    "constants",
    "criteria",
    "defaults",
    "errors",
    "limits",
    "records",
    "surfaces",
    "text_file",
    "version",
}

MAY_IMPORT: dict[str, set[str]] = {
    # Nothing of ours.
    "constants": set(),
    "errors": set(),
    "version": set(),
    "cautions": set(),
    "defaults": set(),
    "surfaces": {"errors"},
    # Physics.
    "radiometry": {"constants", "errors"},
    "thermal": {"constants", "errors", "radiometry"},
    "uncertainty": {"constants", "errors", "radiometry"},
    # What is handed on, and the tables that speak of it.
    "records": {"uncertainty"},
    "text_file": {"errors"},
    "criteria": {"errors", "records", "text_file"},
    "limits": {"errors", "records"},
    # The stages.
    **dict.fromkeys(STAGES, BELOW_STAGES),
    # What joins them.
    "point": BELOW_STAGES,
    "pool": {"errors"},
    "cluster": {"errors"},
    "work": BELOW_STAGES | STAGES,
    "survey": BELOW_STAGES | STAGES | {"work", "pool", "cluster"},
    "solve": BELOW_STAGES | STAGES | {"work", "survey"},
    # What sits on top, and holds no physics.
    "demo": {"errors"},
    "terminal": {"errors"},
    "solve_cli": {"errors", "solve", "terminal"},
    "cli": (BELOW_STAGES - PHYSICS)
    | STAGES
    | {"demo", "point", "pool", "cluster", "solve", "solve_cli", "survey", "terminal", "work"},
    "__main__": {"cli"},
    "__init__": {"point", "survey", "version"},
}

LIBRARIES: dict[str, tuple[str, ...]] = {
    # Where a library may be used; everything else hands on arrays.
    "tifffile": ("read/", "results/"),
    "cv2": ("correct/kernel.py", "find/", "measure/", "report/pictures.py", "pool.py"),
    "skimage": ("find/", "measure/", "report/pictures.py"),
    "jinja2": ("report/",),
    "matplotlib": ("report/",),
    "tomlkit": ("sheet/",),
    "pydantic": ("sheet/", "results/"),
    "typer": ("cli.py", "solve_cli.py"),
    "rich": ("cli.py", "solve_cli.py"),
    "distributed": ("cluster.py",),
    "dask": ("cluster.py",),
}

LATE_IMPORTS = {
    "__init__.py": "a public name is imported when it is first used",
    "cli.py": "--help has to answer at once",
    "solve_cli.py": "--help has to answer at once",
    "cluster.py": "the extra may not be installed",
    "pool.py": "only a worker sets the threads of a library",
    "uncertainty/propagation.py": "point has to answer at once",
    "uncertainty/variables.py": "point has to answer at once",
}
"""Files in which an import may stand inside a function, and the reason."""

OPENING = {"builtins", "io", "os", "pathlib", "shutil", "subprocess", "tempfile", "urllib"}


@dataclass(frozen=True)
class Import:
    file: str
    """Path below the package."""
    line: int
    module: str
    """Full name of the module that is imported, or from which."""
    name: str
    """What is imported from it; empty for a plain ``import``."""
    inside_function: bool

    @property
    def group(self) -> str:
        """First part below the package: a module or a folder."""
        return self.file.split("/")[0].removesuffix(".py")

    @property
    def library(self) -> str:
        return self.module.split(".")[0]

    def __str__(self) -> str:
        what = f"from {self.module} import {self.name}" if self.name else f"import {self.module}"
        return f"thermo_fix/{self.file}:{self.line}: {what}"


@cache
def sources() -> dict[str, ast.Module]:
    return {
        path.relative_to(PACKAGE).as_posix(): ast.parse(path.read_text(encoding="utf-8"))
        for path in sorted(PACKAGE.rglob("*.py"))
    }


def _walk(node: ast.AST, inside: bool) -> Iterator[tuple[ast.AST, bool]]:
    for child in ast.iter_child_nodes(node):
        here = inside or isinstance(node, ast.FunctionDef | ast.AsyncFunctionDef | ast.Lambda)
        yield child, here
        yield from _walk(child, here)


@cache
def imports() -> tuple[Import, ...]:
    found = []
    for file, tree in sources().items():
        for node, inside in _walk(tree, inside=False):
            if isinstance(node, ast.Import):
                found += [Import(file, node.lineno, each.name, "", inside) for each in node.names]
            elif isinstance(node, ast.ImportFrom):
                module = "." * node.level + (node.module or "")
                found += [
                    Import(file, node.lineno, module, each.name, inside) for each in node.names
                ]
    return tuple(found)


def is_module(dotted: str) -> bool:
    path = ROOT.joinpath(*dotted.split("."))
    return path.with_suffix(".py").is_file() or (path / "__init__.py").is_file()


def ours(each: Import) -> str | None:
    """Return the group of the package that is imported, if it is one of ours."""
    if each.library != "thermo_fix":
        return None
    parts = each.module.split(".")
    if len(parts) > 1:
        return parts[1]
    return each.name or "__init__"


def listing(offenders: list[Import]) -> str:
    return "\n".join(map(str, offenders))


# ---------------------------------------------------------------- arrows


def test_the_tree_is_read_at_all() -> None:
    assert len(sources()) > 40
    assert any(each.inside_function for each in imports())
    assert {"radiometry", "records", "survey"} <= {each.group for each in imports()}


def test_every_module_has_its_place() -> None:
    present = {file.split("/")[0].removesuffix(".py") for file in sources()}
    assert present == set(MAY_IMPORT)


def test_the_arrows_as_allowed_have_no_circle() -> None:
    graph = {group: allowed - {group} for group, allowed in MAY_IMPORT.items()}
    for stage in STAGES:
        assert not graph[stage] & STAGES
    graphlib.TopologicalSorter(graph).prepare()  # raises CycleError


@pytest.mark.parametrize("group", sorted(MAY_IMPORT))
def test_arrows_point_one_way(group: str) -> None:
    allowed = MAY_IMPORT[group] | ({group} if (PACKAGE / group).is_dir() else set())
    offenders = [
        each
        for each in imports()
        if each.group == group and ours(each) is not None and ours(each) not in allowed
    ]
    assert not offenders, listing(offenders)


def test_modules_do_not_import_each_other_in_a_circle() -> None:
    graph: dict[str, set[str]] = {}
    for each in imports():
        if each.library != "thermo_fix" or each.inside_function or each.file == "__init__.py":
            continue
        home = "thermo_fix." + each.file.removesuffix(".py").removesuffix("/__init__")
        whole = f"{each.module}.{each.name}"
        graph.setdefault(home.replace("/", "."), set()).add(
            whole if is_module(whole) else each.module
        )
    graphlib.TopologicalSorter(graph).prepare()  # raises CycleError


def test_only_the_module_entry_knows_the_command_line() -> None:
    knowing = {each.file for each in imports() if ours(each) == "cli"}
    assert knowing == {"__main__.py"}


def test_no_module_imports_the_bare_package() -> None:
    # ``from thermo_fix import cautions`` names a module and is fine; a public name, or the
    # package itself, would be a circle through the front door.
    offenders = [
        each
        for each in imports()
        if each.module == "thermo_fix" and not is_module(f"thermo_fix.{each.name}")
    ]
    assert not offenders, listing(offenders)


def test_imports_are_absolute_and_named() -> None:
    offenders = [each for each in imports() if each.module.startswith(".") or each.name == "*"]
    assert not offenders, listing(offenders)


def test_imports_stand_at_the_top() -> None:
    offenders = [
        each for each in imports() if each.inside_function and each.file not in LATE_IMPORTS
    ]
    assert not offenders, listing(offenders)
    late = {each.file for each in imports() if each.inside_function}
    assert set(LATE_IMPORTS) == late, "an exception that nothing needs any more"


# ---------------------------------------------------------------- libraries


@pytest.mark.parametrize("library", sorted(LIBRARIES))
def test_a_library_stays_in_its_place(library: str) -> None:
    homes = LIBRARIES[library]
    offenders = [
        each for each in imports() if each.library == library and not each.file.startswith(homes)
    ]
    assert not offenders, listing(offenders)


def test_the_pool_does_no_image_work() -> None:
    used = {
        node.attr
        for node in ast.walk(sources()["pool.py"])
        if isinstance(node, ast.Attribute)
        and isinstance(node.value, ast.Name)
        and node.value.id == "cv2"
    }
    assert used <= {"setNumThreads"}


def test_physics_needs_numpy_and_scipy_only_and_opens_nothing() -> None:
    offenders = [
        each
        for each in imports()
        if each.group in PHYSICS
        and (
            each.library not in sys.stdlib_module_names | {"numpy", "scipy", "thermo_fix"}
            or each.library in OPENING
        )
    ]
    assert not offenders, listing(offenders)
    for file, tree in sources().items():
        if file.split("/")[0] in PHYSICS:
            called = {node.func for node in ast.walk(tree) if isinstance(node, ast.Call)}
            names = {each.id for each in called if isinstance(each, ast.Name)}
            assert not names & {"open", "print", "input"}, file


def test_records_need_numpy_only() -> None:
    offenders = [
        each
        for each in imports()
        if each.group == "records"
        and each.library not in sys.stdlib_module_names | {"numpy", "thermo_fix"}
    ]
    assert not offenders, listing(offenders)


def test_the_command_line_computes_nothing() -> None:
    offenders = [
        each
        for each in imports()
        if each.group in ("cli", "solve_cli") and each.library in ("numpy", "scipy", "cv2")
    ]
    assert not offenders, listing(offenders)


# ---------------------------------------------------------------- constants


def _numbers(tree: ast.AST) -> Iterator[tuple[int, float]]:
    for node in ast.walk(tree):
        if isinstance(node, ast.Constant) and isinstance(node.value, int | float):
            yield node.lineno, abs(float(node.value))


def test_constants_stand_once() -> None:
    known = [value for name, value in vars(constants).items() if name.isupper()]
    assert constants.ZERO_CELSIUS_K in known
    assert constants.STEFAN_BOLTZMANN in known
    retyped = []
    for file, tree in sources().items():
        if file == "constants.py":
            continue
        for line, number in _numbers(tree):
            sigma = any(round(number * scale, 2) == 5.67 for scale in (1.0, 1e8))
            kelvin = abs(number - constants.ZERO_CELSIUS_K) < 0.05  # 273.15, 273.16
            if sigma or kelvin or number in known:
                retyped.append(f"thermo_fix/{file}:{line}: {number:g}")
    assert not retyped, "\n".join(retyped)


# ---------------------------------------------------------------- top level


def test_the_top_level_is_what_it_should_be() -> None:
    ignored = [
        line.rstrip("/")
        for line in (ROOT / ".gitignore").read_text(encoding="utf-8").splitlines()
        if line and not line.startswith("#")
    ]
    present = {
        path.name
        for path in ROOT.iterdir()
        if not path.name.startswith(".")
        and not any(fnmatch.fnmatch(path.name, pattern) for pattern in ignored)
    }
    assert present - {"PKG-INFO"} == {  # a source distribution adds that one
        "README.md",
        "DEVELOPERS.md",
        "pyproject.toml",
        "thermo_fix",
        "tests",
        "demo_images",
        "docs",
    }
