"""The sweep of a job file: its trade shape over a grid of dimensions, as a table and as maps."""

from __future__ import annotations

import functools
import itertools
import os
from collections.abc import Iterator
from pathlib import Path

import numpy as np

from torsionfe.cautions import cautions
from torsionfe.errors import InputError
from torsionfe.job.job import Job
from torsionfe.job.running import Progress
from torsionfe.job.section import build_shape
from torsionfe.output.sheet import Picture, figure_bytes
from torsionfe.storing import store
from torsionfe.study.sweep import sweep
from torsionfe.study.sweep_table import SweepTable

__all__ = ["run_sweep", "sweep_words", "write_sweep"]

_MOST_SHEETS = 12  # maps of one column, where more than two dimensions vary


def run_sweep(
    job: Job, journal: str | os.PathLike[str] | None = None, workers: int | None = None, progress: bool | None = None
) -> SweepTable:
    """Solve the sections of a job's sweep.

    Parameters
    ----------
    job : Job
    journal : path, optional
        Takes each row as it finishes; a sweep that was stopped goes on from it.
    workers, progress
        As in `torsionfe.study.sweep.sweep`.

    Raises
    ------
    InputError
        The job has no sweep.
    """
    if job.sweep is None:
        raise InputError(f"{job.path.name} has no [sweep]: name the dimensions to vary in [sweep.grid]")
    tolerance = job.tolerance
    return sweep(
        job.sweep.grid,
        functools.partial(build_shape, job.section.shape, dict(job.section.dimensions or {})),
        journal=journal,
        workers=workers,
        rel_tol=tolerance.torsion_constant,
        order=tolerance.order,
        peak_tol=tolerance.peak_stress,
        max_unknowns=tolerance.most_unknowns,
        progress=progress,
    )


def sweep_words(table: SweepTable) -> str:
    """Return a sweep's table as text, with the cautions that its stresses need."""
    return f"{table}\n{cautions()}"


def write_sweep(job: Job, table: SweepTable, folder: Path, say: Progress) -> list[Path]:
    """Write a sweep's table as CSV and its maps; return the files.

    Raises
    ------
    InputError
        A file cannot be written.
    """
    written = [table.save_csv(folder / "sweep.csv")]
    for picture in _maps(job, table, say):
        for ending in job.outputs.figures:
            say(f"drawing {picture.name}.{ending}")
            written.append(store(folder / f"{picture.name}.{ending}", figure_bytes(picture, 6.4, ending)))
    return written


def _maps(job: Job, table: SweepTable, say: Progress) -> Iterator[Picture]:
    assert job.sweep is not None
    varied = [name for name, values in job.sweep.grid.items() if len(values) > 1]
    held = {name: job.sweep.grid[name] for name in varied[2:]}
    sheets = list(itertools.islice(itertools.product(*held.values()), _MOST_SHEETS + 1))
    if len(sheets) > _MOST_SHEETS:
        say(f"maps: only the first {_MOST_SHEETS} values of {', '.join(held)} are drawn")
    for column in job.sweep.maps if varied else ():
        if not np.isfinite(table[column][table.solved].astype(float)).any():
            say(f"no map of {column.replace('_', ' ')}: no section has that answer")
            continue
        for k, values in enumerate(sheets[:_MOST_SHEETS]):
            at = dict(zip(held, values, strict=True))
            name = f"map_{column}" + (f"_{k + 1}" if len(sheets) > 1 else "")
            draw = functools.partial(_draw_map, table=table, column=column, at=at, unit=job.system.length)
            yield Picture(name, column.replace("_", " "), draw, 0.8)


def _draw_map(figure: object, *, table: SweepTable, column: str, at: dict[str, float], unit: str) -> None:
    table.plot(figure.add_subplot(), value=column, at=at or None, unit=unit)  # type: ignore[attr-defined]
