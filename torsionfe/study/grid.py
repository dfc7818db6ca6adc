"""The sections that a sweep is asked for: outlines, or combinations of parameters and a function that builds them."""

from __future__ import annotations

import itertools
import math
from collections.abc import Callable, Iterable, Iterator, Mapping, Sized
from dataclasses import dataclass
from typing import Any

from torsionfe.errors import InputError
from torsionfe.outline.outline import Outline

__all__ = ["Section", "Sections", "combinations", "sections_of"]

Build = Callable[..., Outline]


@dataclass(frozen=True, slots=True)
class Section:
    """One section of a sweep.

    Attributes
    ----------
    index : int
        Its row.
    parameters : mapping of str to object
    outline : Outline or None
        None where it could not be built.
    error : Exception or None
        Why not.
    """

    index: int
    parameters: Mapping[str, Any]
    outline: Outline | None
    error: Exception | None = None


@dataclass(frozen=True)
class Sections:
    """All sections of a sweep, built one at a time, when they are asked for.

    Attributes
    ----------
    names : tuple of str
        Parameters.
    total : int or None
        How many, where that is known before.
    items : iterator
        Yields parameters and, where no function builds it, the outline.
    build : callable or None
    """

    names: tuple[str, ...]
    total: int | None
    items: Iterator[Any]
    build: Build | None

    def __iter__(self) -> Iterator[Section]:
        for index, item in enumerate(self.items):
            parameters: Mapping[str, Any] = {}
            try:
                if self.build is None:
                    parameters, outline = item if self.names else ({}, item)
                else:
                    parameters = _checked_parameters(index, item, self.names)
                    outline = self.build(**parameters)
                yield Section(index, parameters, _checked_outline(index, outline, self.build))
            except Exception as error:  # whatever a bad section does, the others are solved
                yield Section(index, parameters, None, error)


def sections_of(outlines: Any, build: Build | None) -> Sections:
    """Return the sections of what was given to a sweep.

    Parameters
    ----------
    outlines : iterable of Outline, mapping of str to Outline; or with ``build`` a mapping of str to values, or
        an iterable of mappings of str to value
    build : callable, optional

    Raises
    ------
    InputError
        Neither of these.
    """
    if build is not None and not callable(build):
        raise InputError(f"build must be a function of the parameters that returns an Outline, got {build!r:.80}")
    if isinstance(outlines, Mapping):
        return _named(outlines) if build is None else _grid(outlines, build)
    if isinstance(outlines, (str, bytes, Outline)) or not isinstance(outlines, Iterable):
        hint = ": write [outline] for a single one" if isinstance(outlines, Outline) else ""
        raise InputError(f"a sweep needs an iterable of outlines or a parameter grid, got {outlines!r:.80}{hint}")
    total = len(outlines) if isinstance(outlines, Sized) else None
    items = iter(outlines)
    if build is None:
        return Sections((), total, items, None)
    first = list(itertools.islice(items, 1))
    if first and not isinstance(first[0], Mapping):
        raise InputError(f"with build, each section is a mapping of parameter to value, got {first[0]!r:.80}")
    return Sections(_names(first[0]) if first else (), total, itertools.chain(first, items), build)


def combinations(grid: Mapping[str, Any]) -> Iterator[dict[str, Any]]:
    """Yield every combination of a parameter grid, the last parameter running fastest.

    Parameters
    ----------
    grid : mapping of str to iterable
        The values of each parameter; a single number or string stands for itself.

    Examples
    --------
    >>> list(combinations({"depth": 80, "web": [6, 8]}))
    [{'depth': 80, 'web': 6}, {'depth': 80, 'web': 8}]
    """
    values = [_values(name, given) for name, given in grid.items()]
    return (dict(zip(grid, chosen, strict=True)) for chosen in itertools.product(*values))


def plain_value(value: Any) -> Any:
    """Return numpy's numbers as Python's, which journals and tables write alike."""
    return value.item() if getattr(value, "shape", None) == () and hasattr(value, "item") else value


def _named(outlines: Mapping[Any, Any]) -> Sections:
    wrong = next((name for name, outline in outlines.items() if not isinstance(outline, Outline)), None)
    if wrong is not None:
        raise InputError(
            f"{wrong!r:.40} is no Outline: without build, a mapping holds outlines by their names; "
            "for a parameter grid give build, a function of the parameters"
        )
    return Sections(("name",), len(outlines), (({"name": str(n)}, o) for n, o in outlines.items()), None)


def _grid(grid: Mapping[Any, Any], build: Build) -> Sections:
    names = _names(grid)
    values = {name: _values(name, given) for name, given in grid.items()}  # once: an iterator gives them once
    return Sections(names, math.prod(map(len, values.values())), combinations(values), build)


def _names(parameters: Mapping[Any, Any]) -> tuple[str, ...]:
    wrong = next((name for name in parameters if not isinstance(name, str)), None)
    if wrong is not None or not parameters:
        raise InputError(f"parameters need names, got {wrong!r}" if parameters else "there are no parameters")
    return tuple(parameters)


def _values(name: str, given: Any) -> tuple[Any, ...]:
    if isinstance(given, (str, bytes)) or not isinstance(given, Iterable):
        return (plain_value(given),)
    values = tuple(plain_value(value) for value in given)
    if not values:
        raise InputError(f"parameter {name!r} has no values: give one or more")
    return values


def _checked_parameters(index: int, item: Any, names: tuple[str, ...]) -> dict[str, Any]:
    if not isinstance(item, Mapping) or set(item) != set(names):
        got = ", ".join(map(str, item)) if isinstance(item, Mapping) else repr(item)
        raise InputError(f"section {index} must have the parameters {', '.join(names)}, got {got:.80}")
    return {name: plain_value(item[name]) for name in names}


def _checked_outline(index: int, outline: Any, build: Build | None) -> Outline:
    if isinstance(outline, Outline):
        return outline
    who = f"section {index} must be" if build is None else "build must return"
    raise InputError(f"{who} an Outline, got {outline!r:.80}")
