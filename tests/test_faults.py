"""What a machine can do to a run: full disks, folders that can't be written, odd terminals, fonts and switches."""

import builtins
import os
import resource
import subprocess
import sys
from pathlib import Path

import pytest

import torsionfe as tf
from torsionfe import storing
from torsionfe.errors import InputError, MissingExtraError
from torsionfe.output.figures import save_figure

ROOT = Path(tf.__file__).parent.parent
SECTION = tf.shapes.angle(40.0, 30.0, 6.0, root_radius=5.0)
JOB = """\
title = "small"
unit = "mm"
outline = {shape = "rectangle", width = 20, height = 10}
tolerance = {torsion_constant = 0.01, peak_stress = 0.05}
sheet = {sections = ["constant"]}
outputs = {pdf = false}
"""
SOLVE = ("solve", "sluice-lever", "--rel-tol", "1e-2", "--peak-tol", "0.1")


def command(*arguments, switches=(), cwd=None, limit=None, **options):
    """Run the command in a process of its own."""
    environment = {**os.environ, "PYTHONPATH": str(ROOT), **options.pop("env", {})}

    def smaller():
        resource.setrlimit(resource.RLIMIT_FSIZE, (limit, limit))

    return subprocess.run(
        [sys.executable, *switches, "-m", "torsionfe", *arguments],
        cwd=cwd,
        env=environment,
        capture_output="stdout" not in options,
        text=True,
        check=False,
        preexec_fn=smaller if limit else None,
        **options,
    )


def files_in(folder):
    return sorted(str(path.relative_to(folder)) for path in folder.rglob("*") if path.is_file())


@pytest.fixture(scope="module")
def solution():
    return tf.solve_torsion(SECTION, rel_tol=1e-2, peak_tol=0.1)


# --- disks and folders -------------------------------------------------------------------------------------


def test_a_full_disk_ends_in_a_line_and_leaves_no_half_file(tmp_path):
    (tmp_path / "old.png").write_bytes(b"kept")
    found = command(*SOLVE, "--figure", "old.png", cwd=tmp_path, limit=4096)
    assert found.returncode == 2
    assert found.stderr.strip() == "torsionfe: 'old.png' cannot be written: File too large"
    assert files_in(tmp_path) == ["old.png"]
    assert (tmp_path / "old.png").read_bytes() == b"kept"


def test_a_full_disk_under_a_sheet(tmp_path):
    (tmp_path / "job.toml").write_text(JOB)
    found = command("run", "job.toml", "--out", "sheet", cwd=tmp_path, limit=8192)
    assert found.returncode == 2
    assert "cannot be written: File too large" in found.stderr
    assert "Traceback" not in found.stderr
    assert files_in(tmp_path) == ["job.toml"]


@pytest.mark.skipif(not os.path.exists("/dev/full"), reason="needs /dev/full")
def test_results_that_cannot_be_printed():
    with open("/dev/full", "w") as full:
        found = command(*SOLVE, stdout=full, stderr=subprocess.PIPE)
    assert found.returncode == 1
    assert found.stderr == "torsionfe: the results can't be printed: No space left on device\n"


def test_nobody_reads_the_results():
    reader, writer = os.pipe()
    os.close(reader)
    found = command(*SOLVE, stdout=writer, stderr=subprocess.PIPE)
    os.close(writer)
    assert (found.returncode, found.stderr) == (1, "")


def test_standard_output_closed():
    script = f"exec '{sys.executable}' -m torsionfe {' '.join(SOLVE)} >&-"
    found = subprocess.run(
        ["sh", "-c", script], env={**os.environ, "PYTHONPATH": str(ROOT)}, capture_output=True, text=True, check=False
    )
    assert found.returncode in (0, 1)
    assert "Traceback" not in found.stderr


def test_a_folder_that_cannot_be_written(tmp_path, solution, monkeypatch):
    # an administrator may write everywhere, so a file stands where the folder should be
    (tmp_path / "file").write_text("")
    with pytest.raises(InputError, match="does not exist"):
        save_figure(solution.plot(), tmp_path / "file" / "figure.png")
    with pytest.raises(InputError, match="cannot be written"):
        tf.write_json(solution, tmp_path / "file" / "result.json")
    with pytest.raises(InputError, match="cannot be written"):
        tf.write_outline(SECTION, tmp_path / "no such folder" / "outline.dxf")
    monkeypatch.setattr(os, "access", lambda path, mode: False)
    with pytest.raises(InputError, match="no permission"):
        save_figure(solution.plot(), tmp_path / "figure.png")


@pytest.mark.parametrize("fault", [PermissionError(13, "Permission denied"), OSError(30, "Read-only file system")])
def test_an_output_held_open_or_on_a_read_only_disk(tmp_path, monkeypatch, fault):
    target = tmp_path / "result.csv"
    target.write_text("kept")

    def refuse(*_):
        raise fault

    monkeypatch.setattr(storing.os, "replace", refuse)
    with pytest.raises(InputError, match=fault.strerror):
        tf.write_csv(tf.plate_sum(SECTION.plates()), target)
    assert target.read_text() == "kept"
    assert files_in(tmp_path) == ["result.csv"]


@pytest.mark.parametrize("stop", [KeyboardInterrupt, MemoryError])
def test_an_interrupted_write_leaves_the_older_file(tmp_path, monkeypatch, stop):
    target = tmp_path / "result.json"
    target.write_text("kept")

    def interrupt(*_):
        raise stop

    monkeypatch.setattr(storing.os, "replace", interrupt)
    with pytest.raises(stop):
        storing.store(target, b"half")
    assert target.read_text() == "kept"
    assert files_in(tmp_path) == ["result.json"]


# --- what is not installed ---------------------------------------------------------------------------------


def without(monkeypatch, library):
    real = builtins.__import__

    def guarded(name, *rest, **more):
        if name == library or name.startswith(f"{library}."):
            raise ImportError(f"No module named {library!r}")
        return real(name, *rest, **more)

    for name in [name for name in sys.modules if name == library or name.startswith(f"{library}.")]:
        monkeypatch.delitem(sys.modules, name)
    monkeypatch.setattr(builtins, "__import__", guarded)


def test_missing_extras_name_what_to_install():
    error = MissingExtraError.of("distributed", "cluster", "a cluster")
    assert "pip install 'torsionfe[cluster]'" in str(error)
    assert isinstance(error, ImportError)


def test_solving_needs_none_of_the_libraries_of_files_and_figures(monkeypatch):
    for library in ("matplotlib", "ezdxf", "meshio", "jinja2", "tqdm", "distributed", "pandas"):
        without(monkeypatch, library)
    found = tf.solve_torsion(tf.shapes.rectangle(3.0, 2.0), rel_tol=1e-2, peak_tol=0.1)
    assert "torsion constant J" in str(found)


# --- terminals, places and switches ------------------------------------------------------------------------


def test_a_terminal_that_knows_only_ascii(tmp_path):
    (tmp_path / "job.toml").write_text(JOB)
    found = command("run", "job.toml", "--out", "sheet", cwd=tmp_path, env={"PYTHONIOENCODING": "ascii", "LC_ALL": "C"})
    assert found.returncode == 0, found.stderr
    assert found.stdout.isascii()
    assert "Torsion constant J" in found.stdout


def test_paths_with_spaces_and_letters_of_every_kind(tmp_path):
    folder = tmp_path / "Schleuse – Nr. 7" / "水門"
    folder.mkdir(parents=True)
    tf.write_outline(SECTION, folder / "Hebel äöü.dxf", unit="mm")
    found = command("solve", "Hebel äöü.dxf", "--torque", "20 N*m", "--figure", "Bild 1 é.svg", cwd=folder)
    assert found.returncode == 0, found.stderr
    assert (folder / "Bild 1 é.svg").read_text(encoding="utf-8").startswith("<?xml")
    assert tf.read_outline(folder / "Hebel äöü.dxf").matches(SECTION)


def test_switches_of_the_interpreter_change_no_bit(tmp_path):
    plain = command(*SOLVE, "--figure", "a.svg", cwd=tmp_path)
    strict = command(*SOLVE, "--figure", "b.svg", cwd=tmp_path, switches=("-O", "-W", "error"))
    assert strict.returncode == 0, strict.stderr
    assert plain.stdout == strict.stdout
    assert (tmp_path / "a.svg").read_bytes() == (tmp_path / "b.svg").read_bytes()


def test_no_display_no_home_and_a_font_that_is_not_there(tmp_path):
    (tmp_path / "matplotlibrc").write_text("font.family: No Such Font\nbackend: TkAgg\n")
    bare = {"PATH": os.environ["PATH"], "PYTHONPATH": str(ROOT), "MPLCONFIGDIR": str(tmp_path)}
    found = subprocess.run(
        [sys.executable, "-W", "error", "-m", "torsionfe", *SOLVE, "--figure", "a.png"],
        cwd=tmp_path,
        env=bare,
        capture_output=True,
        text=True,
        check=False,
    )
    assert found.returncode == 0, found.stderr
    assert "Traceback" not in found.stderr
    assert (tmp_path / "a.png").read_bytes().startswith(b"\x89PNG")


def test_a_locale_with_decimal_commas_changes_nothing(monkeypatch, solution):
    import locale

    monkeypatch.setattr(locale, "localeconv", lambda: {"decimal_point": ",", "thousands_sep": ".", "grouping": [3, 0]})
    text = tf.csv_text(solution)
    assert tf.markdown_text(solution)
    lower = next(line for line in text.splitlines() if line.startswith("torsion constant")).split(",")[2]
    assert float(lower) == solution.torsion_constant.lower


