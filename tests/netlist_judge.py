"""The engine as judge of the reader: ngspice on the original file against ngspice on a flat deck of our circuit.

The flat deck is written here, not by the engine room, so that a fault of the reader cannot hide behind one of its own.
"""

from __future__ import annotations

import cmath
import subprocess
from collections.abc import Mapping
from pathlib import Path

from tauledger.circuit import Circuit, fold

# Looser settings let equal circuits differ by 1e-3.
TIGHT = "option reltol=1e-6 abstol=1e-14 vntol=1e-9 chgtol=1e-16"
SWEEP = "ac dec 2 10 1g"

Raw = Mapping[str, list[complex]]


def judged(path: Path, circuit: Circuit) -> float:
    """Give the largest difference between both readings, over all nodes, relative to the largest value of each run.

    Every node of the circuit must exist in ngspice's reading of the original file, and no other.
    """
    folder = path.parent
    original = answers(folder, path)
    flat_path = folder / "flat.cir"
    flat_path.write_text(flat_deck(circuit))
    flat = answers(folder, flat_path)
    worst = 0.0
    for theirs, ours in zip(original, flat, strict=True):
        nodes = {name for name in theirs if not name.endswith("#branch") and name != "frequency"}
        assert nodes == {fold(name) for name in circuit.nodes[1:]}
        scale = max(1e-30, *(abs(value) for values in theirs.values() for value in values))
        for number, name in enumerate(circuit.nodes[1:], 1):
            pairs = zip(theirs[fold(name)], ours[f"n{number}"], strict=True)
            worst = max(worst, *(abs(a - b) / max(abs(a), 1e-6 * scale) for a, b in pairs))
        for number, element in enumerate(circuit.elements):
            if element.letter == "V" and "." not in element.name:
                pairs = zip(theirs[f"{fold(element.name)}#branch"], ours[f"v{number}#branch"], strict=True)
                worst = max(worst, *(abs(a - b) / max(abs(a), 1e-12) for a, b in pairs))
    return worst


def flat_deck(circuit: Circuit) -> str:
    """Write a circuit as a flat deck with generated names."""
    lines = ["flat"]
    passives = circuit.passives
    for k in range(len(passives)):
        lines.append(f"{passives.kind[k]}{k} n{passives.a[k]} n{passives.b[k]} {float(passives.value[k])!r}")
    driven = {source.source: source.amplitude for source in circuit.drive}
    models = {model.name: f"m{number}" for number, model in enumerate(circuit.models)}
    for number, element in enumerate(circuit.elements):
        head = f"{element.letter}{number} {' '.join(f'n{node}' for node in element.nodes)}"
        if element.letter in "VI":
            amplitude = driven.get(element.name, 0.0)
            degrees = cmath.phase(amplitude) * 180.0 / cmath.pi
            lines.append(f"{head} dc {element.parameter('dc', 0.0)!r} ac {abs(amplitude)!r} {degrees!r}")
        elif element.letter == "G":
            lines.append(f"{head} {element.parameter('gain', 0.0)!r}")
        else:
            settings = (name if name == "off" else f"{name}={value!r}" for name, value in element.parameters)
            lines.append(f"{head} {models[element.model]} {' '.join(settings)}")
    for model in circuit.models:
        settings = (f"{name}={value!r}" for name, value in model.parameters)
        lines.append(f".model {models[model.name]} {model.type} ({' '.join(settings)})")
    options = " ".join(f"{name}={value!r}" for name, value in circuit.options)
    lines.append(f".options temp={circuit.temperature_c!r} tnom={circuit.tnom_c!r} {options}")
    return "\n".join(lines).replace(" n0", " 0") + "\n.end\n"


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
