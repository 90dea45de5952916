"""Which trace is measured for which stage."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, NoReturn

from benchtool.errors import UsageError
from benchtool.frozen import frozen_record
from benchtool.model.capture import Capture, Role
from benchtool.model.quantity import Notice
from benchtool.timing import Shape, find_roles, find_shapes

if TYPE_CHECKING:
    from benchtool.model.design import Design, Stage


@frozen_record(eq=False)
class Lineup:
    """A capture with the shape and the role of each of its traces, in order."""

    capture: Capture
    shapes: tuple[Shape, ...]
    roles: tuple[Role, ...]


def line_up(capture: Capture) -> Lineup:
    """Look at every trace of a capture once, and tell what each is."""
    shapes = find_shapes(capture)
    return Lineup(capture=capture, shapes=shapes, roles=find_roles(shapes))


@frozen_record(eq=False)
class Target:
    """A trace to measure, the stage it belongs to, and the traces that go with it.

    Attributes:
        shape: The trace with what is known of it from finding its role.
        role: Its role.
        stage: The stage, where there is a design.
        trigger: The trace that triggers it, where there is one.
        supply: The trace of the supply, where there is one.
        warnings: What was assumed in choosing it.
    """

    shape: Shape
    role: Role
    stage: Stage | None = None
    trigger: Shape | None = None
    supply: Shape | None = None
    warnings: tuple[Notice, ...] = ()


def choose_targets(
    lineup: Lineup,
    *,
    channel: str | None = None,
    design: Design | None = None,
    stage: str | None = None,
) -> tuple[Target, ...]:
    """Return what is to be measured: a trace for each stage, or the one trace without a design.

    Args:
        lineup: The capture, its traces and their roles.
        channel: Name or number, from 1, of the trace that the user chose. A kept structure's
            channel counts where neither the user nor the design names one.
        design: The design, where there is one.
        stage: Name of the one stage to measure.

    Raises:
        UsageError: If a name is unknown, or several traces could be meant
            (``choose-channel``, ``no-such-channel``, ``no-such-stage``).
    """
    if design is None:
        return (_target(lineup, _pick(lineup, channel or lineup.capture.channel)),)
    stages = choose_stages(design, stage)
    if channel is not None and len(stages) > 1:
        raise UsageError(
            f"--channel names one trace and {design.source} has {len(stages)} stages",
            hint=f"Add --stage: {', '.join(item.name for item in stages)}.",
        )
    if len(stages) == 1 and not (stages[0].channel or stages[0].capacitor):
        channel = channel or lineup.capture.channel
    return tuple(_stage_target(lineup, item, channel, alone=len(stages) == 1) for item in stages)


def find_channel(capture: Capture, name: str) -> int:
    """Return the index of the trace called ``name``, or of number ``name`` counted from 1.

    Raises:
        UsageError: If there is none (``no-such-channel``); the hint lists those there are.
    """
    names = [trace.channel for trace in capture.traces]
    scope = next((f"{p.value}." for p in capture.structure if p.name == "scope"), "")
    for called in (name, name.removeprefix(scope)):  # a path may name the scope around all
        if called in names:
            return names.index(called)
    folded = [item.casefold() for item in names]
    if folded.count(name.casefold()) == 1:
        return folded.index(name.casefold())
    stem, bit = _stem_and_bit(name)
    alike = [i for i, item in enumerate(names) if _stem_and_bit(item)[0] == stem]
    if len(alike) == 1 and bit in ("", _stem_and_bit(names[alike[0]])[1]):
        return alike[0]
    if name.isdecimal() and 1 <= int(name) <= len(names):
        return int(name) - 1
    raise UsageError(
        f"{capture.origin.source} has no channel {name!r}",
        hint=f"It has: {', '.join(names[:16])}.",
        code="no-such-channel",
    )


def _stem_and_bit(name: str) -> tuple[str, str]:
    """Return a signal's own name without its scope, and the index of its bit where it has one."""
    stem, _, bit = name.rpartition(".")[2].partition("[")
    return stem.strip().casefold(), bit.rstrip("] ")


def choose_stages(design: Design, name: str | None) -> tuple[Stage, ...]:
    """Return all stages, or the one called ``name``.

    Raises:
        UsageError: If there is none of that name (``no-such-stage``).
    """
    if name is None:
        return design.stages
    chosen = tuple(item for item in design.stages if item.name == name)
    if not chosen:
        known = ", ".join(item.name for item in design.stages)
        raise UsageError(
            f"{design.source} has no stage {name!r}", hint=f"It has: {known}.", code="no-such-stage"
        )
    return chosen


def choose_one_stage(design: Design | None, name: str | None, why: str) -> Stage | None:
    """Return the one stage that is meant, None without a design.

    Args:
        design: The design, where there is one.
        name: Name of the stage, where it was given.
        why: Why there can be but one, as the end of "... has 3 stages".

    Raises:
        UsageError: As ``choose_stages``; or if several could be meant (``choose-stage``).
    """
    if design is None:
        return None
    stages = choose_stages(design, name)
    if len(stages) > 1:
        raise UsageError(
            f"{design.source} has {len(stages)} stages {why}",
            hint=f"Give --stage: {', '.join(item.name for item in stages)}.",
            code="choose-stage",
        )
    return stages[0]


def _stage_target(lineup: Lineup, stage: Stage, channel: str | None, *, alone: bool) -> Target:
    wanted = channel if channel is not None else _named(lineup.capture, stage)
    try:
        if wanted is None and not alone:
            _refuse_unnamed(lineup.capture, stage)
        return _target(lineup, _pick(lineup, wanted), stage)
    except UsageError:
        # a lone output is taken whatever the instrument called it, but never without a word
        if channel is not None or not alone or not _lone_output(lineup.roles):
            raise
    index = _pick(lineup, None)
    found = lineup.capture.traces[index].channel
    notice = Notice(
        code="assumed-channel",
        text=f"the design names {wanted!r}, the capture does not; {found!r} was measured",
    )
    return _target(lineup, index, stage, (notice,))


def _named(capture: Capture, stage: Stage) -> str | None:
    """Return the first trace that the design names and the capture has, else the first named."""
    named = [name for name in (stage.channel, stage.capacitor) if name]
    have = [trace.channel.casefold() for trace in capture.traces]
    there = [name for name in named if name.casefold() in have]
    return next(iter((*there, *named)), None)


def _refuse_unnamed(capture: Capture, stage: Stage) -> NoReturn:
    raise UsageError(
        f"stage {stage.name} names no channel and the design has several stages",
        hint=f'Write channel = "{capture.traces[0].channel}" into the design, or give --stage.',
        code="choose-channel",
    )


def _lone_output(roles: Sequence[Role]) -> bool:
    return roles.count("output") == 1 or len(roles) == 1


def _pick(lineup: Lineup, channel: str | None) -> int:
    """Return the chosen trace, the only output, the only capacitor node, or the only trace."""
    if channel is not None:
        return find_channel(lineup.capture, channel)
    for role in ("output", "capacitor"):
        found = [i for i, item in enumerate(lineup.roles) if item == role]
        if len(found) == 1:
            return found[0]
        if found:
            break
    if len(lineup.roles) == 1:
        return 0
    names = ", ".join(
        f"{trace.channel} ({role})"
        for trace, role in zip(lineup.capture.traces[:16], lineup.roles[:16], strict=True)
    )
    raise UsageError(
        f"{lineup.capture.origin.source} holds several traces that could be meant",
        hint=f"Give --channel: {names}.",
        code="choose-channel",
    )


def _target(
    lineup: Lineup,
    index: int,
    stage: Stage | None = None,
    warnings: tuple[Notice, ...] = (),
) -> Target:
    trigger = _companion(lineup, "trigger", stage.trigger if stage else None)
    return Target(
        shape=lineup.shapes[index],
        role=lineup.roles[index],
        stage=stage,
        trigger=trigger,
        supply=_companion(lineup, "supply", None) or _supply_of_silent(lineup, index, stage),
        warnings=warnings,
    )


def _companion(lineup: Lineup, role: Role, name: str | None) -> Shape | None:
    if name is not None:
        return lineup.shapes[find_channel(lineup.capture, name)]
    pairs = zip(lineup.shapes, lineup.roles, strict=True)
    found = [shape for shape, item in pairs if item == role]
    return found[0] if len(found) == 1 else None


def _supply_of_silent(lineup: Lineup, index: int, stage: Stage | None) -> Shape | None:
    """Return the one trace that comes up where a power-on output never answers.

    Its role is output, since nothing happens on another trace to tell it from one.
    """
    chosen = lineup.shapes[index].edges
    if stage is None or stage.topology != "power-on":
        return None
    if chosen is not None and chosen.times_s.size:
        return None
    others = [shape for i, shape in enumerate(lineup.shapes) if i != index]
    rising = [shape for shape in others if shape.comes_up_s is not None]
    return rising[0] if len(rising) == 1 else None
