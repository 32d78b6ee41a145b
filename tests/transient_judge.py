"""ngspice's transient analysis as judge: how fast the output moves when the input is thrown over."""

from __future__ import annotations

import re
import subprocess
from pathlib import Path


def slope(
    netlist: Path, folder: Path, *, source: str, pulse: str, start_v: float, end_v: float, stop_s: float
) -> float:
    """Give the mean slope in V/s of v(out) on its first way from `start_v` to `end_v`.

    source: the whole card of the source in the netlist; pulse: what stands in the place of its DC and AC values.
    """
    text = netlist.read_text(encoding="utf-8")
    assert source in text
    words = source.split()[:3]
    text = text.replace(source, f"{' '.join(words)} {pulse}")
    text = re.sub(r"\n\.(?:ac|print|end)\b.*", "", text)
    edge = "rise" if end_v > start_v else "fall"
    measure = f".meas tran way trig v(out) val={start_v} {edge}=1 targ v(out) val={end_v} {edge}=1"
    deck = folder / "thrown.cir"
    deck.write_text(f"{text}\n.tran {stop_s / 2000} {stop_s} 0 {stop_s / 2000}\n{measure}\n.end\n", encoding="utf-8")
    ran = subprocess.run(
        ["ngspice", "-n", "-b", str(deck)],
        capture_output=True,
        encoding="latin-1",
        timeout=20,
        cwd=folder,
        check=False,
    )
    found = re.search(r"^way\s*=\s*(\S+)", ran.stdout, re.MULTILINE)
    assert found, ran.stdout + ran.stderr
    return abs(end_v - start_v) / float(found.group(1))
