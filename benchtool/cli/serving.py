"""``benchtool simulate --serve``: a simulated board as an instrument, until it is interrupted."""

from __future__ import annotations

import sys
from typing import TYPE_CHECKING, Any

from benchtool.cli.exits import OK
from benchtool.cli.options import positive
from benchtool.errors import UsageError

if TYPE_CHECKING:
    from benchtool.model.design import Design, Stage
    from benchtool.simulation import Acquisition, Injected
    from benchtool_drivers.loopback.board import Trimmer

_UNITS = {"C": "F"}


def serve_stage(
    stage: Stage, design: Design, acquisition: Acquisition, fault: Injected, given: dict[str, Any]
) -> int:
    """Offer a stage as an instrument, and say how to reach it.

    Args:
        stage: The stage.
        design: Its design.
        acquisition: How each record is taken.
        fault: Its fault.
        given: ``serve``, ``port``, ``speaks``, ``trimmer``, ``pace`` and ``seed``.

    Raises:
        UsageError: If the offer cannot be made.
    """
    from benchtool_drivers.loopback.board import SimulatedBoard
    from benchtool_drivers.loopback.offering import Offer, offer_board

    if given["pace"] <= 0:
        raise UsageError("--pace must be greater than 0", hint="1 is as fast as in life.")
    board = SimulatedBoard(
        stage,
        design,
        acquisition,
        fault=fault,
        trimmer=_trimmer(given["trimmer"]),
        seed=given["seed"],
    )
    offer = Offer(
        way=given["serve"],
        family=given["speaks"],
        port=given["port"],
        pace=given["pace"],
        tick_hz=round(acquisition.rate_hz),
    )
    offer_board(board, offer, _announce)
    return OK


def _announce(name: str) -> None:
    sys.stdout.write(f"{name}\n")
    sys.stdout.flush()
    sys.stderr.write(
        f"A simulated instrument, all invented; Ctrl-C ends it. In another terminal:\n"
        f"  benchtool watch {name}\n  benchtool acquire {name} -o simulated.npz\n"
    )
    sys.stderr.flush()


def _trimmer(text: str | None) -> Trimmer | None:
    from benchtool_drivers.loopback.board import Trimmer

    if text is None:
        return None
    words = text.split()
    if len(words) != 4:
        raise UsageError(
            f"--trimmer wants a part, two values and a time, got {text!r}",
            hint='Such as --trimmer "RB 300k 360k 60s".',
        )
    ref, low, high, sweep = words
    unit = _UNITS.get(ref, "ohm")
    return Trimmer(
        ref=ref,
        low=positive("--trimmer", low, unit) or 0.0,
        high=positive("--trimmer", high, unit) or 0.0,
        sweep_s=positive("--trimmer", sweep, "s") or 1.0,
    )
