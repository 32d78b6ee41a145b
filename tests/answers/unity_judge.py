"""ngspice on the netlist as written, from its own command line: unity gain, margins and peaking out of a fine sweep."""

from __future__ import annotations

import subprocess
from pathlib import Path

import numpy as np
from msgspec import Struct
from numpy.typing import NDArray

from netlist_judge import TIGHT

# Between points so close a straight line in ln|H| over ln f is off by 1e-6.
POINTS_PER_DECADE = 1000


class Judged(Struct, frozen=True):
    """What the sweep says: frequency (k,) in Hz, complex output (k,) in V."""

    frequency_hz: NDArray[np.float64]
    output: NDArray[np.complex128]

    def level_hz(self, level: float) -> float:
        """Give the first frequency where the output falls to this level."""
        size = np.log(np.abs(self.output) / level)
        k = int(np.flatnonzero((size[:-1] >= 0.0) & (size[1:] < 0.0))[0])
        return self._between(k, size)

    def phase_beyond(self, reference: complex) -> NDArray[np.float64]:
        """Give the phase less that of the reference in degrees, continuous from the first point on, (k,)."""
        return np.asarray(np.degrees(np.unwrap(np.angle(self.output / reference))), dtype=np.float64)

    def turned_hz(self, reference: complex) -> float:
        """Give the first frequency where the phase beyond the reference is −180°."""
        left = self.phase_beyond(reference) + 180.0
        return self._between(int(np.flatnonzero(left < 0.0)[0]) - 1, left)

    def at(self, hz: float, values: NDArray[np.float64]) -> float:
        """Interpolate values (k,) over ln f."""
        return float(np.interp(np.log(hz), np.log(self.frequency_hz), values))

    def _between(self, k: int, values: NDArray[np.float64]) -> float:
        share = values[k] / (values[k] - values[k + 1])
        return float(self.frequency_hz[k] * (self.frequency_hz[k + 1] / self.frequency_hz[k]) ** share)


def judge(netlist: Path, folder: Path, output: str, start_hz: float, stop_hz: float) -> Judged:
    """Let ngspice sweep the netlist; output: an expression of its own language, "v(out)" or "v(outp)-v(outn)"."""
    data = folder / "sweep.txt"
    script = ["judge", ".control", "set noaskquit", "set wr_singlescale", "set numdgt=14", f"source {netlist}", TIGHT]
    script += [f"ac dec {POINTS_PER_DECADE} {start_hz:g} {stop_hz:g}", f"let taken = {output}"]
    script += [f"wrdata {data} real(taken) imag(taken)", "quit", ".endc", ".end"]
    wrapper = folder / "judge.sp"
    wrapper.write_text("\n".join(script) + "\n")
    ran = subprocess.run(
        ["ngspice", "-n", "-b", str(wrapper)], capture_output=True, encoding="latin-1", timeout=30, check=False
    )
    assert data.exists(), ran.stdout + ran.stderr
    table = np.loadtxt(data)
    return Judged(table[:, 0], table[:, 1] + 1j * table[:, 2])
