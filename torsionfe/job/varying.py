"""What a job varies: the dimensions of its trade shape, over a grid or by a little."""

from __future__ import annotations

import math
from typing import Any

from torsionfe.job.job import SensitivityPlan, SweepPlan
from torsionfe.job.keys import KEYS, SWEEP_MAPS, shape_keys
from torsionfe.job.section import JobSection, build_shape
from torsionfe.job.table import Table

__all__ = ["read_sensitivity", "read_sweep"]

_MOST_VALUES = 10_000


def read_sensitivity(top: Table, section: JobSection) -> SensitivityPlan:
    """Return the dimensions to vary by a little: lengths of the trade shape that are stated and above 0."""
    table = top.table("sensitivity", list(KEYS["sensitivity"]))
    usual = 10.0 ** round(math.log10(section.outline.size / 1000.0))
    stated = section.dimensions or {}
    # fillets of the job's own are no dimensions of the shape
    if section.shape and build_shape(section.shape, stated) == section.outline:
        kinds = shape_keys(section.shape)
        of = tuple(name for name, value in stated.items() if kinds[name][0] == "length" and value > 0.0)
    else:
        of = ()
    if table is None:
        return SensitivityPlan(usual, of)
    step = table.quantity("step", "length", usual)
    assert step is not None
    if step <= 0.0:
        raise table.error("step", f"{table.name('step')} must be greater than 0, got {table.data['step']!r}")
    if "of" in table and not of:
        raise table.error("of", "sensitivity.of names dimensions of a trade shape: set outline.shape, without fillets")
    return SensitivityPlan(step, table.choices("of", of, of))


def read_sweep(top: Table, section: JobSection) -> SweepPlan | None:
    """Return the grid of a sweep, every value of every dimension; None where the job has none."""
    table = top.table("sweep", list(KEYS["sweep"]))
    if table is None:
        return None
    table.need("grid")
    if not section.shape:
        raise table.error("", "[sweep] varies the dimensions of a trade shape: set outline.shape")
    if "fillets" in top.data["outline"]:
        raise table.error("", "[sweep] can't vary a shape with outline.fillets: use the shape's own radii")
    kinds = shape_keys(section.shape)
    allowed = [key for key, (kind, _) in kinds.items() if kind != "voids"]
    grid = table.table("grid", allowed)
    if grid is None or not grid.data:
        raise table.error("grid", f"sweep.grid is empty: name a dimension, one of {', '.join(allowed)}")
    values = {key: _values(grid, key, kinds[key][0]) for key in grid.data}
    total = 1
    for column in values.values():
        total *= len(column)
    if total > 1_000_000:
        raise table.error("grid", f"sweep.grid has {total} sections; 1000000 at most")
    return SweepPlan(values, table.choices("maps", SWEEP_MAPS, SWEEP_MAPS[:4]))


def _values(grid: Table, key: str, kind: str) -> tuple[float, ...]:
    given = grid.data[key]
    measured = "length" if kind == "length" else "number"
    if isinstance(given, list):
        if not 1 <= len(given) <= _MOST_VALUES:
            raise grid.error(key, f"{grid.name(key)} must have 1 to {_MOST_VALUES} values, got {len(given)}")
        found = [_value(grid, (key, k), item, measured) for k, item in enumerate(given)]
        if len(set(found)) < len(found):
            raise grid.error(key, f"{grid.name(key)} has a value twice")
        return tuple(found)
    table = grid.table(key, list(KEYS["sweep.grid.*"]))
    assert table is not None
    table.need("from", "to", "count")
    if kind == "whole":
        raise grid.error(key, f"{grid.name(key)} counts something: list its values, [2, 3, 4]")
    first, last = (_value(table, (end,), table.data[end], measured) for end in ("from", "to"))
    count = table.whole("count", 2, 2, _MOST_VALUES)
    ratio = table.choice("spacing", ("even", "ratio"), "even") == "ratio"
    if first == last or (ratio and min(first, last) <= 0.0):
        raise table.error("to", f"{table.name()}: 'from' and 'to' must differ, and be above 0 for spacing = 'ratio'")
    steps = [k / (count - 1) for k in range(count)]
    if ratio:
        found = [first * (last / first) ** step for step in steps]
    else:
        found = [(1.0 - step) * first + step * last for step in steps]
    return tuple(float(f"{value:.12g}") for value in found)  # 8, not 7.999999999999999


def _value(table: Table, path: tuple[str | int, ...], given: Any, kind: str) -> float:
    if kind == "length":
        return table.measure(path, given, kind)
    if isinstance(given, bool) or not isinstance(given, (int, float)):
        name = table.name(str(path[0]))
        raise table.source.error((*table.path, *path), f"{name} must be plain numbers, got {given!r:.60}")
    return float(given)
