"""What the engine's lines and results mean, and the lines in the user's own names.

ngspice says harmless things on its error stream and stays silent on wrong ones, so a run is judged by its result and
by classes of lines together: rejected at loading, failed, without a unique solution, stepped, or sound.
"""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping
from typing import Literal

from msgspec import Struct

State = Literal["sound", "stepped", "failed", "singular", "rejected", "dead"]

_DEAD = re.compile(r"cannot recover|returned 1\b", re.I)
_SINGULAR = re.compile(r"singular matrix|not positive definite", re.I)
_CHECK = re.compile(r"check nodes?\s+(.*)", re.I)
# A pseudo-transient ("Transient op") that finishes leaves whatever the circuit had drifted to: no operating point.
_FAILED = re.compile(r"\baborted\b|check your input line|source stepping failed|transient op", re.I)
_STEPPED = re.compile(r"stepping completed", re.I)
_HARMLESS = re.compile(
    r"""^\s*$ | gmin\ stepping | gmin\ step | ^trying\ gmin | gmin\ increment | source\ step | ^supplies\ reduced
    | lossy\ line\ .*\ not\ given,\ assumed\ zero
    | has\ no\ value,\ dc\ 0\ assumed | dc\ value\ used\ for\ op | compatibility\ mode | using\ sparse | spinit
    | there\ is\ no\ circuit\ loaded | ^command\ 'remcirc'\ is\ ignored
    | ^checking\ parameters\ for | \bp[ds]\ =\ \S+\ is\ less\ than\ w""",
    re.I | re.X,
)
# A model parameter that this version of a model does not have; ngspice reads past it.
_IGNORED = re.compile(r"unrecognized parameter .* - ignored", re.I)
_ABOUT_A_MODEL = re.compile(r"model issue on line", re.I)
_NAME = re.compile(r"(?<![\w.#])([a-z]+\d+)(#\w+)?(?!\w)")
_INNER = {
    "#branch": "the current through {}",
    "#base": "{}'b",
    "#emitter": "{}'e",
    "#collector": "{}'c",
    "#collcx": "{}'c",
}


class Verdict(Struct, frozen=True):
    """The class of a run; says: the engine's lines worth telling; nodes: those it could not solve, user's names."""

    state: State
    says: tuple[str, ...]
    nodes: tuple[str, ...] = ()


def judge(load: Iterable[str], run: Iterable[str], *, has_result: bool, names: Mapping[str, str]) -> Verdict:
    """Judge one load and one run.

    load, run: the engine's lines as "stdout …" or "stderr …". has_result: the run left finite values.
    names: user's name by generated name.
    """
    load, run = tuple(load), tuple(run)
    text = "\n".join((*load, *run))
    told = [line for line in _errors(load) if not _IGNORED.search(line)]
    rejected = () if all(_ABOUT_A_MODEL.search(line) for line in told) else tuple(told)
    ignored = (line.split(" ", 1)[1] for line in load if _IGNORED.search(line))
    says = tuple(dict.fromkeys(translate(line, names) for line in (*rejected, *_errors(run), *ignored)))
    if _DEAD.search(text):
        return Verdict("dead", says)
    if rejected:
        return Verdict("rejected", says)
    if _SINGULAR.search(text):
        found = (match.group(1).strip() for line in run if (match := _CHECK.search(line)))
        nodes = tuple(dict.fromkeys(translate(name, names) for name in found))
        return Verdict("singular", says, nodes)
    if not has_result or _FAILED.search(text):
        return Verdict("failed", says)
    return Verdict("stepped" if _STEPPED.search(text) else "sound", says)


def translate(line: str, names: Mapping[str, str]) -> str:
    """Put the user's names back into one line of the engine."""

    def user_name(match: re.Match[str]) -> str:
        name, inner = match.group(1), match.group(2) or ""
        if name not in names:
            return match.group(0)
        return _INNER.get(inner.lower(), "{}" + inner).format(names[name]) if inner else names[name]

    return _NAME.sub(user_name, line)


def _errors(lines: Iterable[str]) -> tuple[str, ...]:
    said = (line.removeprefix("stderr ").strip() for line in lines if line.startswith("stderr"))
    return tuple(line for line in said if not _HARMLESS.search(line))
