"""What a job found, as text and as files."""

from __future__ import annotations

import os
from pathlib import Path

from torsionfe.cautions import MARGINS, cautions
from torsionfe.errors import InputError
from torsionfe.job.content import sheet_of, verdict
from torsionfe.job.data import cautions_of, csv_files, result_document
from torsionfe.job.findings import section_torque
from torsionfe.job.running import JobResult, Progress
from torsionfe.output.fields import write_fields
from torsionfe.output.pdf import render_pdf
from torsionfe.output.sheet import figure_bytes, render_html, svg_pictures
from torsionfe.storing import store
from torsionfe.text import printable

__all__ = ["check_folder", "result_words", "write_result"]


def check_folder(path: str | os.PathLike[str]) -> Path:
    """Return a folder to write to, made where it does not exist.

    Raises
    ------
    InputError
        It cannot be made, is a file, or cannot be written to.
    """
    folder = Path(path)
    try:
        folder.mkdir(parents=True, exist_ok=True)
    except (OSError, ValueError) as error:
        raise InputError(f"the folder {str(folder)!r} cannot be made: {getattr(error, 'strerror', error)}") from error
    if not os.access(folder, os.W_OK):
        raise InputError(f"the folder {str(folder)!r} cannot be written to")
    return folder


def result_words(result: JobResult) -> str:
    """Return a job's result as text: the answer, the margins, and the cautions that they need."""
    title = " ".join(result.job.heading.title.split())
    lines = [title, "=" * min(len(title), 78), *verdict(result)]
    lines += ["", str(result.margins)] if result.margins is not None else [cautions()]
    lines += [f"caution: {line}" for line in cautions_of(result) if line not in MARGINS]
    return printable("\n".join(lines))


def write_result(result: JobResult, folder: Path, say: Progress | None = None) -> list[Path]:
    """Write the files that a job asks for; return them.

    All are made before the first is written, and each is written beside its place and then renamed: a reader never
    sees half of one.

    Parameters
    ----------
    result : JobResult
    folder : Path
        Exists.
    say : callable, optional
        Called with a line of text as each step begins.

    Raises
    ------
    InputError
        A file cannot be written.
    """
    say = say or (lambda line: None)
    outputs = result.job.outputs
    sheet = sheet_of(result)
    made: dict[Path, bytes] = {}
    svgs: dict[str, str] = {}
    if outputs.html:
        say("setting sheet.html")
        svgs = svg_pictures(sheet)
        made[Path("sheet.html")] = render_html(sheet, svgs).encode("utf-8")
    if outputs.pdf:
        say("setting sheet.pdf")
        made[Path("sheet.pdf")] = render_pdf(sheet)
    if outputs.json:
        made[Path("result.json")] = result_document(result).encode("ascii")
    if outputs.csv:
        made |= {Path(name): text.encode("utf-8") for name, text in csv_files(result).items()}
    for ending in outputs.figures:
        say(f"drawing figures as {ending}")
        for picture, width in sheet.pictures():
            known = svgs.get(picture.name) if ending == "svg" else None
            data = known.encode("utf-8") if known else figure_bytes(picture, width, ending)
            made[Path("figures") / f"{picture.name}.{ending}"] = data
    say("writing")
    if any(path.parent.name for path in made):
        check_folder(folder / "figures")
    written = [store(folder / path, data) for path, data in made.items()]
    if outputs.fields:
        say("writing the fields")
        load = section_torque(result)
        torque = load[0] if load and load[0] else None
        written.append(write_fields(result.solution, folder / "fields.vtu", torque))
    return written
