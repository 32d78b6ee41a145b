"""Who may import whom, what stays out of a plain `tauledger --help`, and whether names and packages are as listed."""

from __future__ import annotations

import ast
import subprocess
import sys
import tomllib
from collections.abc import Iterator
from pathlib import Path

import pytest

import tauledger

ROOT = Path(__file__).parents[1]
SOURCE = ROOT / "src" / "tauledger"
MODULES = sorted(SOURCE.rglob("*.py"))

# What each room may import of the others, and of what lies outside. A file directly in tauledger is a room of its own.
RECORDS = {"errors", "quantity", "record", "circuit", "solution"}
BELOW_HAND = RECORDS | {"devices", "network"}
MAY_IMPORT: dict[str, set[str]] = {
    "errors": set(),
    "quantity": set(),
    "record": set(),
    "asked": {"errors", "quantity"},
    "circuit": {"errors"},
    "solution": {"errors", "circuit"},
    "devices": RECORDS,
    "netlist": RECORDS | {"devices"},
    "engine": RECORDS | {"devices"},
    "network": RECORDS | {"devices"},
    "hand": BELOW_HAND,
    "paper": BELOW_HAND | {"hand", "netlist"},
    "causes": BELOW_HAND | {"hand"},
    "report": {"record", "quantity"},
}
ANYTHING_BUT_CLI = {"numbers", "simulated", "explain", "compose", "answers", "pipeline"}
OUTSIDE = {
    "subprocess",
    "select",
    "selectors",
    "socket",
    "signal",
    "shutil",
    "tempfile",
    "threading",
    "multiprocessing",
}
OUTSIDE |= {"time", "datetime", "random", "secrets", "uuid", "platform", "click", "rich", "cffi"}
TOUCHES_THE_OUTSIDE = {"engine", "report", "commands", "cli", "__main__"}


def room(module: Path) -> str:
    return module.relative_to(SOURCE).parts[0].removesuffix(".py")


def imports(module: Path) -> Iterator[tuple[str, int]]:
    """Every dotted name that a module imports, wherever it does so, with its line."""
    for node in ast.walk(ast.parse(module.read_text(encoding="utf-8"))):
        if isinstance(node, ast.Import):
            for alias in node.names:
                yield alias.name, node.lineno
        elif isinstance(node, ast.ImportFrom):
            assert node.level == 0, f"{module}:{node.lineno}: relative imports hide which room is meant"
            assert node.module is not None
            yield node.module, node.lineno
            for alias in node.names:
                if node.module == "tauledger" and alias.name != "*":
                    yield f"tauledger.{alias.name}", node.lineno


def own(module: Path) -> set[str]:
    return {name.split(".")[1] for name, _ in imports(module) if name.startswith("tauledger.")}


def relative(module: Path) -> str:
    return str(module.relative_to(SOURCE))


@pytest.mark.parametrize("module", MODULES, ids=relative)
def test_a_room_imports_only_from_rooms_above_it(module: Path) -> None:
    here = room(module)
    if here in MAY_IMPORT:
        assert own(module) - {here} <= MAY_IMPORT[here]
    elif here in ANYTHING_BUT_CLI:
        assert not own(module) & {"cli", "commands", "report"}
    else:
        assert here in {"commands", "cli", "__main__", "__init__"}, f"where does {here} stand among the rooms?"


@pytest.mark.parametrize("module", [m for m in MODULES if room(m) not in TOUCHES_THE_OUTSIDE], ids=relative)
def test_only_the_edges_touch_processes_clocks_and_terminals(module: Path) -> None:
    assert not {name.split(".")[0] for name, _ in imports(module)} & OUTSIDE


FILE_READERS = {"netlist/reader.py"}


@pytest.mark.parametrize("module", [m for m in MODULES if room(m) not in TOUCHES_THE_OUTSIDE], ids=relative)
def test_only_the_edges_and_the_netlist_reader_open_files(module: Path) -> None:
    if relative(module) in FILE_READERS:
        return
    tree = ast.parse(module.read_text(encoding="utf-8"))
    called = {node.func for node in ast.walk(tree) if isinstance(node, ast.Call)}
    names = {func.id for func in called if isinstance(func, ast.Name)}
    names |= {func.attr for func in called if isinstance(func, ast.Attribute)}
    assert not names & {"open", "write_text", "write_bytes", "read_bytes", "print", "input"}


def test_only_the_worker_imports_pyspice() -> None:
    found = {relative(module) for module in MODULES for name, _ in imports(module) if name.split(".")[0] == "PySpice"}
    assert found == {"engine/worker.py"}


def test_only_the_terminal_page_imports_rich() -> None:
    found = {relative(module) for module in MODULES for name, _ in imports(module) if name.split(".")[0] == "rich"}
    assert found == {"report/terminal.py"}


def test_the_engine_is_never_asked_by_a_room_that_only_computes() -> None:
    """The claim that hand figures owe nothing to the simulation."""
    for module in MODULES:
        if room(module) in {"hand", "network"}:
            assert not own(module) & {"engine", "netlist"}, module


LOADED = "import sys; {run}; print(*sorted({{name.split('.')[0] for name in sys.modules}}))"
HEAVY = {"numpy", "scipy", "rich", "lark", "msgspec", "quantiphy", "PySpice", "matplotlib", "jsonschema"}


def loaded(run: str) -> set[str]:
    process = subprocess.run(
        [sys.executable, "-c", LOADED.format(run=run)], capture_output=True, text=True, timeout=30, check=True
    )
    return set(process.stdout.splitlines()[-1].split())


@pytest.mark.parametrize("arguments", [["--help"], ["review", "--help"], ["--version"]], ids=" ".join)
def test_help_loads_nothing_heavy(arguments: list[str]) -> None:
    run = f"import tauledger.cli as c; c.command.main({arguments!r}, prog_name='tauledger', standalone_mode=False)"
    found = loaded(run)
    assert "click" in found
    assert not found & HEAVY


def test_import_tauledger_loads_nothing_heavy() -> None:
    assert not loaded("import tauledger") & HEAVY


def test_rich_is_loaded_for_colour_alone() -> None:
    assert "rich" not in loaded("import tauledger.report.terminal, tauledger.pipeline")


def test_every_public_name_is_there() -> None:
    for name in tauledger.__all__:
        assert getattr(tauledger, name).__module__.startswith("tauledger."), name
    assert sorted(tauledger.__all__) == list(tauledger.__all__)
    assert set(tauledger.__all__) <= set(dir(tauledger))
    with pytest.raises(AttributeError, match="no attribute 'reviev'"):
        _ = tauledger.reviev


def test_every_room_is_a_package_that_the_wheel_takes_along() -> None:
    """A room that is missing in the list works in a clone and is absent from the wheel."""
    listed = tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))["tool"]["setuptools"]["packages"]
    found = {".".join(init.parent.relative_to(ROOT / "src").parts) for init in SOURCE.rglob("__init__.py")}
    assert sorted(listed) == sorted(found | {"tauledger.grammar"})
    assert (ROOT / "grammar" / "__init__.py").is_file()
    for module in MODULES:
        assert (module.parent / "__init__.py").is_file(), module


def test_nothing_is_caught_that_nobody_expects() -> None:
    """Broad handlers hide faults; the one place that sees everything is the end of the command line."""
    for module in MODULES:
        for node in ast.walk(ast.parse(module.read_text(encoding="utf-8"))):
            if isinstance(node, ast.ExceptHandler):
                assert node.type is not None, f"{module}:{node.lineno}"
                names = {n.id for n in ast.walk(node.type) if isinstance(n, ast.Name)}
                assert not names & {"Exception", "BaseException"}, f"{module}:{node.lineno}"


def test_public_functions_say_what_they_give() -> None:
    for module in MODULES:
        tree = ast.parse(module.read_text(encoding="utf-8"))
        for node in tree.body:
            if isinstance(node, ast.FunctionDef | ast.ClassDef) and not node.name.startswith("_"):
                assert ast.get_docstring(node), f"{module}:{node.lineno}: {node.name}"
