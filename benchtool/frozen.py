"""Frozen records: data classes that are cheap to define.

The standard decorator writes and compiles the source of every method of every class, which for a
hundred records was a sixth of the time of a short run. Here the standard decorator finds the
fields, and the methods are the same functions for all records; ``fields`` and ``replace`` of
``dataclasses`` work as ever.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import MISSING, Field, FrozenInstanceError, dataclass, field, fields
from typing import Any, NoReturn, TypeVar, dataclass_transform, overload

R = TypeVar("R")

_FOUND: dict[type, tuple[Field[Any], ...]] = {}  # looking for them takes longer than a record does


@overload
def frozen_record(record: type[R], /) -> type[R]: ...
@overload
def frozen_record(*, eq: bool = True) -> Callable[[type[R]], type[R]]: ...
@dataclass_transform(frozen_default=True, kw_only_default=True, field_specifiers=(field,))
def frozen_record(record: type[R] | None = None, /, *, eq: bool = True) -> Any:
    """Make a class a frozen data class with slots, its fields given by name.

    Args:
        record: The class; a ``__post_init__`` of it is called, a method it has is kept.
        eq: Compare and hash by value; False where arrays are held, which then compare by identity.
    """
    methods = {**_METHODS, **(_BY_VALUE if eq else {})}

    def make(record: type[R]) -> type[R]:
        made = dataclass(init=False, repr=False, eq=False, slots=True, kw_only=True)(record)
        for name, method in methods.items():
            if name not in record.__dict__:
                setattr(made, name, method)
        return made

    return make if record is None else make(record)


def _fields(record: Any) -> tuple[Field[Any], ...]:
    kind = type(record)
    found = _FOUND.get(kind)
    if found is None:
        found = _FOUND[kind] = fields(record)
    return found


def _values(record: object, /) -> tuple[object, ...]:
    return tuple(getattr(record, found.name) for found in _fields(record))


def _compared(record: object) -> tuple[object, ...]:
    return tuple(getattr(record, found.name) for found in _fields(record) if found.compare)


def _init(self: object, /, **values: object) -> None:
    for found in _fields(self):
        if found.name in values:
            value = values.pop(found.name)
        elif found.default is not MISSING:
            value = found.default
        elif found.default_factory is not MISSING:
            value = found.default_factory()
        else:
            raise TypeError(f"{type(self).__name__} needs {found.name}")
        object.__setattr__(self, found.name, value)
    if values:
        raise TypeError(f"{type(self).__name__} has no field {' or '.join(values)}")
    if (check := getattr(self, "__post_init__", None)) is not None:
        check()


def _no_setting(self: object, name: str, _value: object = None, /) -> NoReturn:
    raise FrozenInstanceError(f"{type(self).__name__} is frozen: {name}")


def _equal(self: object, other: object, /) -> bool:
    return other.__class__ is self.__class__ and _compared(self) == _compared(other)


def _hash(self: object, /) -> int:
    return hash(_compared(self))


def _repr(self: object, /) -> str:
    shown = ", ".join(
        f"{found.name}={getattr(self, found.name)!r}" for found in _fields(self) if found.repr
    )
    return f"{type(self).__qualname__}({shown})"


def _set_state(self: object, values: tuple[object, ...], /) -> None:
    for found, value in zip(_fields(self), values, strict=True):
        object.__setattr__(self, found.name, value)


_METHODS: dict[str, Callable[..., Any]] = {
    "__init__": _init,
    "__setattr__": _no_setting,
    "__delattr__": _no_setting,
    "__repr__": _repr,
    "__getstate__": _values,
    "__setstate__": _set_state,
}
_BY_VALUE: dict[str, Callable[..., Any]] = {"__eq__": _equal, "__hash__": _hash}
