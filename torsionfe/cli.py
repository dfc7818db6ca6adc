"""The command ``torsionfe``: results to standard output, messages to standard error.

Exit status: 0 done, 2 bad input, 1 anything else.
"""

from __future__ import annotations

import argparse
import sys
from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING

from torsionfe import __version__
from torsionfe.errors import InputError, TorsionError

if TYPE_CHECKING:
    from torsionfe.outline.outline import Outline

__all__ = ["main"]

_DONE, _FAILED, _BAD_INPUT = 0, 1, 2

_INTRO = """\
Torsion of a bar of any cross-section: torsion constant with proven bounds, peak shear
stress and its place, twist, and the thin-plate sum beside them.
"""

_SOLVE = """\
Solve one section. OUTLINE is a file (well-known text, GeoJSON, DXF, CSV, a triangle mesh) or
the name of a packaged example section (`torsionfe sections` lists them).

Numbers take units ('450 N*m', '600 mm', '27 GPa'); then the outline needs one, too. Without
units they are taken as one consistent system, whatever it is.
"""


def _parser() -> argparse.ArgumentParser:
    parser = argparse.ArgumentParser(prog="torsionfe", description=_INTRO)
    parser.add_argument("--version", action="version", version=f"torsionfe {__version__}")
    commands = parser.add_subparsers(dest="command", metavar="COMMAND", required=True)
    _add_solve(commands)
    sections = commands.add_parser("sections", help="list the packaged example sections")
    sections.set_defaults(act=_sections)
    return parser


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
    solve.add_argument("--layer", metavar="NAME", action="append", help="read only this layer of a drawing (repeatable)")
    solve.add_argument("--fillet", metavar="R", help="round every sharp re-entrant corner with this radius")
    solve.add_argument("--keep-chords", action="store_true", help="don't restore arcs from chains of chords")
    solve.add_argument("--rel-tol", metavar="X", default="1e-3", help="width of the bracket of J over J (1e-3)")
    solve.add_argument("--peak-tol", metavar="X", default="2e-3", help="relative error of the peak stress (2e-3)")
    solve.add_argument("--order", metavar="P", type=int, default=2, help="degree of the elements (2)")
    solve.add_argument("--figure", metavar="FILE", help="write the stress contour (.png, .svg or .pdf)")
    solve.set_defaults(act=_solve)


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
            print(f"torsionfe: {note}", file=sys.stderr)
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
    solution = solve_torsion(outline, _number("--rel-tol", given.rel_tol), given.order, peak_tol=_number("--peak-tol", given.peak_tol))
    print(answer(solution, system, *numbers))
    if given.figure:
        from torsionfe.output.contour import plot_stress
        from torsionfe.output.figures import save_figure

        drawn = plot_stress(solution, torque=numbers[0], unit=system.length, stress_unit=system.stress)
        save_figure(drawn.axes.figure, given.figure)
        print(f"torsionfe: figure written to {given.figure}", file=sys.stderr)


def _number(name: str, text: str) -> float:
    try:
        return float(text)
    except ValueError:
        raise InputError(f"{name} must be a number, got {text!r}") from None


def _check_figure(path: str) -> None:
    """Refuse a figure that can't be written before any work is done."""
    from torsionfe.output.figures import check_figure_path

    check_figure_path(path)


def main(arguments: Sequence[str] | None = None) -> int:
    """Run the command; return its exit status."""
    try:
        given = _parser().parse_args(arguments)
    except SystemExit as stop:  # argparse has spoken: 2 for bad usage, 0 for help
        return int(stop.code or 0)
    try:
        given.act(given)
    except InputError as error:
        print(f"torsionfe: {error}", file=sys.stderr)
        return _BAD_INPUT
    except TorsionError as error:
        print(f"torsionfe: {error}", file=sys.stderr)
        return _BAD_INPUT if getattr(error, "at", None) is not None else _FAILED
    except KeyboardInterrupt:
        print("torsionfe: interrupted", file=sys.stderr)
        return _FAILED
    except BrokenPipeError:
        sys.stderr.close()
        return _FAILED
    return _DONE
