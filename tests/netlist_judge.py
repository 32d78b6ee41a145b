"""The engine as judge of the reader: ngspice on the original file against ngspice on the flat deck that we write of it.

The flat deck comes from the netlist room, not from the engine's, so that neither hides a fault of the other.
"""

from __future__ import annotations

import subprocess
from collections.abc import Mapping
from pathlib import Path

from tauledger.circuit import Circuit, fold
from tauledger.netlist.writer import flat_netlist

# Looser settings let equal circuits differ by 1e-3.
TIGHT = "option reltol=1e-6 abstol=1e-14 vntol=1e-9 chgtol=1e-16"
SWEEP = "ac dec 2 10 1g"

Raw = Mapping[str, list[complex]]


def judged(path: Path, circuit: Circuit) -> float:
    """Give the largest difference between both readings, over all nodes, relative to the largest value of each run.

    Every node of the circuit must exist in ngspice's reading of the original file, and no other but those that it makes
    itself for tables and lines. Currents of voltage sources are compared where ngspice calls them alike: outside of
    definitions that stand in another one.
    """
    folder = path.parent
    original = answers(folder, path)
    flat_path = folder / "flat.cir"
    flat_path.write_text(flat_netlist(circuit), encoding="utf-8")
    flat = answers(folder, flat_path)
    worst = 0.0
    for theirs, ours in zip(original, flat, strict=True):
        nodes = {name for name in theirs if not name.endswith("#branch") and name != "frequency"}
        known = {fold(name) for name in circuit.nodes[1:]}
        assert known <= nodes
        assert all("#" in name or "_int" in name for name in nodes - known)
        scale = max(1e-30, *(abs(value) for values in theirs.values() for value in values))
        for name in circuit.nodes[1:]:
            pairs = zip(theirs[fold(name)], ours[fold(name)], strict=True)
            worst = max(worst, *(abs(a - b) / max(abs(a), 1e-6 * scale) for a, b in pairs))
        for element in circuit.elements:
            branch = f"{fold(element.name) if fold(element.name[0]) == 'v' else 'v.' + fold(element.name)}#branch"
            if element.letter == "V" and branch in theirs:
                pairs = zip(theirs[branch], ours[branch], strict=True)
                worst = max(worst, *(abs(a - b) / max(abs(a), 1e-12) for a, b in pairs))
    return worst


def answers(folder: Path, deck: Path) -> tuple[Raw, Raw]:
    """Let ngspice read a deck; give all vectors of its operating point and of an AC sweep."""
    script = ["judge", ".control", "set noaskquit", "set filetype=ascii", f"source {deck}", TIGHT]
    script += ["op", f"write {folder / 'op.raw'} all", SWEEP, f"write {folder / 'ac.raw'} all", "quit", ".endc", ".end"]
    wrapper = folder / "judge.sp"
    wrapper.write_text("\n".join(script) + "\n")
    for name in ("op.raw", "ac.raw"):
        (folder / name).unlink(missing_ok=True)
    ran = subprocess.run(
        ["ngspice", "-n", "-b", str(wrapper)],
        capture_output=True,
        encoding="latin-1",
        timeout=20,
        cwd=folder,
        check=False,
    )
    assert ran.stdout.count("No. of Data Rows") == 2, ran.stdout + ran.stderr
    assert "Error" not in ran.stderr, ran.stderr
    return raw_vectors(folder / "op.raw"), raw_vectors(folder / "ac.raw")


def raw_vectors(path: Path) -> Raw:
    """Read an ASCII raw file: every vector by name, "v(..)" and "i(..)" taken off."""
    head, _, body = path.read_text(encoding="latin-1").partition("Values:\n")
    lines = head.splitlines()
    first = lines.index("Variables:") + 1
    names = [line.split()[1] for line in lines[first:]]
    names = [
        name[2:-1] if name.startswith("v(") else f"{name[2:-1]}#branch" if name[:2] == "i(" else name for name in names
    ]
    numbers = [_number(line.split()[-1]) for line in body.splitlines() if line.strip()]
    return {name: numbers[k :: len(names)] for k, name in enumerate(names)}


def _number(text: str) -> complex:
    real, _, imaginary = text.partition(",")
    return complex(float(real), float(imaginary or 0.0))
