"""How long reading takes beside the engine's own, and what it keeps: `pytest tests/benchmarks/bench_netlist.py -s
--benchmark-enable`.

Never a timed assertion: machines differ and are shared. Each pair is measured in turn, so that a drift of the machine
meets both.
"""

from __future__ import annotations

import random
import statistics
import subprocess
import time
import tracemalloc
from collections.abc import Callable
from pathlib import Path

import pytest
from pytest_benchmark.fixture import BenchmarkFixture

from tauledger.circuit import Circuit
from tauledger.netlist import elaborate, read

ROUNDS = 7
LINES = 100_000


def ladder(path: Path) -> Path:
    """Write a ladder of R and C with all values different: plain lines only."""
    draw = random.Random(1)
    rows = ["ladder of a long cable", "V1 n1 0 1 AC 1"]
    for k in range(1, LINES // 2 + 1):
        rows.append(f"R{k} n{k} n{k + 1} {draw.uniform(1.0, 1e3):.6g}")
        rows.append(f"C{k} n{k + 1} 0 {draw.uniform(1.0, 1e3):.4g}p")
    path.write_text("\n".join([*rows, ".end", ""]))
    return path


def stages(path: Path) -> Path:
    """Write 2,000 transistor stages: cards of plain words and name=word."""
    rows = ["stages", "VCC vcc 0 12", "V1 n0 0 0 AC 1", ".model nsmall npn (is=6e-15 bf=220 cje=9p cjc=3.6p tf=350p)"]
    for k in range(2000):
        rows += [f"Q{k} n{k + 1} b{k} e{k} nsmall area=2", f"RC{k} vcc n{k + 1} 3.9k m=1", f"RB{k} vcc b{k} 220k"]
        rows += [f"C{k} n{k} b{k} 1u", f"RE{k} e{k} 0 470"]
    path.write_text("\n".join([*rows, ".end", ""]))
    return path


def understood(path: Path) -> Circuit:
    return elaborate(read(path), purpose="reading")


def loaded(path: Path) -> None:
    script = path.with_name("load.sp")
    script.write_text(f"load\n.control\nset noaskquit\nsource {path}\nquit\n.endc\n.end\n")
    subprocess.run(["ngspice", "-n", "-b", str(script)], check=True, capture_output=True)


@pytest.mark.parametrize("board", [ladder, stages])
def test_reading_and_flattening_against_the_load_of_the_engine(
    board: Callable[[Path], Path], benchmark: BenchmarkFixture, tmp_path: Path
) -> None:

    path = board(tmp_path / "board.cir")
    understood(path)
    ratios = []
    for _ in range(ROUNDS):
        start = time.perf_counter()
        loaded(path)
        between = time.perf_counter()
        understood(path)
        ratios.append((time.perf_counter() - between) / (between - start))
    benchmark.extra_info["ratio"] = statistics.median(ratios)
    benchmark.pedantic(understood, args=(path,), rounds=3)
    print(f"\n{board.__name__}: reading and flattening {statistics.median(ratios):.2f} × ngspice's load")


def test_bytes_per_card(benchmark: BenchmarkFixture, tmp_path: Path) -> None:
    path = ladder(tmp_path / "board.cir")
    understood(path)
    tracemalloc.start()
    netlist = read(path)
    circuit = elaborate(netlist, purpose="reading")
    kept = tracemalloc.get_traced_memory()[0] / len(circuit.passives)
    tracemalloc.stop()
    benchmark.extra_info["bytes"] = kept
    benchmark.pedantic(read, args=(path,), rounds=3)
    print(f"\n{kept:.0f} bytes per card")
