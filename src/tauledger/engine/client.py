"""The parent's side of the engine: start the worker, ask it for an operating point and a sweep, end it in time."""

from __future__ import annotations

import math
import os
import shutil
import signal
import site
import subprocess
import sys
import tempfile
import time
from collections.abc import Sequence
from pathlib import Path
from types import TracebackType
from typing import TYPE_CHECKING

from tauledger.engine.protocol import DeadlinePassed, Message, receive, send
from tauledger.errors import EngineError, EngineMissing, EngineTimeout

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import NDArray

    from tauledger.circuit import Circuit
    from tauledger.engine.deck import Deck
    from tauledger.engine.grid import Grid
    from tauledger.solution import Bias, Isolation, Observation, Samples, Sweep

INSTALL_HINT = (
    "install it: Debian, Ubuntu: apt install libngspice0; "
    "Fedora: dnf install libngspice; macOS: brew install libngspice"
)
INERT = "* nothing is set here\n"
LOG = "worker.log"
TELL_AT_MOST = 6
# Instances measured in one run: beyond this ngspice's own time per instance grows again.
TOGETHER = 200
# Complex numbers in one answer.
ANSWER_SIZE = 200_000
PACKAGE_ROOT = Path(__file__).resolve().parents[2]


def start_engine(*, library: str | None = None, timeout_s: float = 60.0) -> Engine:
    """Start the worker process and return at once, while it comes up.

    library: path or name of the ngspice library; else $NGSPICE_LIBRARY_PATH, else the system's own.
    timeout_s: how long one request may take. A library that cannot be used shows at the first request.
    Raises EngineError where no process can be started.
    """
    library = library or os.environ.get("NGSPICE_LIBRARY_PATH") or ""
    if os.sep in library:
        library = str(Path(library).absolute())
    folder = Path(tempfile.mkdtemp(prefix="tauledger-"))
    for name in (".spiceinit", "spinit"):
        (folder / name).write_text(INERT)
    request_read, request_write = os.pipe()
    reply_read, reply_write = os.pipe()
    command = [sys.executable, "-P", "-m", "tauledger.engine.worker"]
    try:
        with (folder / LOG).open("wb") as log:
            process = subprocess.Popen(
                [*command, str(request_read), str(reply_write), str(folder), library],
                stdin=subprocess.DEVNULL,
                stdout=log,
                stderr=log,
                pass_fds=(request_read, reply_write),
                cwd=folder,
                env=_environment(folder),
                start_new_session=True,
            )
    except OSError as error:
        os.close(request_write)
        os.close(reply_read)
        shutil.rmtree(folder, ignore_errors=True)
        raise EngineError(f"the engine's process cannot be started: {error.strerror}") from error
    finally:
        os.close(request_read)
        os.close(reply_write)
    return Engine(process, request_write, reply_read, folder, library, timeout_s)


class Engine:
    """One worker; a context manager that ends it. `bias` loads a circuit, `sweep` answers for the one loaded.

    One thread at a time may ask. An interrupt while it works ends the worker.
    """

    def __init__(
        self, process: subprocess.Popen[bytes], request: int, reply: int, folder: Path, library: str, timeout_s: float
    ) -> None:
        self._process = process
        self._request = request
        self._reply = reply
        self._folder = folder
        self._library = library
        self._timeout_s = timeout_s
        self._version = ""
        self._open = True
        self._loaded: tuple[Circuit, Deck] | None = None
        self._saved = False
        # A measurement of one instance puts its own deck in the place of the circuit's.
        self._displaced = False

    def __enter__(self) -> Engine:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self.close()

    @property
    def pid(self) -> int:
        """Process number of the worker, which leads its own session and group."""
        return self._process.pid

    def close(self) -> None:
        """End the worker and remove its private folder; harmless when repeated."""
        if not self._open:
            return
        self._open = False
        if self._process.poll() is None:
            os.killpg(self._process.pid, signal.SIGKILL)
        self._process.wait()
        os.close(self._request)
        os.close(self._reply)
        shutil.rmtree(self._folder, ignore_errors=True)

    def bias(self, circuit: Circuit, observations: Sequence[Observation]) -> Bias:
        """Solve the operating point of a circuit and read what the device families want to know.

        Raises EngineError (rejected, not converged, no unique solution: with the node's name), EngineMissing,
        EngineTimeout. Where ngspice converges with its default tolerances alone, the result carries a warning.
        """
        from tauledger.engine.deck import write_deck

        self._loaded = None
        try:
            return self._bias(circuit, observations, write_deck(circuit), ())
        except _NotConverged:
            relaxed = ("ngspice found the operating point with its default tolerances only (reltol 1e-3)",)
        try:
            return self._bias(circuit, observations, write_deck(circuit, tight=False), relaxed)
        except _NotConverged as error:
            raise EngineError(error.message, error.hint, error.engine_says) from error

    def operating_point(self, circuit: Circuit) -> Bias:
        """Solve the operating point with all that the device families want to know, instances measured alone included.

        Raises what `bias` and `isolate` raise; InputError where no family takes an element.
        """
        from msgspec.structs import replace

        from tauledger.devices.catalogue import isolations, observations

        bias = self.bias(circuit, observations(circuit))
        wanted = isolations(circuit, bias)
        if not wanted:
            return bias
        found = self.isolate_all(circuit, wanted)
        return replace(bias, samples={samples.element: samples for samples in found})

    def _bias(
        self, circuit: Circuit, observations: Sequence[Observation], deck: Deck, warnings: tuple[str, ...]
    ) -> Bias:
        import numpy as np

        from tauledger.circuit import fold
        from tauledger.engine.deck import has_branch_current
        from tauledger.engine.verdict import judge
        from tauledger.solution import Bias, EngineIdentity

        passives = circuit.passives
        branches = [name for name, kind in zip(passives.name, passives.kind, strict=True) if kind == "L"]
        branches += [element.name for element in circuit.elements if has_branch_current(element)]
        models = {fold(element.name): fold(element.model) for element in circuit.elements}
        devices = [
            (deck.elements[fold(o.element)], list(o.readings), list(o.optional), models.get(fold(o.element), ""))
            for o in observations
        ]
        vectors = [*deck.nodes[1:], *(f"{deck.elements[fold(name)]}#branch" for name in branches)]
        answer = self._ask({"do": "bias", "deck": deck.text, "vectors": vectors, "readings": devices})

        values, readings = answer["vectors"], answer["readings"]
        has_result = all(_finite(value) for value in values)
        verdict = judge(answer["load"], answer["run"], has_result=has_result, names=deck.says)
        says = verdict.says[:TELL_AT_MOST]
        match verdict.state:
            case "dead":
                self.close()
                raise EngineError("ngspice gave up on the circuit and cannot go on", engine_says=says)
            case "rejected":
                raise EngineError("ngspice rejected the circuit", engine_says=says)
            case "singular":
                raise _no_unique_solution(verdict.nodes, says)
            case "failed":
                raise _NotConverged("ngspice found no operating point", CONVERGENCE_HINT, says)
        read: dict[str, dict[str, float]] = {}
        for observation, found in zip(observations, readings, strict=True):
            every = dict(zip((*observation.readings, *observation.optional), found, strict=True))
            for name in observation.readings:
                if not _finite(every[name]):
                    raise EngineError(f"ngspice {self._version} gives no {name} for {observation.element}")
            read[observation.element] = {name: value for name, value in every.items() if _finite(value)}
        self._loaded, self._saved, self._displaced = (circuit, deck), False, False
        return Bias(
            voltages=np.array([0.0, *values[: len(deck.nodes) - 1]]),
            currents=dict(zip(branches, values[len(deck.nodes) - 1 :], strict=True)),
            readings=read,
            engine=EngineIdentity("ngspice", self._version),
            stepped=verdict.state == "stepped",
            warnings=(*warnings, *says),
        )

    def sweep(self, frequency_hz: NDArray[np.float64] | Sequence[float]) -> Sweep:
        """Solve the AC response of the loaded circuit's output at these frequencies (n_freq,) in Hz, in their order.

        Any list will do. One that `grid.decades` laid out is a single run, and so is a long one that is evenly
        spaced; any other is one run per frequency, exact at the frequency asked. The sweep holds the engine's own
        frequencies, equal to those asked within 1e-9.
        Raises EngineError, EngineTimeout; ValueError where a frequency is not above zero or no circuit is loaded.
        """
        import numpy as np

        from tauledger.engine.grid import GRID_TOLERANCE, plan, singly

        if self._loaded is None:
            raise ValueError("no circuit is loaded: ask for the operating point first")
        asked = np.atleast_1d(np.asarray(frequency_hz, dtype=float))
        if not (len(asked) and np.all(np.isfinite(asked)) and np.all(asked > 0.0)):
            raise ValueError("frequencies must be finite and above zero")
        grids = plan(asked)
        found = self._run(grids)
        if len(found.frequency_hz) != len(asked) and len(grids) == 1:
            # Another version of ngspice may lay out its grid otherwise; single frequencies are the same in all.
            found = self._run(singly(asked))
        if len(found.frequency_hz) != len(asked) or np.max(np.abs(found.frequency_hz / asked - 1.0)) > GRID_TOLERANCE:
            raise EngineError("ngspice solved other frequencies than those asked for")
        if not np.all(np.isfinite(found.response)):
            raise EngineError("ngspice's AC response is not finite")
        return found

    def isolate(self, circuit: Circuit, isolation: Isolation) -> Samples:
        """Measure one instance alone: terminal admittance and inner nodes' voltages at the frequencies asked.

        The instance has its own model, the circuit's options and temperature, and stands at the voltages given. The
        circuit that was loaded stays the one that `sweep` answers for.
        Raises EngineError (rejected, no operating point, no AC response), EngineTimeout; ValueError where voltages do
        not fit to the terminals.
        """
        return self.isolate_all(circuit, (isolation,))[0]

    def isolate_all(self, circuit: Circuit, isolations: Sequence[Isolation]) -> tuple[Samples, ...]:
        """Measure instances alone, those with the same frequencies in one run; raises what `isolate` raises."""
        groups: dict[tuple[float, ...], list[Isolation]] = {}
        for isolation in isolations:
            groups.setdefault(isolation.frequency_hz, []).append(isolation)
        found: dict[str, Samples] = {}
        for frequencies, together in groups.items():
            most = max(len(i.driven or i.voltages) * (len(i.voltages) + len(i.inner)) for i in together)
            count = min(TOGETHER, max(1, ANSWER_SIZE // (most * len(frequencies))))
            for first in range(0, len(together), count):
                some = together[first : first + count]
                try:
                    found |= {answer.element: answer for answer in self._isolate(circuit, some)}
                except EngineError:
                    if len(some) == 1 or not self._open:
                        raise
                    # one of them has no answer: asked one by one, the message names it
                    for alone in some:
                        found |= {answer.element: answer for answer in self._isolate(circuit, [alone])}
        return tuple(found[isolation.element] for isolation in isolations)

    def _isolate(self, circuit: Circuit, isolations: Sequence[Isolation]) -> list[Samples]:
        from tauledger.engine.alone import answered, bench, question

        made = bench(circuit, isolations)
        self._displaced = True
        return answered(made, self._ask(question(made)))

    def _run(self, grids: Sequence[Grid]) -> Sweep:
        """Run AC grids on the loaded circuit; the sweep holds whatever frequencies the engine laid out."""
        import numpy as np

        from tauledger.engine.verdict import judge
        from tauledger.solution import Sweep

        assert self._loaded is not None
        circuit, deck = self._loaded
        vectors = _output_vectors(circuit, deck)
        request = {
            "do": "sweep",
            "deck": deck.text if self._displaced else "",
            "save": self._displaced or not self._saved,
            "vectors": [name for name, _ in vectors],
        }
        answers = self._ask({**request, "grids": [(g.points, g.start_hz, g.stop_hz, g.count) for g in grids]})[
            "answers"
        ]
        self._saved, self._displaced = True, False
        frequency: list[np.ndarray] = []
        response: list[np.ndarray] = []
        for answer in answers:
            columns = [answer["frequency"], *answer["vectors"]]
            verdict = judge((), answer["run"], has_result=all(columns), names=deck.says)
            if verdict.state not in ("sound", "stepped"):
                raise EngineError("ngspice gave no AC response", engine_says=verdict.says[:TELL_AT_MOST])
            at, *values = (np.array(column).view(complex) for column in columns)
            frequency.append(at.real)
            response.append(sum((sign * v for (_, sign), v in zip(vectors, values, strict=True)), np.zeros_like(at)))
        return Sweep(np.concatenate(frequency), np.concatenate(response))

    def _ask(self, request: Message) -> Message:
        if not self._open:
            raise EngineError("the engine was ended")
        deadline = time.monotonic() + self._timeout_s
        try:
            if not self._version:
                self._greet(deadline)
            send(self._request, request)
            answer = receive(self._reply, deadline)
        except BrokenPipeError:
            answer = None
        except DeadlinePassed as error:
            self.close()
            raise EngineTimeout(
                f"ngspice did not answer within {self._timeout_s:g} s and was ended",
                "allow it more time, or look for what keeps the circuit from settling",
            ) from error
        except KeyboardInterrupt:
            # the answer that is still to come would be read as that of the next request
            self.close()
            raise
        if answer is None:
            raise self._ended()
        return answer

    def _greet(self, deadline: float) -> None:
        hello = receive(self._reply, deadline)
        if hello is None:
            raise self._ended()
        if "missing" in hello:
            self.close()
            if self._library:
                raise EngineMissing(
                    f"{self._library} cannot be used as the ngspice library", INSTALL_HINT, (hello["missing"],)
                )
            raise EngineMissing("the ngspice library is not installed", INSTALL_HINT, (hello["missing"],))
        self._version = hello["version"]

    def _ended(self) -> EngineError:
        """End what is left of the worker and say how it went, with the last line of its log."""
        log = self._folder / LOG
        last = log.read_text(errors="replace").splitlines()[-1:] if log.exists() else []
        self.close()
        return EngineError(
            "the engine's process ended by itself", f"exit status {self._process.returncode}", engine_says=tuple(last)
        )


CONVERGENCE_HINT = "look at supplies, polarities and values: the circuit may have no state of rest"


class _NotConverged(EngineError):
    """No operating point with these tolerances."""


def _no_unique_solution(nodes: tuple[str, ...], says: tuple[str, ...]) -> EngineError:
    if not nodes:
        return EngineError("ngspice found no unique operating point", CONVERGENCE_HINT, says)
    return EngineError(
        f"the operating point is not determined: look at {', '.join(nodes)}",
        "every node needs a DC path to ground, and no loop may hold voltage sources and inductors alone",
    )


def _output_vectors(circuit: Circuit, deck: Deck) -> list[tuple[str, float]]:
    """List the engine's vectors whose signed sum is the circuit's output."""
    from tauledger.circuit import GROUND, fold

    port = circuit.output
    if port.kind == "current":
        return [(f"{deck.elements[fold(port.through)]}#branch", 1.0)]
    at = {fold(name): made for name, made in zip(circuit.nodes, deck.nodes, strict=True)}
    ends = ((port.plus, 1.0), (port.minus, -1.0))
    return [(at[fold(node)], sign) for node, sign in ends if node != GROUND]


def _finite(value: float | None) -> bool:
    return value is not None and math.isfinite(value)


def _environment(folder: Path) -> dict[str, str]:
    """Build the worker's environment from scratch: nothing that ngspice or Python could take a file from."""
    return {
        "PATH": os.defpath,
        "LC_ALL": "C",
        "HOME": str(folder),
        "TMPDIR": str(folder),
        "SPICE_SCRIPTS": str(folder),
        "PYTHONPATH": str(PACKAGE_ROOT),
        "PYTHONUSERBASE": site.getuserbase(),
        "OPENBLAS_NUM_THREADS": "1",
        "OMP_NUM_THREADS": "1",
    }
