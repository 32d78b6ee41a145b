"""The worker: what it answers, how it ends, and that it leaves and runs nothing."""

from __future__ import annotations

import os
import re
import signal
import subprocess
import sys
import tempfile
import time
from pathlib import Path

import numpy as np
import pytest

import tauledger.engine
from circuits import board, preamp
from tauledger.circuit import Port
from tauledger.devices.catalogue import observations
from tauledger.engine import deck
from tauledger.engine.client import PACKAGE_ROOT, Engine, start_engine
from tauledger.engine.grid import decades
from tauledger.errors import EngineError, EngineMissing, EngineTimeout
from tauledger.solution import Observation

DIVIDER = board("V1 in 0 5", "R1 in out 1k", "R2 out 0 4k", "C1 out 0 1n", drive={"V1": 1.0})


@pytest.fixture
def private_tmp(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """A folder in which every private folder of this test's engines is made."""
    monkeypatch.setattr(tempfile, "tempdir", str(tmp_path))
    return tmp_path


def is_running(pid: int) -> bool:
    """Whether the process exists and is not a zombie."""
    try:
        state = Path(f"/proc/{pid}/stat").read_text().rpartition(")")[2].split()[0]
    except FileNotFoundError:
        return False
    return state != "Z"


def gone(pid: int, within_s: float = 5.0) -> bool:
    """Whether the process ends within the time."""
    until = time.monotonic() + within_s
    while is_running(pid) and time.monotonic() < until:
        time.sleep(0.01)
    return not is_running(pid)


def test_operating_point_has_every_node_and_branch_by_the_users_names(engine: Engine) -> None:
    circuit = board("Vcc IN 0 5", "R1 IN a/b 1k", "L1 a/b out 1m", "R2 out 0 4k")
    bias = engine.bias(circuit, ())
    assert np.allclose(bias.voltages, [0.0, 5.0, 4.0, 4.0], rtol=1e-12)
    assert bias.currents == {"Vcc": pytest.approx(-1e-3, rel=1e-12), "L1": pytest.approx(1e-3, rel=1e-12)}
    assert bias.engine.name == "ngspice"
    assert int(bias.engine.version) >= 39
    assert not bias.stepped
    assert bias.warnings == ()


def test_readings_come_in_full_precision(engine: Engine) -> None:
    """The base conductance is 1/RB to the last digits, where `show` and `print` give six."""
    circuit = preamp()
    read = engine.bias(circuit, observations(circuit)).readings["Q1"]
    assert read["gx"] == pytest.approx(1.0 / 90.0, rel=1e-15)
    assert read["temp"] == 27.0


def test_output_can_be_a_difference_or_a_current(engine: Engine) -> None:
    cards = ("V1 in 0 0", "R1 in a 1k", "R2 a b 2k", "R3 b 0 1k")
    difference = board(*cards, drive={"V1": 1.0}, output=Port("b", "a"))
    engine.bias(difference, ())
    assert engine.sweep([1e3]).response[0] == pytest.approx(-0.5, rel=1e-14)
    current = board(*cards, drive={"V1": 1.0}, output=Port("in", "0", "current", "v1"))
    engine.bias(current, ())
    assert engine.sweep([1e3]).response[0] == pytest.approx(-1.0 / 4000.0, rel=1e-14)


def test_all_driven_sources_act_at_once_with_their_phase(engine: Engine) -> None:
    circuit = board("V1 a 0 0", "V2 b 0 0", "R1 a out 1k", "R2 b out 1k", drive={"V1": 0.5, "V2": 0.3 - 0.4j})
    engine.bias(circuit, ())
    assert engine.sweep([1e3]).response[0] == pytest.approx(0.4 - 0.2j, rel=1e-14)


def test_one_worker_solves_many_circuits_the_same_each_time(engine: Engine) -> None:
    first = preamp()
    before = engine.bias(first, observations(first))
    swept = engine.sweep(decades(10.0, 1e8, 5))
    for temperature_c in range(-40, 120, 4):
        other = preamp(temperature_c=float(temperature_c))
        engine.bias(other, observations(other))
        engine.sweep([1e4])
    after = engine.bias(first, observations(first))
    assert after.readings == before.readings
    assert np.array_equal(after.voltages, before.voltages)
    assert np.array_equal(engine.sweep(decades(10.0, 1e8, 5)).response, swept.response)


def test_a_worker_does_not_grow_with_the_circuits_it_solves(engine: Engine) -> None:
    """Without `remcirc` and `destroy all` each cycle costs 77 to 430 kB; with both about 1 kB."""

    def resident_kb() -> int:
        return int(Path(f"/proc/{engine.pid}/statm").read_text().split()[1]) * os.sysconf("SC_PAGE_SIZE") // 1024

    circuit = preamp()
    grid = decades(10.0, 1e8, 20)

    def solve(times: int, *, swept: bool) -> int:
        before = resident_kb()
        for _ in range(times):
            engine.bias(circuit, observations(circuit))
            if swept:
                engine.sweep(grid)
        return resident_kb() - before

    solve(20, swept=True)
    assert solve(150, swept=True) < 150 * 20
    assert solve(300, swept=False) < 300 * 10


def test_a_floating_node_is_named_and_not_given_a_voltage(engine: Engine) -> None:
    with pytest.raises(EngineError, match="look at Mid") as caught:
        engine.bias(board("V1 in 0 5", "C1 in Mid 1n", "C2 Mid out 1n", "R1 out 0 1k"), ())
    assert "DC path" in caught.value.hint


def test_a_loop_of_sources_is_named(engine: Engine) -> None:
    with pytest.raises(EngineError, match="the current through V1"):
        engine.bias(board("V1 out 0 5", "V2 out 0 4", "R1 out 0 1k"), ())


def test_a_source_across_one_node_is_told_in_the_users_names(engine: Engine) -> None:
    with pytest.raises(EngineError) as caught:
        engine.bias(board("Vx out out 5", "V2 out 0 4", "R1 out 0 1k"), ())
    assert any("Vx" in line for line in caught.value.engine_says)


def test_after_a_failure_the_same_worker_solves_the_next_circuit(engine: Engine) -> None:
    with pytest.raises(EngineError):
        engine.bias(board("V1 out 0 5", "V2 out 0 4", "R1 out 0 1k"), ())
    with pytest.raises(ValueError, match="no circuit"):
        engine.sweep([1e3])
    assert engine.bias(DIVIDER, ()).voltages[2] == pytest.approx(4.0)


def test_a_latched_pair_of_transistors_needs_stepping_and_says_so(engine: Engine) -> None:
    bias = engine.bias(
        board(
            *(
                "V1 v 0 50",
                "R1 v e 100",
                "Q1 b2 b1 e qp",
                "Q2 b1 b2 0 qn",
                "R2 b2 0 10meg",
                "R3 b1 out 1",
                "C1 out 0 1n",
            )
        ),
        (),
    )
    assert bias.stepped
    assert bias.warnings == ()


def test_tolerances_are_relaxed_once_and_the_result_says_so(engine: Engine, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(deck, "TIGHT", (("reltol", 1e-300), ("abstol", 1e-300), ("vntol", 1e-300)))
    bias = engine.bias(preamp(), ())
    assert len(bias.warnings) == 1
    assert "default tolerances" in bias.warnings[0]


def test_a_reading_that_the_engine_does_not_have_is_an_error(engine: Engine) -> None:
    with pytest.raises(EngineError, match="no nonsense for Q1"):
        engine.bias(preamp(), (Observation("Q1", ("gm", "nonsense")),))


@pytest.mark.parametrize("bad", [[], [0.0], [-1.0], [float("nan")], [float("inf")]])
def test_frequencies_must_be_above_zero(engine: Engine, bad: list[float]) -> None:
    engine.bias(DIVIDER, ())
    with pytest.raises(ValueError, match="frequencies"):
        engine.sweep(bad)


def test_a_deadline_ends_the_worker_and_its_folder(private_tmp: Path) -> None:
    engine = start_engine(timeout_s=20.0)
    engine.bias(DIVIDER, ())
    engine._timeout_s = 0.2
    os.kill(engine.pid, signal.SIGSTOP)
    with pytest.raises(EngineTimeout, match=r"0\.2 s"):
        engine.bias(DIVIDER, ())
    assert gone(engine.pid)
    assert list(private_tmp.iterdir()) == []
    with pytest.raises(EngineError, match="was ended"):
        engine.bias(DIVIDER, ())
    engine.close()


def test_a_worker_that_dies_is_an_error_and_leaves_nothing(private_tmp: Path) -> None:
    engine = start_engine()
    engine.bias(DIVIDER, ())
    os.kill(engine.pid, signal.SIGKILL)
    with pytest.raises(EngineError, match="ended by itself"):
        engine.bias(DIVIDER, ())
    assert list(private_tmp.iterdir()) == []


def test_an_unused_engine_closes_at_once_and_leaves_nothing(private_tmp: Path) -> None:
    with start_engine() as engine:
        folder = next(private_tmp.iterdir())
        assert folder.stat().st_mode & 0o777 == 0o700
    assert gone(engine.pid)
    assert list(private_tmp.iterdir()) == []


ORPHAN = """
import os, sys, tempfile
tempfile.tempdir = sys.argv[1]
from circuits import board
from tauledger.engine.client import start_engine
engine = start_engine()
engine.bias(board("V1 in 0 5", "R1 in out 1k", "C1 out 0 1n"), ())
print(engine.pid, flush=True)
engine.sweep([1.0 + k for k in range(2_000_000)])
"""


def test_a_busy_worker_ends_when_its_parent_is_killed(private_tmp: Path) -> None:
    environment = {**os.environ, "PYTHONPATH": os.pathsep.join((str(Path(__file__).parents[1]), str(PACKAGE_ROOT)))}
    parent = subprocess.Popen(
        [sys.executable, "-c", ORPHAN, str(private_tmp)], stdout=subprocess.PIPE, text=True, env=environment
    )
    assert parent.stdout is not None
    worker = int(parent.stdout.readline())
    assert is_running(worker)
    parent.kill()
    parent.wait()
    parent.stdout.close()
    assert gone(worker)
    assert list(private_tmp.iterdir()) == []


@pytest.mark.parametrize("use", ["argument", "environment"])
def test_a_missing_library_names_the_package_per_system(
    use: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    path = str(tmp_path / "no{such}.so")
    if use == "environment":
        monkeypatch.setenv("NGSPICE_LIBRARY_PATH", path)
    with (
        start_engine(library=path if use == "argument" else None) as engine,
        pytest.raises(EngineMissing, match=re.escape("no{such}")) as caught,
    ):
        engine.bias(DIVIDER, ())
    for package in ("apt install libngspice0", "dnf install libngspice", "brew install libngspice"):
        assert package in str(caught.value)
    assert caught.value.exit_code == 3


@pytest.mark.parametrize("kind", ["text file", "another library"])
def test_a_file_that_is_not_ngspice_is_refused(kind: str, tmp_path: Path) -> None:
    import _ctypes

    text = tmp_path / "libngspice.so"
    text.write_text("not a library\n")
    path = str(text) if kind == "text file" else _ctypes.__file__
    with start_engine(library=path) as engine, pytest.raises(EngineMissing, match="cannot be used"):
        engine.bias(DIVIDER, ())


def test_no_start_up_file_of_the_user_is_run(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """ngspice takes `.spiceinit` from the working folder or the home, and `spinit` from SPICE_SCRIPTS."""
    trap = tmp_path / "trap"
    trap.mkdir()
    for name in (".spiceinit", "spinit", "PySpice.py"):
        (trap / name).write_text(f"shell touch {trap}/sprung\n")
    monkeypatch.chdir(trap)
    for variable in ("HOME", "SPICE_SCRIPTS", "SPICE_LIB_DIR", "PYTHONPATH"):
        monkeypatch.setenv(variable, str(trap))
    with start_engine() as engine:
        assert engine.bias(DIVIDER, ()).voltages[2] == pytest.approx(4.0)
    assert not (trap / "sprung").exists()


def test_no_code_model_of_the_system_is_loaded(engine: Engine) -> None:
    """The system's own `spinit` would load them; the private one is read instead."""
    engine.bias(DIVIDER, ())
    mapped = Path(f"/proc/{engine.pid}/maps").read_text()
    assert "libngspice" in mapped
    assert ".cm\n" not in mapped


def test_hostile_names_run_nothing(tmp_path: Path, engine: Engine) -> None:
    from msgspec.structs import replace

    target = tmp_path / "sprung"
    evil = f"x\r\n.control\nshell touch {target}\n.endc\n*# shell touch {target}"
    circuit = replace(
        DIVIDER, title=evil, nodes=("0", evil, "out"), passives=replace(DIVIDER.passives, name=(evil, "`", "{"))
    )
    assert engine.bias(circuit, ()).voltages[2] == pytest.approx(4.0)
    assert not target.exists()


def test_starting_returns_before_the_engine_is_up_and_loads_nothing_heavy() -> None:
    program = (
        "import sys; from tauledger.engine.client import start_engine; start_engine().close();"
        "print([m for m in ('numpy', 'scipy', 'PySpice', 'cffi') if m in sys.modules])"
    )
    answer = subprocess.run([sys.executable, "-c", program], capture_output=True, text=True, check=True)
    assert answer.stdout.strip() == "[]"


def test_only_the_worker_imports_pyspice() -> None:
    source = Path(tauledger.engine.__file__).parents[1]
    guilty = sorted(
        path.name
        for path in source.rglob("*.py")
        if "import NgSpice" in path.read_text() or "from PySpice" in path.read_text()
    )
    assert guilty == ["worker.py"]


def test_an_interrupt_ends_the_worker_so_that_no_answer_is_taken_for_another(monkeypatch: pytest.MonkeyPatch) -> None:
    def interrupted(*_: object) -> None:
        raise KeyboardInterrupt

    with start_engine(timeout_s=30.0) as engine:
        engine.bias(preamp(), ())
        monkeypatch.setattr("tauledger.engine.client.receive", interrupted)
        with pytest.raises(KeyboardInterrupt):
            engine.sweep([1e3])
        monkeypatch.undo()
        with pytest.raises(EngineError, match="the engine was ended"):
            engine.sweep([1e3])


def test_a_process_that_cannot_be_started_leaves_nothing_behind(
    monkeypatch: pytest.MonkeyPatch, tmp_path: Path
) -> None:
    def refused(*_: object, **__: object) -> None:
        raise OSError(11, "Resource temporarily unavailable")

    before = len(list(Path("/proc/self/fd").iterdir()))
    monkeypatch.setattr("tempfile.tempdir", str(tmp_path))
    monkeypatch.setattr("tauledger.engine.client.subprocess.Popen", refused)
    with pytest.raises(EngineError, match="cannot be started: Resource temporarily unavailable"):
        start_engine()
    assert list(tmp_path.iterdir()) == []
    assert len(list(Path("/proc/self/fd").iterdir())) == before
