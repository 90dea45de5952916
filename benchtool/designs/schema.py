"""The design file's shape: its stages by topology, and the tables beside them."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from typing import Annotated, Any, Literal, get_args

from pydantic import Discriminator, Tag

from benchtool.designs import fields as f
from benchtool.designs import values
from benchtool.designs.fields import Table, about
from benchtool.designs.lines import Path
from benchtool.designs.tables import Capacitor, Ic, LimitsTable, Resistor, SchmittIc
from benchtool.designs.vocabulary import nearest
from benchtool.model.design import RuleName, TopologyName

_CIRCUIT = "the circuit: astable, astable-diode, output-fed, one-shot, schmitt or power-on"


class StageTable(Table):
    """What every topology takes."""

    topology: TopologyName = about(_CIRCUIT, "astable")
    C: Capacitor = about("timing capacitor", "47u 10%")
    ic: Ic | None = about("timing IC", "cmos", default=None)
    channel: f.Name | None = about("name of the output's trace", "OUT", default=None)
    capacitor: f.Name | None = about("name of the capacitor node's trace", "CAP", default=None)
    trigger: f.Name | None = about("name of the trigger's trace", "TRIG", default=None)
    active: Literal["high", "low"] = about("state that begins a cycle", "high", default="high")
    divide: int = about("the output counts so many cycles", 1, default=1, ge=1)
    leak: f.Ohm | None = about("leak at the timing node", "10M", default=None)
    leak_to: f.SignedVolt | None = about("rail of the leak in volts", "12 V", default=None)
    limits: LimitsTable | None = about("what is judged", {"derive": "worst-case"}, default=None)


class TwoResistorStage(StageTable):
    """Charge through RA, discharge through RB."""

    RA: Resistor = about("resistor from the supply to the discharge pin", "100k 1%")
    RB: Resistor = about("resistor from the discharge pin to the capacitor", "330k 1%")
    control: f.Volt | None = about("forced control pin in volts", "8 V", default=None)


class AstableStage(TwoResistorStage):
    """Charge through both resistors, discharge through RB."""

    topology: Literal["astable"] = about(_CIRCUIT, "astable")


class DiodeStage(TwoResistorStage):
    """The astable with a steering diode across RB."""

    topology: Literal["astable-diode"] = about(_CIRCUIT, "astable-diode")
    diode_drop: f.VoltOrZero | None = about("steering diode", "0.6 V", default=None)
    series_diode_drop: f.VoltOrZero | None = about("in series with RB", "0.6 V", default=None)


class TimerStage(StageTable):
    """One resistor and a timer IC."""

    topology: Literal["output-fed", "one-shot"] = about(_CIRCUIT, "one-shot")
    R: Resistor = about("timing resistor", "330k 1%")
    control: f.Volt | None = about("forced control pin in volts", "8 V", default=None)


class PowerOnStage(StageTable):
    """A delay after power-up."""

    topology: Literal["power-on"] = about(_CIRCUIT, "power-on")
    R: Resistor = about("timing resistor", "330k 1%")


class SchmittStage(StageTable):
    """One resistor round a Schmitt inverter."""

    topology: Literal["schmitt"] = about(_CIRCUIT, "schmitt")
    R: Resistor = about("timing resistor", "330k 1%")
    ic: SchmittIc = about(
        "thresholds of the inverter",
        {"upper_threshold": "60%", "lower_threshold": "40%", "u_threshold": "5%"},
    )


STAGES: Mapping[str, type[StageTable]] = {
    "astable": AstableStage,
    "astable-diode": DiodeStage,
    "output-fed": TimerStage,
    "one-shot": TimerStage,
    "schmitt": SchmittStage,
    "power-on": PowerOnStage,
}


def stage_topology(raw: object) -> str:
    """Return the topology whose keys a stage is held to, even where its own is misspelt."""
    table = raw if isinstance(raw, Mapping) else {}
    stated = table.get("topology")
    if isinstance(stated, str) and (
        near := stated if stated in STAGES else nearest(stated, STAGES)
    ):
        return near
    return "one-shot" if "R" in table and "RA" not in table else "astable"


def _stage_tag(raw: object) -> str:
    return STAGES[stage_topology(raw)].__name__


Stage = Annotated[
    Annotated[AstableStage, Tag("AstableStage")]
    | Annotated[DiodeStage, Tag("DiodeStage")]
    | Annotated[TimerStage, Tag("TimerStage")]
    | Annotated[PowerOnStage, Tag("PowerOnStage")]
    | Annotated[SchmittStage, Tag("SchmittStage")],
    Discriminator(_stage_tag),
]


class BoardTable(Table):
    """The board and its supply."""

    name: f.Name = about("what the board is called", "Mist valve timer")
    assembly: f.Name | None = about("assembly number", "GH-MV-07", default=None)
    revision: f.Name | None = about("revision", "C", default=None)
    serial_pattern: f.Pattern | None = about(
        "regular expression of a serial number", "^MV7-[0-9]{6}$", default=None
    )
    supply: f.Supply = about("supply in volts with its half-width or range", "12 V 5%")
    temperature: f.Temperature = about(
        "board temperature or its range", "10 .. 40 degC", default=values.read_temperature(25)
    )


class DecisionTable(Table):
    """The rule by which a measured value is held against its limits."""

    rule: RuleName = about("decision rule", "guarded", default="guarded")
    guard: float = about(
        "guard band as a multiple of U", 1.0, default=1.0, ge=0, allow_inf_nan=False
    )
    coverage: f.Coverage = about("coverage probability of U", 0.95, default=0.95)


class InstrumentTable(Table):
    """What is known of the instrument."""

    timebase: f.Share | None = about("half-width of its timebase error", "50 ppm", default=None)
    jitter: f.Share | None = about(
        "jitter assumed where one interval is all there is", "0.1%", default=None
    )


class ProbeTable(Table):
    """The probe's load, and where it sits."""

    R: f.Ohm | None = about("resistance of the probe", "10M", default=None)
    C: f.FaradOrZero = about("capacitance of the probe", "12p", default=0.0)
    at: Literal["output", "capacitor"] = about("where it sits", "output", default="output")


_STAGE_EXAMPLE = {
    "spacing": {
        "topology": "astable",
        "RA": "100k 1%",
        "RB": "330k 1%",
        "C": "47u 10%",
        "ic": "cmos",
        "limits": {"derive": "worst-case"},
    }
}


class DesignTable(Table):
    """Design intent of a board timed by a resistor and a capacitor."""

    schema_: f.SchemaNumber = about("number of this structure", 1, alias="schema")
    board: BoardTable = about("the board", {"name": "Mist valve timer", "supply": "12 V 5%"})
    stage: dict[str, Stage] = about("the timed circuits by name", _STAGE_EXAMPLE, min_length=1)
    decision: DecisionTable = about(
        "decision rule", {"rule": "guarded", "guard": 1.0}, default=DecisionTable()
    )
    instrument: InstrumentTable = about(
        "instrument", {"timebase": "50 ppm"}, default=InstrumentTable()
    )
    probe: ProbeTable = about("probe", {"R": "10M", "C": "12p"}, default=ProbeTable())


def table_at(path: Sequence[str | int], document: Mapping[str, Any]) -> type[Table] | None:
    """Return the table to which the keys below ``path`` belong, None where there is none."""
    table: type[Table] | None = DesignTable
    for n, step in enumerate(path):
        if n == 1 and path[0] == "stage":
            table = STAGES[stage_topology(document["stage"][step])]
        elif table:
            table = _inner_table(table, str(step))
    return table


def known_keys(table: type[Table]) -> tuple[str, ...]:
    """Return the keys that a table takes, as the file writes them."""
    return tuple(info.alias or name for name, info in table.model_fields.items())


_PLAIN_TABLES = ("board", "decision", "instrument", "probe")


def homes_of(key: str, topology: str) -> tuple[Path, ...]:
    """Return the tables, in or beside a stage of the given topology, that take a key."""
    stage = STAGES[topology]
    tables: dict[Path, type[Table]] = {(): DesignTable, ("stage",): stage}
    tables |= {("stage", name): _inner(stage, name) for name in ("limits", "ic")}
    tables |= {(name,): _inner(DesignTable, name) for name in _PLAIN_TABLES}
    return tuple(path for path, table in tables.items() if key in known_keys(table))


def takers_of(key: str) -> tuple[str, ...]:
    """Return the topologies whose stages take a key."""
    return tuple(name for name, table in STAGES.items() if key in known_keys(table))


def _inner(table: type[Table], key: str) -> type[Table]:
    found = _inner_table(table, key)
    if found is None:
        raise KeyError(key)
    return found


def _inner_table(table: type[Table], key: str) -> type[Table] | None:
    """Return the table that a key holds, None for a key that holds a value."""
    info = table.model_fields.get(key)
    return next(_tables_in(info.annotation), None) if info else None


def _tables_in(annotation: object) -> Iterator[type[Table]]:
    if isinstance(annotation, type) and issubclass(annotation, Table):
        yield annotation
    for item in get_args(annotation):
        yield from _tables_in(item)
