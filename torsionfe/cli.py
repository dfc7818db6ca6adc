"""The command ``torsionfe``: results to standard output, messages to standard error.

Exit status: 0 done, 2 bad input, 1 anything else.
"""

from __future__ import annotations

import argparse
import os
import sys
import time
from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING

from torsionfe import __version__
from torsionfe.cautions import cautions
from torsionfe.errors import InputError, TorsionError
from torsionfe.text import printable

if TYPE_CHECKING:
    from torsionfe.outline.outline import Outline

__all__ = ["main"]

_DONE, _FAILED, _BAD_INPUT = 0, 1, 2
_LINE = 76  # characters of the line that says what is being done

_INTRO = """\
Torsion of a bar of any cross-section: torsion constant with proven bounds, peak shear
stress and its place, twist, and the thin-plate sum beside them.
"""

_FIRST_STEPS = """\
first steps:
  torsionfe solve sluice-lever --torque '450 N*m'    one section, at once
  torsionfe starter lever.toml                       a commented job file to change
  torsionfe run lever.toml --out sheet               the calculation sheet of a job
  torsionfe COMMAND --help                           more about one command

Results go to standard output, messages to standard error.
Exit status: 0 done, 2 bad input, 1 anything else.
"""

_SOLVE = """\
Solve one section. OUTLINE is a file (well-known text, GeoJSON, DXF, CSV, a triangle mesh) or
the name of a packaged example section (`torsionfe sections` lists them).

Numbers take units ('450 N*m', '600 mm', '27 GPa'); then the outline needs one, too. Without
units they are taken as one consistent system, whatever it is.
"""

_RUN = """\
Run a job file. Into FOLDER, which is made where it does not exist, go the calculation sheet
(sheet.html, sheet.pdf), the numbers (result.json) and the figures, each file whole or not at all.
`torsionfe starter FILE` writes a job file to begin with.
"""

_SWEEP = """\
Solve the trade shape of a job file over the grid of dimensions in its [sweep]. Into FOLDER go a
table (sweep.csv), maps, and a journal: a sweep that was stopped goes on where it was when the
same command is given again.
"""


def _parser() -> argparse.ArgumentParser:
    parser = argparse.ArgumentParser(
        prog="torsionfe",
        description=_INTRO,
        epilog=_FIRST_STEPS,
        formatter_class=argparse.RawDescriptionHelpFormatter,
    )
    parser.add_argument("--version", action="version", version=f"torsionfe {__version__}")
    commands = parser.add_subparsers(dest="command", metavar="COMMAND", required=True)
    _add_solve(commands)
    _add_run(commands)
    _add_starter(commands)
    _add_sweep(commands)
    sections = commands.add_parser("sections", help="list the packaged example sections")
    sections.set_defaults(act=_sections)
    for command in commands.choices.values():
        loud = command.add_mutually_exclusive_group()
        loud.add_argument("--quiet", action="store_true", help="no messages but errors")
        loud.add_argument("--verbose", action="store_true", help="say what is being done, and how long it took")
    return parser


def _add_run(commands: argparse._SubParsersAction[argparse.ArgumentParser]) -> None:
    run = commands.add_parser(
        "run",
        help="run a job file: the calculation sheet",
        description=_RUN,
        formatter_class=argparse.RawDescriptionHelpFormatter,
    )
    run.add_argument("job", metavar="JOB.toml", help="the job file")
    run.add_argument("--out", metavar="FOLDER", required=True, help="where the files go")
    run.set_defaults(act=_run)


def _add_starter(commands: argparse._SubParsersAction[argparse.ArgumentParser]) -> None:
    starter = commands.add_parser(
        "starter",
        help="write a commented job file to begin with",
        description="Write a job file that runs as it stands and explains every key.",
    )
    starter.add_argument("file", metavar="FILE", help="such as lever.toml; an existing file is kept")
    starter.add_argument("--force", action="store_true", help="replace an existing file")
    starter.set_defaults(act=_starter)


def _add_sweep(commands: argparse._SubParsersAction[argparse.ArgumentParser]) -> None:
    sweep = commands.add_parser(
        "sweep",
        help="solve a job's section over a range of dimensions",
        description=_SWEEP,
        formatter_class=argparse.RawDescriptionHelpFormatter,
    )
    sweep.add_argument("job", metavar="JOB.toml", help="a job file with [sweep]")
    sweep.add_argument("--out", metavar="FOLDER", required=True, help="where the files go")
    sweep.add_argument("--journal", metavar="FILE", help="where finished rows are kept (FOLDER/sweep.journal)")
    sweep.add_argument("--workers", metavar="N", type=int, help="worker processes (one a core); 0 for none")
    sweep.set_defaults(act=_sweep)


def _add_solve(commands: argparse._SubParsersAction[argparse.ArgumentParser]) -> None:
    solve = commands.add_parser(
        "solve",
        help="solve one section: a table and a picture",
        description=_SOLVE,
        formatter_class=argparse.RawDescriptionHelpFormatter,
    )
    solve.add_argument("outline", metavar="OUTLINE", help="a file, or a packaged example section")
    solve.add_argument("--torque", metavar="T", help="torque, such as '450 N*m'")
    solve.add_argument("--length", metavar="L", help="length of the bar, such as '600 mm'")
    solve.add_argument("--shear-modulus", metavar="G", help="shear modulus, such as '27 GPa'")
    solve.add_argument("--unit", metavar="U", help="unit of the result's lengths (mm, in, ...)")
    solve.add_argument("--file-unit", metavar="U", help="unit of a file that states none")
    solve.add_argument("--layer", metavar="NAME", action="append", help="read only this layer of a DXF (repeatable)")
    solve.add_argument("--fillet", metavar="R", help="round every sharp re-entrant corner with this radius")
    solve.add_argument("--keep-chords", action="store_true", help="don't restore arcs from chains of chords")
    solve.add_argument("--rel-tol", metavar="X", default="1e-3", help="width of the bracket of J over J (1e-3)")
    solve.add_argument("--peak-tol", metavar="X", default="2e-3", help="relative error of the peak stress (2e-3)")
    solve.add_argument("--order", metavar="P", type=int, default=2, help="degree of the elements (2)")
    solve.add_argument("--figure", metavar="FILE", help="write the stress contour (.png, .svg or .pdf)")
    solve.set_defaults(act=_solve)


def _complain(line: object) -> None:
    """Print a line to standard error, with nothing in it that could steer a terminal."""
    text = f"torsionfe: {printable(str(line))}"
    print(text.ljust(_LINE) if sys.stderr.isatty() else text, file=sys.stderr)


class _Messages:
    """Lines to standard error, as many as were asked for; on a terminal, the step that is being done."""

    def __init__(self, given: argparse.Namespace) -> None:
        self.quiet, self.verbose = given.quiet, given.verbose
        self.step, self.begun = "", time.perf_counter()
        self.live = sys.stderr.isatty() and not (given.quiet or given.verbose)

    def say(self, line: str) -> None:
        """Say something unless all should be quiet."""
        if not self.quiet:
            _complain(line)

    def begin(self, step: str) -> None:
        """Note that a step begins (none, ``''``, where all are done)."""
        now = time.perf_counter()
        if self.verbose and self.step:
            self.say(f"{self.step}: {now - self.begun:.2f} s")
        if self.live:  # one line, overwritten
            shown = f"torsionfe: {printable(step)[:60]} ..." if step else ""
            print(f"\r{shown:<{_LINE}}\r", end="", file=sys.stderr, flush=True)
        self.step, self.begun = step, now


def _sections(_: argparse.Namespace) -> None:
    from torsionfe.outline.samples import SAMPLE_UNIT, SAMPLES
    from torsionfe.text import table

    print(table([(name, f"{item.title} ({SAMPLE_UNIT})") for name, item in SAMPLES.items()], "Example sections"))


def _read(given: argparse.Namespace) -> tuple[Outline, str]:
    """Return the outline of a file or packaged section, in the unit asked for, and that unit ('' unknown)."""
    from torsionfe.outline.files import read_outline_report
    from torsionfe.outline.samples import SAMPLE_UNIT, SAMPLES, sample
    from torsionfe.units import length_factor, parse_unit

    unit = parse_unit(given.unit) if given.unit else ""
    if Path(given.outline).is_file():
        found = read_outline_report(
            given.outline,
            unit=unit or None,
            file_unit=given.file_unit,
            layers=given.layer,
            restore_arcs=not given.keep_chords,
        )
        for note in (*found.notes, *found.warnings):
            _Messages(given).say(note)
        return found.outline, found.unit or ""
    if given.outline in SAMPLES:
        outline = sample(given.outline)
        return (outline.scaled(length_factor(SAMPLE_UNIT, unit)), unit) if unit else (outline, SAMPLE_UNIT)
    raise InputError(
        f"{given.outline!r} is neither a file nor a packaged section; those are {', '.join(SAMPLES)}"
    )


def _solve(given: argparse.Namespace) -> None:
    from torsionfe.quantities import UnitSystem, parse_quantity
    from torsionfe.study.single import answer
    from torsionfe.torsion.solve import solve_torsion

    torque, length, modulus, fillet = (
        None if text is None else parse_quantity(name, text, kind)
        for name, text, kind in (
            ("--torque", given.torque, "torque"),
            ("--length", given.length, "length"),
            ("--shear-modulus", given.shear_modulus, "stress"),
            ("--fillet", given.fillet, "length"),
        )
    )
    outline, unit = _read(given)
    system = UnitSystem(unit if any(q is not None and q.unit for q in (torque, length, modulus, fillet)) else "")
    numbers = [None if q is None else system.of(q) for q in (torque, length, modulus)]
    if fillet is not None:
        outline = outline.filleted(system.of(fillet))
    if given.figure:
        _check_figure(given.figure)
    messages = _Messages(given)
    messages.begin("solving")
    tolerances = _number("--rel-tol", given.rel_tol), _number("--peak-tol", given.peak_tol)
    solution = solve_torsion(outline, tolerances[0], given.order, peak_tol=tolerances[1])
    messages.begin("")
    print(f"{answer(solution, system, *numbers)}\n{cautions()}")
    messages.begin("drawing" if given.figure else "")
    if given.figure:
        from torsionfe.output.contour import plot_stress
        from torsionfe.output.figures import save_figure

        drawn = plot_stress(solution, torque=numbers[0] or None, unit=system.length, stress_unit=system.stress)
        save_figure(drawn.axes.figure, given.figure)
        messages.begin("")
        messages.say(f"figure written to {given.figure}")


def _number(name: str, text: str) -> float:
    try:
        return float(text)
    except ValueError:
        raise InputError(f"{name} must be a number, got {text!r}") from None


def _check_figure(path: str) -> None:
    """Refuse a figure that can't be written before any work is done."""
    from torsionfe.output.figures import check_figure_path

    check_figure_path(path)


def _starter(given: argparse.Namespace) -> None:
    from torsionfe.job.starter import write_starter

    path = write_starter(given.file, given.force)
    _Messages(given).say(f"{path} written; change it, then: torsionfe run {path} --out FOLDER")


def _run(given: argparse.Namespace) -> None:
    from torsionfe.job.reading import read_job
    from torsionfe.job.running import run_job
    from torsionfe.job.writing import check_folder, result_words, write_result

    messages = _Messages(given)
    messages.begin("reading the job")
    job = read_job(given.job)
    folder = check_folder(given.out)
    result = run_job(job, messages.begin)
    messages.begin("")
    print(result_words(result))
    written = write_result(result, folder, messages.begin)
    messages.begin("")
    messages.say(f"{len(written)} files written to {folder}: {', '.join(path.name for path in written)}")


def _sweep(given: argparse.Namespace) -> None:
    from torsionfe.job.reading import read_job
    from torsionfe.job.sweeping import run_sweep, sweep_words, write_sweep
    from torsionfe.job.writing import check_folder

    messages = _Messages(given)
    job = read_job(given.job)
    folder = check_folder(given.out)
    journal = given.journal or folder / "sweep.journal"
    table = run_sweep(job, journal, given.workers, False if given.quiet else None)
    print(sweep_words(table))
    written = write_sweep(job, table, folder, messages.say)
    messages.say(f"{len(written)} files written to {folder}; the journal is {journal}")


def main(arguments: Sequence[str] | None = None) -> int:
    """Run the command; return its exit status."""
    for stream in (sys.stdout, sys.stderr):
        if hasattr(stream, "reconfigure") and stream.errors == "strict":
            stream.reconfigure(errors="backslashreplace")  # an ASCII terminal has no raised digits
    try:
        given = _parser().parse_args(arguments)
    except SystemExit as stop:  # argparse has spoken: 2 for bad usage, 0 for help
        return int(stop.code or 0)
    try:
        given.act(given)
        if sys.stdout is not None:
            sys.stdout.flush()  # a full disk is told of here, not by the interpreter as it ends
    except InputError as error:
        _complain(error)
        return _BAD_INPUT
    except TorsionError as error:
        _complain(error)
        return _BAD_INPUT if getattr(error, "at", None) is not None else _FAILED
    except KeyboardInterrupt as stop:
        _complain(str(stop) or "interrupted")
        return _FAILED
    except OSError as error:
        return _unprintable(error)
    return _DONE


def _unprintable(error: OSError) -> int:
    """Say, where somebody still listens, that the results can't be printed, so that the interpreter says nothing."""
    if not isinstance(error, BrokenPipeError):
        _complain(f"the results can't be printed: {error.strerror or error}")
    os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
    return _FAILED
