"""One mechanism for formats, topologies and reports: a name leads to ``module:attribute``.

Ours stand in a static table. Outsiders register an entry point in the group of the same name;
they are looked up only where ours all say no, or by name, since the look-up takes 0.1 s.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from importlib import import_module

from benchtool.errors import UsageError
from benchtool.frozen import frozen_record


@frozen_record
class Registry:
    """Named things of one kind, loaded on first use.

    Attributes:
        group: Entry-point group, such as ``benchtool.formats``.
        ours: Name to ``module:attribute``; ours win over outsiders of the same name.
    """

    group: str
    ours: Mapping[str, str]

    def load(self, name: str) -> object:
        """Return the thing called ``name``.

        Raises:
            UsageError: If nobody registered it.
        """
        if name in self.ours:
            return _load(self.ours[name])
        outsiders = self._outsiders()
        if name not in outsiders:
            known = ", ".join(sorted({*self.ours, *outsiders}))
            kind = self.group.rpartition(".")[2].removesuffix("s")
            raise UsageError(f"there is no {kind} called {name!r}", hint=f"Known: {known}.")
        return _load(outsiders[name])

    def each_of_ours(self) -> Iterator[tuple[str, object]]:
        """Yield our own in the order of the table."""
        for name, target in self.ours.items():
            yield name, _load(target)

    def each_outsider(self) -> Iterator[tuple[str, object]]:
        """Yield what other packages registered."""
        for name, target in self._outsiders().items():
            yield name, _load(target)

    def _outsiders(self) -> dict[str, str]:
        from importlib.metadata import entry_points

        points = entry_points(group=self.group)
        return {point.name: point.value for point in points if point.name not in self.ours}


def _load(target: str) -> object:
    module, _, attribute = target.partition(":")
    return getattr(import_module(module), attribute)
