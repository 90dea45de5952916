"""One run of ``benchtool acquire``: from an open source to whole files."""

from __future__ import annotations

import hashlib
import json
import os
import sys
from collections.abc import Iterator
from contextlib import closing, contextmanager
from dataclasses import replace
from functools import partial
from io import BytesIO
from pathlib import Path
from typing import Any

from benchtool.cli.cautions import tell_cautions
from benchtool.cli.output import Output, made_at, refuse_existing, write_file
from benchtool.errors import BenchtoolError, UsageError
from benchtool.formats import write_counted, write_npz
from benchtool.instruments import Order, Recorder
from benchtool.jobs.acquiring import Enough, acquire, count_periods, named, record
from benchtool.jobs.counting import count, gives_readings, refuse_counting, with_name
from benchtool.jobs.sources import Wanted, kind_of, open_instrument, open_recorder
from benchtool.model.capture import Capture
from benchtool.model.counted import Counted
from benchtool.model.watching import tell
from benchtool.report.sidecar import Saved, Taken, acquisition_document

Found = Iterator[tuple[Capture | Counted, int]]
Run = tuple[Taken, Found]


def run_acquisition(
    wanted: Wanted, order: Order, enough: Enough, path: Path, output: Output, *, power_up: bool
) -> None:
    """Acquire, write each capture with its sidecar as soon as it is whole, and say so.

    Args:
        wanted: The source.
        order: What to acquire of an instrument.
        enough: When to stop.
        path: The file to write; with several captures, numbered.
        output: Where to say what was written.
        power_up: Whether the supply comes on only after arming.

    Raises:
        BenchtoolError: As opening and acquiring; captures written before stand.
    """
    several = enough.captures > 1 or (enough.periods is not None and "::" in wanted.resource)
    for name in (first := _numbered(path, 1, several=several), _beside(first)):
        refuse_existing(name, force=output.force)
    if kind_of(wanted.resource) == "file":
        raise _no_source(wanted.resource)
    _refuse_unwritable(path.parent)
    tell_cautions(output)
    written: list[dict[str, Any]] = []
    with _opened(wanted, order, enough, output) as (found, captures):
        taken = replace(found, power_up=power_up)
        if power_up:
            _say(output, "switch the supply on once this says that it is armed or recording")
        for capture, periods in captures:
            number = len(written) + 1
            target = _numbered(path, number, several=several)
            own = (
                named(capture, wanted.kept)
                if isinstance(capture, Capture)
                else with_name(capture, wanted.kept)
            )
            saved = _write(target, own, periods, number, taken, output)
            written.append(saved)
    if output.as_json:
        output.print_made("acquire", written)
    output.tell_written([item["file"] for item in written], "benchtool measure")


def _refuse_unwritable(folder: Path) -> None:
    """Refuse a folder that cannot take the files: after a first pulse it would be too late."""
    if not folder.is_dir():
        what = "there is no such folder"
    elif not os.access(folder, os.W_OK | os.X_OK):
        what = "nothing may be written there"
    else:
        return
    raise UsageError(
        f"{folder}: {what}",
        hint="Nothing was armed. Make the folder, or name another one with -o.",
        code="not-writable",
    )


def _no_source(name: str) -> UsageError:
    """Return the error to raise for a file in place of something live."""
    if name == "-" or not Path(name).is_dir():
        return UsageError(
            f"{'standard input' if name == '-' else name} is no instrument and no port",
            hint=f"Measure a file: benchtool measure {name}, or follow it: benchtool watch {name}.",
            code="already-a-file",
        )
    return UsageError(
        f"{name} is a folder",
        hint="Give a resource or a serial port; `benchtool instruments list` shows what is "
        "connected.",
        code="no-such-source",
    )


@contextmanager
def _opened(wanted: Wanted, order: Order, enough: Enough, output: Output) -> Iterator[Run]:
    """Open the source; yield how captures are taken, and the captures with their periods."""
    kind, taken = kind_of(wanted.resource), Taken(source=wanted.resource, kept=wanted.kept)
    if kind == "stream":
        with closing(open_recorder(wanted)) as stream:
            yield taken, _recorded(stream, enough, output)
        return
    with closing(open_instrument(wanted)) as instrument:
        told = replace(
            taken,
            identity=instrument.identity,
            dialect=instrument.dialect,
            settings=instrument.settings(),
            changed=order.settings,
        )
        _say(output, f"{instrument.identity}: dialect {instrument.dialect}")
        armed = partial(_say, output, "armed")
        if gives_readings(instrument):
            telling = partial(tell, "counting")
            yield told, count(instrument, order, enough, progress=telling, armed=armed)
            return
        refuse_counting(instrument, order)
        yield told, acquire(instrument, order, enough, progress=_transferred, armed=armed)


def _recorded(stream: Recorder, enough: Enough, output: Output) -> Found:
    for _ in range(enough.captures):
        _say(output, "recording")
        capture = record(stream, enough, progress=partial(tell, "recording"))
        yield capture, count_periods(capture)


def _transferred(done: int, total: int) -> None:
    tell("receiving", done, total)


def _write(
    path: Path, capture: Capture | Counted, periods: int, number: int, taken: Taken, output: Output
) -> dict[str, Any]:
    content = BytesIO()
    if isinstance(capture, Capture):
        write_npz(capture, content)
    else:
        write_counted(capture, content)
    data = content.getvalue()
    saved = Saved(
        file=path.name,
        sha256=hashlib.sha256(data).hexdigest(),
        number=number,
        periods=periods,
        capture=capture,
        made_at=made_at(),
    )
    document = acquisition_document(taken, saved)
    text = json.dumps(document, indent=1, ensure_ascii=False) + "\n"
    write_file(path, data, force=output.force)
    try:
        write_file(_beside(path), text.encode(), force=output.force)
    except BenchtoolError:  # a capture that nothing is known of would be half a file
        path.unlink(missing_ok=True)
        raise
    for notice in capture.warnings:
        _say(output, f"warning: {notice.text}")
    _say(output, f"{path}: {_held(capture, periods)}")
    return {"file": str(path), "sidecar": str(_beside(path)), **document}


def _held(capture: Capture | Counted, periods: int) -> str:
    """Return what a file holds, in a few words."""
    if isinstance(capture, Capture):
        return f"{periods} complete periods"
    return ", ".join(f"{item.values.size} {name}" for name, item in capture.readings.items())


def _say(output: Output, text: str) -> None:
    if not output.quiet and not output.as_json:
        from benchtool.cli.progress import make_room
        from benchtool.report.text import printable

        make_room()
        sys.stderr.write(printable(text) + "\n")
        sys.stderr.flush()


def _numbered(path: Path, number: int, *, several: bool) -> Path:
    return path.with_name(f"{path.stem}-{number:03}{path.suffix}") if several else path


def _beside(path: Path) -> Path:
    return path.with_name(path.name + ".json")
