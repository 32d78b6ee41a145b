"""The review as a whole, and the table of devices."""

from __future__ import annotations

from msgspec import Struct

from tauledger.record.budget import Budget, InductorFacts, MillerCurves, NodeRow, PartRow, PoleFacts, Stage, ZeroFacts
from tauledger.record.circuit import (
    AddedPart,
    DeviceFacts,
    DriveFacts,
    EngineFacts,
    MovedFigure,
    NetlistFacts,
    OutputFacts,
    SetValue,
    SourceLine,
)
from tauledger.record.estimates import CauseFacts, Estimate, Help, NoMethod, NoteFacts, PaperFigure, Step
from tauledger.record.feedback import LoopCurve, LoopFacts
from tauledger.record.measured import CurveFacts
from tauledger.record.ports import ImpedanceFacts, LargeSignal, ModesFacts, OutputRow
from tauledger.record.response import AgreementFacts, AtFacts, Curves, EdgeFacts, MidbandFacts, PeakFacts
from tauledger.record.unity import PhaseBudget, UnityFacts, WantFacts

SCHEMA = "tauledger.review/1"
DEVICES_SCHEMA = "tauledger.devices/1"


class Review(Struct, frozen=True):
    """One review of one netlist under one condition."""

    schema: str
    tauledger: str
    engine: EngineFacts | None
    netlist: NetlistFacts
    temperature_c: float
    drive: tuple[DriveFacts, ...]
    output: OutputFacts
    midband: MidbandFacts
    agreement: AgreementFacts | None
    f_high: EdgeFacts | None
    f_low: EdgeFacts | None
    estimates: tuple[Estimate, ...]
    steps: tuple[Step, ...]
    nodes: tuple[NodeRow, ...]
    parts: tuple[PartRow, ...]
    budget: Budget
    poles: tuple[PoleFacts, ...]
    zeros: tuple[ZeroFacts, ...]
    stages: tuple[Stage, ...]
    devices: tuple[DeviceFacts, ...]
    curves: Curves | None
    lines: tuple[SourceLine, ...]
    causes: tuple[CauseFacts, ...]
    notes: tuple[NoteFacts, ...]
    cautions: tuple[str, ...] = ()
    paper: tuple[PaperFigure, ...] = ()
    settings: tuple[SetValue, ...] = ()
    moved: tuple[MovedFigure, ...] = ()
    helps: tuple[Help, ...] = ()
    curve: CurveFacts | None = None
    large_signal: LargeSignal | None = None
    outputs: tuple[OutputRow, ...] = ()
    modes: ModesFacts | None = None
    impedances: tuple[ImpedanceFacts, ...] = ()
    added: tuple[AddedPart, ...] = ()
    f_unity: UnityFacts | None = None
    at: tuple[AtFacts, ...] = ()
    peaking: tuple[PeakFacts, ...] = ()
    phase_budget: PhaseBudget | None = None
    wants: tuple[WantFacts, ...] = ()
    loops: tuple[LoopFacts, ...] = ()
    loop_curves: tuple[LoopCurve, ...] = ()
    miller: MillerCurves | None = None
    inductors: tuple[InductorFacts, ...] = ()
    no_method: tuple[NoMethod, ...] = ()


class DevicesTable(Struct, frozen=True):
    """Every transistor and diode at its operating point, and the notes that it calls for."""

    schema: str
    tauledger: str
    engine: EngineFacts
    netlist: NetlistFacts
    temperature_c: float
    devices: tuple[DeviceFacts, ...]
    notes: tuple[NoteFacts, ...]
