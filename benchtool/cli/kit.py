"""What the user's kit says of an instrument and a probe that are named on the command line."""

from __future__ import annotations

from datetime import UTC, datetime
from pathlib import Path

from benchtool.errors import UsageError
from benchtool.folder import user_folder
from benchtool.kit import find_instrument, find_probe, load_kit
from benchtool.model.design import Probe
from benchtool.model.kit import Kit, KitInstrument

NAME = "kit.toml"


def kit_path() -> Path | None:
    """Return where the user's kit stands; None for a user without a folder."""
    folder = user_folder()
    return folder and folder / NAME


def user_kit() -> Kit | None:
    """Return the user's kit; None where there is none.

    Raises:
        BenchtoolError: As ``load_kit``.
    """
    path = kit_path()
    return load_kit(path) if path is not None and path.is_file() else None


def instrument_in_kit(name: str) -> KitInstrument:
    """Return an instrument of the user's kit.

    Raises:
        UsageError: If there is no kit, or no such instrument in it (``not-in-kit``).
        BenchtoolError: As ``load_kit``.
    """
    return find_instrument(
        _kit_with(f"instrument {name!r}"), name, datetime.now(UTC).date().isoformat()
    )


def named_in_kit(
    instrument: str | None, probe: str | None, load: Probe | None
) -> tuple[KitInstrument | None, Probe | None]:
    """Return the instrument that is named, and its probe's load or that of the probe given.

    Args:
        instrument: Name of an instrument, where one is named.
        probe: Name of a probe, where one is named.
        load: The load, where it was given in its place.

    Raises:
        UsageError: As ``instrument_in_kit``.
        BenchtoolError: As ``load_kit``.
    """
    kept = None if instrument is None else instrument_in_kit(instrument)
    if probe is not None:
        found = find_probe(_kit_with(f"probe {probe!r}"), probe)
        return kept, Probe(r_ohm=found.r_ohm, c_f=found.c_f)
    if load is None and kept is not None and kept.probe is not None:
        return kept, Probe(r_ohm=kept.probe.r_ohm, c_f=kept.probe.c_f)
    return kept, load


def _kit_with(wanted: str) -> Kit:
    kit = user_kit()
    if kit is None:
        raise UsageError(
            f"there is no {wanted}: no kit is kept yet",
            hint=f"Write {kit_path() or NAME}; see: benchtool explain kit. "
            'A probe\'s load is given as "10M 12p".',
            code="not-in-kit",
        )
    return kit
