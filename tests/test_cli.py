"""The command: results to standard output, messages to standard error, exit status, nothing half-written."""

import json
import os
import re
import subprocess
import sys
from pathlib import Path

import jsonschema
import meshio
import pytest

import torsionfe
from torsionfe.cautions import MARGINS
from torsionfe.cli import main
from torsionfe.errors import SolveError
from torsionfe.job.reading import read_job
from torsionfe.outline import shapes
from torsionfe.outline.outline import Outline
from torsionfe.outline.samples import SAMPLES
from torsionfe.output.result_json import outline_of, result_schema
from torsionfe.quantities import UnitSystem
from torsionfe.study.single import answer
from torsionfe.torsion.solve import solve_torsion

QUICK = """
title = "Plate \\u001b[31m"
unit = "mm"
outline = { shape = "rectangle", width = 40, height = 10 }
[material]
source = "test"
shear_modulus = "27 GPa"
shear_yield = "100 MPa"
[[cases]]
name = "push"
torque = "50 N*m"
[bar]
length = 600
[sweep.grid]
width = [30, 40]
height = [5, 10]
[outputs]
figures = []
html = false
pdf = false
"""


@pytest.fixture
def job(tmp_path):
    path = tmp_path / "plate.toml"
    path.write_text(QUICK)
    return path


def run(capsys, *arguments):
    status = main([str(argument) for argument in arguments])
    out, err = capsys.readouterr()
    return status, out, err


def left_over(folder):
    return [path.name for path in folder.rglob("*") if path.name.endswith(".part")]


# --- help ---------------------------------------------------------------------------------------------------


def test_help_shows_the_first_steps(capsys):
    status, out, err = run(capsys, "--help")
    assert (status, err) == (0, "")
    for words in ("first steps", "solve sluice-lever", "starter lever.toml", "run lever.toml", "Exit status: 0 done"):
        assert words in out
    for command in ("solve", "run", "starter", "sweep", "sections"):
        status, out, err = run(capsys, command, "--help")
        assert (status, err) == (0, "")
        assert "--quiet" in out
    assert run(capsys, "--version") == (0, f"torsionfe {torsionfe.__version__}\n", "")


@pytest.mark.parametrize(
    "arguments", [(), ("sovle",), ("run",), ("run", "x.toml"), ("solve", "a", "--quiet", "--verbose")]
)
def test_bad_usage_is_status_2(capsys, arguments):
    status, out, err = run(capsys, *arguments)
    assert (status, out) == (2, "")
    assert err.startswith("usage: ")


def test_the_module_is_the_same_program():
    command = [sys.executable, "-m", "torsionfe", "sections"]
    found = subprocess.run(command, capture_output=True, text=True, check=True)
    assert "sluice-lever" in found.stdout
    assert found.stderr == ""


# --- solve --------------------------------------------------------------------------------------------------


def test_solve_prints_a_table_with_cautions(capsys):
    status, out, err = run(
        capsys, "solve", "winch-shaft", "--torque", "450 N*m", "--length", "600 mm", "--shear-modulus", "79 GPa"
    )
    assert (status, err) == (0, "")
    assert "torsion constant J" in out
    assert "MPa" in out
    assert all(line in out for line in MARGINS)


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        (("solve", "sluce-lever"), "neither a file nor a packaged section"),
        (("solve", "sluice-lever", "--torque", "450 Nm/s"), "torque"),
        (("solve", "sluice-lever", "--torque", "x"), "must be a number with a unit"),
        (("solve", "sluice-lever", "--rel-tol", "x"), "--rel-tol must be a number"),
        (("solve", "sluice-lever", "--length", "3"), "the twist needs torque, length and shear modulus"),
        (("solve", "sluice-lever", "--figure", "a.gif"), ".png"),
        (("run", "none.toml", "--out", "x"), "there is no file 'none.toml'"),
        (("starter", "none/lever.toml"), "cannot be written"),
    ],
)
def test_bad_input_is_status_2(capsys, tmp_path, monkeypatch, arguments, words):
    monkeypatch.chdir(tmp_path)
    status, out, err = run(capsys, *arguments)
    assert (status, out) == (2, "")
    assert err.startswith("torsionfe: ")
    assert words in err
    assert err.count("\n") == 1
    assert not list(tmp_path.iterdir())


def test_verbose_times_its_steps_and_quiet_says_nothing(capsys):
    loud = run(capsys, "solve", "winch-shaft", "--verbose")
    assert re.search(r"torsionfe: solving: \d+\.\d\d s\n", loud[2])
    drawing = Path(__file__).parents[1] / "examples" / "paddle_rail.dxf"
    noted = run(capsys, "solve", drawing, "--layer", "SECTION")
    quiet = run(capsys, "solve", drawing, "--layer", "SECTION", "--quiet")
    assert noted[:2] == quiet[:2]
    assert noted[0] == 0
    assert "torsionfe: left out what is no boundary" in noted[2]
    assert quiet[2] == ""


# --- starter and run ----------------------------------------------------------------------------------------


def test_starter_keeps_an_existing_file(capsys, tmp_path):
    path = tmp_path / "lever.toml"
    status, out, err = run(capsys, "starter", path)
    assert (status, out) == (0, "")
    assert f"torsionfe run {path} --out FOLDER" in err
    path.write_text("mine")
    status, out, err = run(capsys, "starter", path)
    assert status == 2
    assert "exists" in err
    assert path.read_text() == "mine"
    assert run(capsys, "starter", path, "--force", "--quiet") == (0, "", "")
    assert "title = " in path.read_text()


def test_run_prints_the_answer_and_writes_whole_files(capsys, job, tmp_path):
    status, out, err = run(capsys, "run", job, "--out", tmp_path / "new" / "folder")
    assert status == 0
    assert "Torsion constant J = " in out
    assert "Margins of safety" in out
    assert all(line in out for line in MARGINS)
    assert "\x1b" not in out + err
    assert "files written to" in err
    assert (tmp_path / "new" / "folder" / "result.json").is_file()
    assert left_over(tmp_path) == []
    assert run(capsys, "run", job, "--out", tmp_path / "new", "--quiet")[2] == ""


def test_data_for_other_programs(capsys, job, tmp_path):
    job.write_text(QUICK.replace("figures = []", "figures = []\ncsv = true\nfields = true"))
    assert run(capsys, "run", job, "--out", tmp_path)[0] == 0
    document = json.loads((tmp_path / "result.json").read_text())
    jsonschema.validate(document, result_schema())
    found = read_job(job)
    assert outline_of(document) == found.section.outline
    assert document["torque"] == 50e3
    assert document["parts"]["job"]["digest"] == found.digest
    assert document["parts"]["job"]["stated"]["cases.0.torque"] == {"text": "50 N*m", "value": 50e3}
    assert document["parts"]["cautions"][:3] == list(MARGINS)
    margin = document["parts"]["margins"][0]
    assert margin["margin"] == margin["allowable"] / margin["applied"] - 1.0
    # beta of a 4:1 rectangle is 0.281 (Timoshenko and Goodier, Theory of Elasticity, ch. 10)
    hand = document["parts"]["hand_method"][0]["torsion_constant"]
    assert hand == pytest.approx(0.281 * 40.0 * 10.0**3, rel=1e-3)
    rows = (tmp_path / "margins.csv").read_text().splitlines()
    assert rows[0].startswith("case,segment,criterion,torque")
    assert rows[1].startswith("push,,shear yield,50000.0")
    assert (tmp_path / "cases.csv").read_text().splitlines()[1].startswith("push,0,50000.0")
    assert (tmp_path / "section.csv").read_text().splitlines()[1].startswith("torsion constant,")
    assert meshio.read(tmp_path / "fields.vtu").point_data


def test_an_error_in_a_job_names_its_line(capsys, tmp_path):
    (tmp_path / "plate.toml").write_text(QUICK.replace("widht", "width").replace("width = 40", "widht = 40"))
    status, out, err = run(capsys, "run", tmp_path / "plate.toml", "--out", tmp_path / "out")
    assert (status, out) == (2, "")
    assert err.startswith("torsionfe: plate.toml, line 4: [outline] has no key 'widht': did you mean 'width'?")
    assert not (tmp_path / "out").exists()


def test_a_folder_that_cannot_be_made(capsys, job, tmp_path):
    (tmp_path / "file").write_text("")
    status, _, err = run(capsys, "run", job, "--out", tmp_path / "file")
    assert status == 2
    assert "cannot be made" in err


def test_an_interrupt_leaves_nothing_half_written(capsys, job, tmp_path, monkeypatch):
    out = tmp_path / "out"
    out.mkdir()
    (out / "result.json").write_text("older")

    def interrupted(*_):
        raise KeyboardInterrupt

    monkeypatch.setattr(os, "replace", interrupted)
    status, _, err = run(capsys, "run", job, "--out", out)
    assert (status, err.splitlines()[-1]) == (1, "torsionfe: interrupted")
    assert [path.name for path in out.iterdir()] == ["result.json"]
    assert (out / "result.json").read_text() == "older"


def test_anything_else_is_status_1(capsys, job, tmp_path, monkeypatch):
    from torsionfe.job import running

    def fails(*_, **__):
        raise SolveError("the equations have no solution")

    monkeypatch.setattr(running, "solve_torsion", fails)
    status, out, err = run(capsys, "run", job, "--out", tmp_path / "out")
    assert (status, out) == (1, "")
    assert err == "torsionfe: the equations have no solution\n"


def test_a_closed_pipe_is_no_traceback(tmp_path):
    command = f"{sys.executable} -m torsionfe solve winch-shaft | true; exit ${{PIPESTATUS[0]}}"
    found = subprocess.run(["bash", "-c", command], capture_output=True, text=True, check=False)
    assert "Traceback" not in found.stderr
    assert found.returncode in (0, 1)


# --- sweep --------------------------------------------------------------------------------------------------


def test_sweep_writes_a_table_maps_and_a_journal(capsys, job, tmp_path):
    maps = '[sweep]\nmaps = ["hand_error"]\n[sweep.grid]'
    job.write_text(QUICK.replace("figures = []", 'figures = ["svg"]').replace("[sweep.grid]", maps))
    out = tmp_path / "out"
    status, printed, err = run(capsys, "sweep", job, "--out", out, "--workers", "0")
    assert status == 0
    assert "Sweep: 4 sections" in printed
    assert all(line in printed for line in MARGINS)
    names = {path.name for path in out.iterdir()}
    assert {"sweep.csv", "sweep.journal", "map_hand_error.svg"} == names
    rows = (out / "sweep.csv").read_text().splitlines()
    assert len(rows) == 5
    again = run(capsys, "sweep", job, "--out", out, "--workers", "0", "--quiet")
    assert again[0] == 0
    assert (out / "sweep.csv").read_text().splitlines() == rows  # from the journal, times and all
    assert left_over(tmp_path) == []
    assert "journal" in err


def test_a_job_without_a_sweep(capsys, tmp_path):
    path = tmp_path / "plate.toml"
    path.write_text(QUICK.split("[sweep.grid]", maxsplit=1)[0])
    status, _, err = run(capsys, "sweep", path, "--out", tmp_path)
    assert status == 2
    assert "has no [sweep]" in err


def test_sections_lists_what_solve_takes(capsys):
    status, out, err = run(capsys, "sections")
    assert (status, err) == (0, "")
    assert [line.split()[0] for line in out.splitlines()[2:]] == list(SAMPLES)


def test_sharp_corners_are_said_with_their_remedy_and_filleted_on_request(capsys, tmp_path):
    path = tmp_path / "sharp.wkt"
    path.write_text("POLYGON ((0 0, 60 0, 60 12, 12 12, 12 40, 0 40, 0 0))")
    status, out, _ = run(capsys, "solve", path, "--rel-tol", "1e-2")
    assert status == 0
    assert re.search(r"sharp re-entrant corner +\(12, 12\): stress unbounded there; fillet it", out)
    status, out, _ = run(capsys, "solve", path, "--rel-tol", "1e-2", "--fillet", "5")
    assert status == 0
    assert "sharp re-entrant" not in out
    assert "peak shear stress" in out
    status, _, err = run(capsys, "solve", path, "--fillet", "500")
    assert status == 2
    assert "500" in err


def test_an_answer_says_what_it_missed_and_how_many_places_are_equal():
    twelve = Outline.from_polygon(shapes.regular(12, 40.0).polygon(0.01))
    shown = str(answer(solve_torsion(twelve), UnitSystem("")))
    assert "and at 8 more places" in shown
    short = str(answer(solve_torsion(twelve, 1e-6, max_unknowns=300), UnitSystem("")))
    assert re.search(r"NOT CONVERGED +the bracket of J is .* wide, not 1e-06.* within 300 unknowns", short)
    # star of four deep notches: every flank rises into a sharp corner
    star = Outline([(2, 0), (0.3, 0.3), (0, 2), (-0.3, 0.3), (-2, 0), (-0.3, -0.3), (0, -2), (0.3, -0.3)])
    assert "none finite: every flank rises into a sharp re-entrant corner" in str(
        answer(solve_torsion(star, peak_tol=1.0), UnitSystem(""))
    )


@pytest.mark.skipif(not Path("/dev/full").exists(), reason="this system has no full device")
def test_results_that_cannot_be_printed_are_no_traceback():
    with open("/dev/full", "w") as full:
        done = subprocess.run(
            [sys.executable, "-m", "torsionfe", "sections"], stdout=full, stderr=subprocess.PIPE, text=True, check=False
        )
    assert done.returncode == 1
    assert done.stderr == "torsionfe: the results can't be printed: No space left on device\n"


def test_a_sweep_with_too_many_values_draws_the_first_maps_and_says_so(capsys, job, tmp_path, monkeypatch):
    monkeypatch.setattr("torsionfe.job.sweeping._MOST_SHEETS", 1)
    text = job.read_text().replace("height = [5, 10]", "height = [5, 10]\ncorner_radius = [0, 1, 2]")
    job.write_text(text.replace("figures = []", 'figures = ["svg"]') + '[sweep]\nmaps = ["area"]\n')
    status, _, err = run(capsys, "sweep", job, "--out", tmp_path / "out")
    assert status == 0
    assert "maps: only the first 1 values of corner_radius are drawn" in err
    assert [path.name for path in (tmp_path / "out").glob("*.svg")] == ["map_area_1.svg"]
