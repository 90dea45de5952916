"""Loading a design: every fault at once, each with its key, its line and the nearest known key."""

from __future__ import annotations

import hashlib
from pathlib import Path

from benchtool.designs.building import build_design
from benchtool.designs.faults import design_error, find_flaws, without_echoes
from benchtool.designs.rules import find_conflicts
from benchtool.designs.syntax import decode, one_fault, parse_toml
from benchtool.errors import DesignFault, InputError
from benchtool.model.design import Design

_LARGEST_BYTES = 1 << 20


def load_design(path: str | Path) -> Design:
    """Return the design in a TOML file.

    Raises:
        InputError: If the file cannot be read: ``no-such-file``, ``is-directory``,
            ``no-permission`` or ``unreadable``.
        DesignError: If it is no sound design; carries every fault.
    """
    content = _read(Path(path))
    source = str(path)
    if len(content) > _LARGEST_BYTES:
        fault = DesignFault(key="", message="is larger than 1 MiB", file=source)
        raise one_fault(fault, hint="give the design file, a short TOML text; not a capture")
    text = decode(content, source=source)
    return _design(text, source=source, sha256=hashlib.sha256(content).hexdigest())


def parse_design(text: str, *, source: str = "") -> Design:
    """Return the design in a TOML text.

    Args:
        text: The text.
        source: File name for messages.

    Raises:
        DesignError: If it is no sound design; carries every fault.
    """
    digest = hashlib.sha256(text.encode("utf-8", errors="surrogatepass")).hexdigest()
    return _design(text, source=source, sha256=digest)


def _design(text: str, *, source: str, sha256: str) -> Design:
    from pydantic import ValidationError

    from benchtool.designs.schema import DesignTable

    document = parse_toml(text, source=source)
    flaws = list(find_conflicts(document))
    try:
        table = DesignTable.model_validate(document)
    except ValidationError as error:
        flaws = without_echoes([*find_flaws(error, document), *flaws])
        raise design_error(flaws, text, source=source) from None
    if flaws:
        raise design_error(flaws, text, source=source)
    return build_design(table, document, source=source, sha256=sha256)


def _read(path: Path) -> bytes:
    name = f"{str(path)!r}"
    try:
        with path.open("rb") as file:
            return file.read(_LARGEST_BYTES + 1)
    except FileNotFoundError:
        raise InputError(
            f"there is no file {name}",
            hint="check the path, or make a design with `benchtool design new`",
            code="no-such-file",
        ) from None
    except IsADirectoryError:
        raise InputError(
            f"{name} is a directory", hint="name the design file inside it", code="is-directory"
        ) from None
    except PermissionError:
        raise InputError(
            f"{name} may not be read",
            hint="ask for permission to read it, or copy it",
            code="no-permission",
        ) from None
    except (OSError, ValueError) as error:
        reason = getattr(error, "strerror", None) or error
        raise InputError(
            f"{name} cannot be read: {reason}", hint="check the path", code="unreadable"
        ) from None
