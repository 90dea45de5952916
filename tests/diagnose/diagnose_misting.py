"""The invented misting controller's spacing stage, with faults, as evidence for the engine."""

from __future__ import annotations

from benchtool.circuits import apply_fault, circuit_at, predict
from benchtool.circuits.circuit import Circuit, with_fields
from benchtool.diagnose import diagnose
from benchtool.model.design import Band, Design, Ic, Part, Stage
from benchtool.model.diagnosis import Evidence, Observation, Reading, State
from benchtool.model.quantity import Measured
from benchtool.model.timing import Timing


def make_stage(ra_ohm: float = 100e3, rb_ohm: float = 330e3, c_f: float = 47e-6) -> Stage:
    parts = {
        "RA": Part(ref="RA", value=ra_ohm, lower_rel=-0.01, upper_rel=0.01, kind="film"),
        "RB": Part(ref="RB", value=rb_ohm, lower_rel=-0.01, upper_rel=0.01, kind="film"),
        "C": Part(ref="C", value=c_f, lower_rel=-0.05, upper_rel=0.05, kind="electrolytic"),
    }
    return Stage(name="spacing", topology="astable", parts=parts, ic=Ic(family="cmos"))


def make_design(stage: Stage, supply_v: float = 12.0) -> Design:
    band = Band(nominal=supply_v, lower=supply_v, upper=supply_v)
    return Design(name="Mist valve timer", supply=band, stages=(stage,))


STAGE = make_stage()
DESIGN = make_design(STAGE)
BOARD = circuit_at(STAGE, DESIGN)


def faulty(*faults: tuple[str, float | None], board: Circuit = BOARD) -> Circuit:
    for name, size in faults:
        board = apply_fault(name, board, size)
    return board


def seconds(value: object, u_rel: float = 5e-4) -> Measured:
    return Measured(value=float(value), u=float(value) * u_rel, unit="s")  # type: ignore[arg-type]


def timing_of(board: Circuit, *names: str) -> Timing:
    times = predict(board)
    wanted = names or ("t_high", "t_low")
    return Timing(**{name: seconds(getattr(times, name)) for name in wanted})


def capture(board: Circuit, role: str = "main", *names: str, **extra: object) -> Observation:
    return Observation(role=role, timing=timing_of(board, *names), **extra)


def evidence_of(board: Circuit, *readings: Reading, captures: tuple = ()) -> Evidence:
    return Evidence(observations=(capture(board), *captures), readings=readings)


def at_rest(state: State, *readings: Reading) -> Evidence:
    return Evidence(observations=(Observation(state=state),), readings=readings)


def control_pin(volt: float) -> Reading:
    return Reading(kind="control-pin", value=volt, u=0.003 * volt, unit="V")


def part(ref: str, value: float, unit: str = "ohm", way: str = "isolated") -> Reading:
    return Reading(kind="part", part=ref, value=value, u=0.005 * value, unit=unit, way=way)


def with_shunt(board: Circuit, ohm: float) -> Circuit:
    return with_fields(board, {"shunt_ohm": 1 / (1 / board.shunt_ohm + 1 / ohm)})


def answer(evidence, stage=STAGE, design=DESIGN, **how):
    return diagnose(evidence, stage, design, **how)


def weigh(evidence, stage=STAGE, design=DESIGN, **how):
    """Return the answer without the search for what to measure next."""
    return diagnose(evidence, stage, design, costs={}, **how)


def chance(found, fault):
    return sum(item.probability for item in found.suspects if item.fault == fault)


def all_sum(found):
    return sum(item.probability for item in found.suspects)
