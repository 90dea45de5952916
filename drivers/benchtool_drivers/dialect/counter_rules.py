"""What keys of a counter's dialect demand of one another, and what such a dialect does."""

from __future__ import annotations

from collections.abc import Iterator

from benchtool_drivers.dialect.counting import CounterKeys
from benchtool_drivers.dialect.records import Dialect
from benchtool_drivers.dialect.takers import Flaw, placeholders_of


def find_conflicts(dialect: Dialect) -> Iterator[Flaw]:
    """Yield what is wrong between tables that are each right."""
    body: CounterKeys = dialect.body
    for n, name in enumerate(dialect.channel.default):
        if name not in dialect.channel.names:
            yield Flaw(path=("channel", "default", n), message=f"{name!r} is none of the names")
    if bool(body.functions) == (body.stamps is not None):
        message = "give either functions or stamps: one dialect delivers one of the two"
        yield Flaw(path=("functions",), message=message)
    if (body.resolution.s is None) == (not body.resolution.query):
        yield Flaw(path=("resolution",), message="give s or query, and not both")
    yield from _of_numbers(body)
    yield from _of_functions(body)
    if body.stamps is not None:
        yield from _of_stamps(body)


def _used(body: CounterKeys) -> set[str]:
    return set[str]().union(*map(placeholders_of, (*body.take.configure, body.data.query)))


def _of_numbers(body: CounterKeys) -> Iterator[Flaw]:
    """The number of readings must reach the instrument, but for those that come one by one."""
    counted, path = "n" in _used(body), ("take", "by")
    if body.take.by == "loop" and counted:
        yield Flaw(path=path, message="loop takes one reading a query: {n} is of no use")
    if body.take.by != "loop" and not counted:
        yield Flaw(path=path, message=f"{body.take.by} needs {{n}} in configure or in the query")
    if body.take.by == "count" and not body.acquire.arm:
        message = "a count of readings has to be started: arm in [acquire] is missing"
        yield Flaw(path=path, message=message)
    if body.take.by == "loop" and not body.data.is_text:
        yield Flaw(path=("data", "wrap"), message="loop takes printed readings")


def _of_functions(body: CounterKeys) -> Iterator[Flaw]:
    if len(body.functions) > 1 and "function" not in _used(body):
        message = "{function} stands in no command: nothing would choose between them"
        yield Flaw(path=("functions",), message=message)


def _of_stamps(body: CounterKeys) -> Iterator[Flaw]:
    stamps = body.stamps
    if stamps is None:
        return
    if "function" in _used(body):
        yield Flaw(path=("take", "configure"), message="{function} goes with functions")
    if body.take.by == "loop":
        yield Flaw(path=("take", "by"), message="stamps come together: array or count")
    if (stamps.edges == "both") != bool(stamps.first):
        yield Flaw(path=("stamps", "first"), message='goes with edges = "both", and the reverse')
    if stamps.unit == "ticks" and body.resolution.s == 0:
        yield Flaw(path=("resolution", "s"), message="a tick must last longer than 0 s")


def describe_counter(dialect: Dialect) -> Iterator[tuple[str, str]]:
    """Yield what a dialect of kind "counter" does."""
    body: CounterKeys = dialect.body
    if body.stamps is not None:
        yield "delivers", f"time stamps in {body.stamps.unit} of {body.stamps.edges} edges"
    for name, item in body.functions.items():
        yield name, f"{item.word}, in {item.unit}, a reading an {item.per}".replace("an g", "a g")
    yield "takes readings by", f"{body.take.by}: {', '.join(body.take.configure) or 'no command'}"
    yield "readings from", f"{body.data.query}, {body.data.wrap}"
    stated = f"{body.resolution.s:g} s" if body.resolution.s is not None else ""
    yield "resolution", stated or body.resolution.query
    yield "gate", body.gate.query if body.gate else "not asked for"
