"""How long a user waits, as ratios in one run; run with `pytest tests/benchmarks/bench_start.py --benchmark-enable -s`.

Never a timed assertion: machines differ and are shared. Each pair is measured in turn, so that a drift of the machine
meets both.
"""

from __future__ import annotations

import os
import statistics
import subprocess
import sys
import time
from pathlib import Path

import pytest
from pytest_benchmark.fixture import BenchmarkFixture

ROOT = Path(__file__).parent.parent.parent
ROUNDS = 11
# Python keeps compiled modules unless it is told not to; a user waits for the compiler once, not at each review.
UNSET = {"PYTHONDONTWRITEBYTECODE"}
QUIET = {name: value for name, value in os.environ.items() if name not in UNSET} | {"OPENBLAS_NUM_THREADS": "1"}

PAIRS = {
    "help against an empty interpreter": (["-m", "tauledger", "--help"], ["-c", "pass"]),
    "review against the bare imports": (
        ["-m", "tauledger", "review", str(ROOT / "fixtures" / "echo_preamp.cir")],
        ["-c", "import numpy, scipy.sparse.linalg, PySpice"],
    ),
}


def seconds(arguments: list[str]) -> float:
    start = time.perf_counter()
    subprocess.run([sys.executable, *arguments], env=QUIET, check=True, capture_output=True)
    return time.perf_counter() - start


@pytest.mark.parametrize("name", PAIRS)
def test_ratio(name: str, benchmark: BenchmarkFixture) -> None:
    ours, bare = PAIRS[name]
    seconds(ours)
    seconds(bare)
    ratios = [seconds(ours) / seconds(bare) for _ in range(ROUNDS)]
    benchmark.extra_info["ratio"] = statistics.median(ratios)
    benchmark.pedantic(seconds, args=(ours,), rounds=3)
    print(f"\n{name}: {statistics.median(ratios):.2f} (from {min(ratios):.2f} to {max(ratios):.2f})")
