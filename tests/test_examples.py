"""The examples: every job file gives its sheet, every script runs, and what they print is right."""

import dataclasses
import json
import math
import re
import runpy
import shutil
import subprocess
import sys
from functools import cache
from pathlib import Path

import pytest
from test_sheet import CHROMIUM, PDFTOPPM, PDFTOTEXT, Reading, ink, needs_chromium, needs_poppler, pdf_text

from torsionfe.cautions import MARGINS
from torsionfe.errors import InputError
from torsionfe.job.content import sheet_of
from torsionfe.job.data import csv_files, result_document
from torsionfe.job.keys import SHEET_SECTIONS
from torsionfe.job.reading import read_job
from torsionfe.job.running import run_job
from torsionfe.job.writing import result_words
from torsionfe.outline.samples import sample
from torsionfe.output.pdf import render_pdf
from torsionfe.output.sheet import Beside, Cells, Facts, Lines, Picture, render_html, svg_pictures

EXAMPLES = Path(__file__).parents[1] / "examples"
JOBS = sorted(path.stem for path in EXAMPLES.glob("*.toml"))
SCRIPTS = sorted(path.stem for path in EXAMPLES.glob("*.py") if not path.stem.endswith("_drawing"))


@cache
def result(name):
    return run_job(read_job(EXAMPLES / f"{name}.toml"))


@cache
def sheet(name):
    return sheet_of(result(name))


@cache
def drawn(name):
    return svg_pictures(sheet(name))


@cache
def pdf(name):
    return render_pdf(sheet(name))


def words(sheet):
    """Return all that a sheet says, a line a row."""

    def of(block):
        if isinstance(block, Facts | Cells):
            head = [block.head] if isinstance(block, Cells) else []
            return [" | ".join(row) for row in (*head, *block.rows)]
        if isinstance(block, Lines):
            return list(block.lines)
        if isinstance(block, Beside):
            return [line for part in block.left + block.right for line in of(part)]
        assert isinstance(block, Picture)
        return [f"picture {block.name}: {block.caption}"]

    return {section.title: [line for block in section.blocks for line in of(block)] for section in sheet.sections}


def test_there_are_four_jobs_each_with_a_script():
    assert {"sluice_lever", "winch_shaft", "deck_plank", "paddle_rail"} <= set(JOBS)
    assert set(JOBS) <= set(SCRIPTS)
    for name in JOBS:
        assert "invented" in (EXAMPLES / f"{name}.toml").read_text()


def test_job_files_describe_the_packaged_sections():
    assert read_job(EXAMPLES / "sluice_lever.toml").section.outline == sample("sluice-lever")
    assert read_job(EXAMPLES / "winch_shaft.toml").section.outline == sample("winch-shaft")
    assert read_job(EXAMPLES / "deck_plank.toml").section.outline.matches(sample("deck-plank"))


@pytest.mark.parametrize("name", JOBS)
def test_every_sheet_is_complete(name):
    found = words(sheet(name))
    titles = list(found)
    wanted = ["", "Section", "Inputs", "Method and assumptions", "Torsion constant", "Shear stress", "Hand method"]
    wanted += ["Bar", "Sensitivity", "Warnings", "Cautions", "References", "To make this sheet again"]
    assert titles == [title for title in wanted if title in titles]
    assert set(wanted) - set(titles) <= {"Hand method", "Sensitivity"}
    assert found["Cautions"][: len(MARGINS)] == list(MARGINS)
    assert found["Warnings"] == ["None: no sharp corners, no unrestored facets, tolerances met."]
    text = "\n".join(line for lines in found.values() for line in lines)
    assert result(name).job.digest in text
    assert "nan" not in text.lower().split()
    assert not re.search(r"/work|/tmp|/home", text)
    assert all(line in result_words(result(name)) for line in MARGINS)


@pytest.mark.parametrize("name", JOBS)
def test_both_forms_say_the_same(name):
    html = render_html(sheet(name), drawn(name))
    texts = set(Reading(html).texts)
    said = words(sheet(name))
    for title, lines in said.items():
        assert not title or title in texts
        for line in lines:
            for part in line.removeprefix("picture ").split(" | "):
                assert not part or part in texts or any(part.endswith(text) for text in texts if len(text) > 3), part
    assert len(html) < 2_000_000
    if name == "deck_plank" and PDFTOTEXT:
        read = re.sub(r"\s", "", pdf_text(pdf(name), "-raw"))
        for lines in said.values():
            for line in lines:
                for part in line.removeprefix("picture ").split(" | "):
                    last = part.split(": ", 1)[-1] if line.startswith("picture") else part
                    assert re.sub(r"\s", "", last)[:60] in read, last  # the rest may be on the next page


def test_what_the_lever_says():
    found = words(sheet("sluice_lever"))
    assert found["Inputs"] == [
        "material | cast bronze, invented",
        "source of its numbers | invented for this example",
        "strengths | strengths in shear from tension by von Mises, factor 0.5774",
        "units | mm, N; stress in MPa",
        "input | as stated | as used",
        "outline, leg x | 62 | 62 mm",
        "outline, leg y | 46 | 46 mm",
        "outline, thickness | 13 | 13 mm",
        "outline, root radius | 7 | 7 mm",
        "outline, toe radius | 4 | 4 mm",
        "material, shear modulus | 40 GPa | 40000 MPa",
        "material, tensile yield | 190 MPa | 190 MPa",
        "input | as stated | as used",
        "material, tensile ultimate | 330 MPa | 330 MPa",
        "case, lifting, torque | 260 N*m | 260000 N·mm",
        "case, paddle jammed by driftwood, torque | 340 N*m | 340000 N·mm",
        "case, paddle jammed by driftwood, limit factor | 1.1 | 1.1",
        "case, paddle jammed by driftwood, ultimate factor | 1.25 | 1.25",
        "bar, allowed twist | 3 deg | 0.0523599 rad",
        "bar, length | 250 mm | 250 mm",
    ]
    assert found["Section"][:5] == [
        "picture section: The section to scale, axes in mm; the numbers are those of its vertices.",
        "described by | trade shape: angle",
        "overall size | 62 × 46 mm",
        "area | 1238.65 mm²",
        "centroid | (22.34, 14.41) mm",
    ]
    answer = result("sluice_lever")
    j = answer.solution.torsion_constant
    value, low, high = map(float, re.match(r"Torsion constant J = (\d+) mm⁴ \((\d+) to (\d+)\)", found[""][5]).groups())
    assert low <= j.lower <= value <= j.upper <= high
    assert (high - low) < 1.3 * (j.upper - j.lower) + 2.0
    # by hand: 2 rectangles of b/t = 4.27 and 3.04, beta 0.285 and 0.264 (Timoshenko and Goodier, table in ch. 10)
    by_hand = (0.285 * 55.5 + 0.264 * 39.5) * 13.0**3
    row = next(line for line in found["Hand method"] if line.startswith("centreline"))
    assert float(row.split(" | ")[1]) == pytest.approx(by_hand, rel=5e-3)
    assert row.split(" | ")[3::3] == ["conservative", "not conservative"]


def test_margins_on_the_sheet_are_those_of_the_bar():
    answer = result("winch_shaft")
    rows = [line.split(" | ") for line in words(sheet("winch_shaft"))["Bar"]]
    margins = [row for row in rows if len(row) == 8][1:]
    assert len(margins) == len(answer.margins) == 10
    for row, margin in zip(margins, answer.margins, strict=True):
        assert row[0] == margin.case
        assert float(row[6]) == pytest.approx(margin.margin, abs=1.01e-3)
        assert float(row[6]) <= margin.margin  # rounded down
        assert float(row[7]) <= margin.largest_torque


def test_sensitivity_of_dimensions_and_of_edges():
    lever = words(sheet("sluice_lever"))["Sensitivity"]
    assert lever[1] == "What 0.1 mm more on each dimension does, the others kept:"
    rows = [line.split(" | ") for line in lever if line.count(" | ") == 4][1:]
    effects = result("sluice_lever").sensitivity
    assert [row[0] for row in rows] == ["leg x", "leg y", "thickness", "root radius", "toe radius"]
    for row, effect in zip(rows, effects, strict=True):
        assert float(row[2].split(" ± ")[0]) == pytest.approx(effect.constant_change, rel=1e-3)
        assert float(row[4].removesuffix(" %")) == pytest.approx(100.0 * effect.peak_share, rel=5e-3)
    plank = words(sheet("deck_plank"))["Sensitivity"]
    assert plank[1] == "What 0.1 mm more material along a whole edge does; the edges that count most:"
    rows = [line.split(" | ") for line in plank if line.count(" | ") == 3][1:]
    assert rows[0][0] == "0 to 1"
    gains = [float(row[2].split(" ± ")[0]) for row in rows]
    assert gains == sorted(gains, reverse=True)
    assert "fillet at" in plank[-2]


HELD = """
title = "Post"
unit = "mm"
[outline]
shape = "wide_flange"
depth = 120
flange_width = 80
flange_thickness = 8
web_thickness = 5
root_radius = 6
[material]
source = "invented"
shear_modulus = "27 GPa"
elastic_modulus = "71 GPa"
shear_yield = "110 MPa"
[[cases]]
name = "gust"
torque = "150 N*m"
[bar]
length = "1.2 m"
warping_held = "near"
[buckling]
force = "40 kN"
[sheet]
sections = ["bar", "references"]
[outputs]
csv = true
"""


def test_held_warping_and_buckling_on_the_sheet(tmp_path):
    (tmp_path / "post.toml").write_text(HELD)
    answer = run_job(read_job(tmp_path / "post.toml"))
    found = words(sheet_of(answer))
    solution, length = answer.solution, 1200.0
    rigidity, warping = 27e3 * solution.torsion_constant.value, 71e3 * solution.warping_constant
    decay = math.sqrt(warping / rigidity)
    # a cantilever whose held end cannot warp (Vlasov): theta = T / (G J) (L - tanh(k L) / k), B(0) = T tanh(k L) / k
    turn = 150e3 / rigidity * (length - decay * math.tanh(length / decay))
    moment = 150e3 * decay * math.tanh(length / decay)
    row = next(line for line in found["Bar"] if line.startswith("gust | 0."))
    numbers = row.replace("×10", "e").translate(str.maketrans("⁰¹²³⁴⁵⁶⁷⁸⁹", "0123456789")).split(" | ")
    assert float(numbers[1]) == pytest.approx(turn, rel=1e-3)
    assert float(numbers[3]) == pytest.approx(moment, rel=1e-3)
    assert numbers[4] == "100 %"
    added = moment * max(map(abs, solution.warping_extremes)) / solution.warping_constant
    assert float(numbers[5]) == pytest.approx(added, rel=1e-3)
    text = "\n".join(line for lines in found.values() for line in lines)
    wanted = [f"decay length √(E C_w / (G J)) | {decay:.4g}", "stands in none of the margins", "buckles first by | "]
    wanted += ["lower load over 40000 N", "Vlasov, V. Z.", "Elastic torsional buckling of a perfect"]
    assert [said for said in wanted if said not in text] == []
    assert any(line.startswith("Warping held adds normal stress of up to") for line in found[""])
    assert any(line.startswith("As a column it buckles elastically by") for line in found[""])
    assert "caution: Restrained warping by Vlasov's theory" in result_words(answer)
    # Timoshenko and Gere, art. 5.4
    area, _, (i_x, i_y, _) = solution.outline.edges.moments()
    load = (rigidity + math.pi**2 * warping / length**2) / ((i_x + i_y) / area)
    assert answer.buckling.load == pytest.approx(load, rel=2e-3)
    parts = json.loads(result_document(answer))["parts"]
    assert parts["restrained_warping"][0]["largest_bimoment"]["value"] == pytest.approx(moment, rel=1e-6)
    assert parts["buckling"]["force"] == 40e3
    assert any("Vlasov" in line for line in parts["cautions"])
    assert "sensitivity" not in parts
    assert "sensitivity.csv" not in csv_files(answer)
    assert "root_radius,7.0,0.1," in csv_files(result("sluice_lever"))["sensitivity.csv"]


def test_a_section_that_must_not_be_checked_by_that_formula(tmp_path):
    text = (EXAMPLES / "sluice_lever.toml").read_text()
    text = text.replace("shear_modulus =", 'elastic_modulus = "105 GPa"\nshear_modulus =')
    (tmp_path / "lever.toml").write_text(text + "\n[buckling]\n")
    with pytest.raises(InputError, match=r"^\[buckling\]: the centre of twist .* is off the centroid"):
        run_job(read_job(tmp_path / "lever.toml"))


def test_a_choice_of_sections_and_paper():
    job = read_job(EXAMPLES / "winch_shaft.toml")
    assert "hand" not in job.sheet.sections
    assert "Hand method" not in words(sheet("winch_shaft"))
    few = dataclasses.replace(job, sheet=dataclasses.replace(job.sheet, sections=("stress",)))
    titles = [section.title for section in sheet_of(dataclasses.replace(result("winch_shaft"), job=few)).sections]
    assert titles == ["", "Shear stress", "Warnings", "Cautions", "To make this sheet again"]
    assert sheet("deck_plank").paper == "letter"
    assert set(SHEET_SECTIONS) >= set(job.sheet.sections)


def test_a_sharp_corner_is_said_wherever_it_matters(tmp_path):
    text = (EXAMPLES / "sluice_lever.toml").read_text().replace("root_radius = 7", "root_radius = 0")
    (tmp_path / "sharp.toml").write_text(text)
    answer = run_job(read_job(tmp_path / "sharp.toml"))
    found = words(sheet_of(answer))
    assert any("sharp re-entrant corner" in line for line in found[""])
    assert any("not defined" in line for line in found[""])
    assert any("elastic stress is unbounded there" in line for line in found["Warnings"])
    assert any(line.startswith("Margin not defined: sharp re-entrant corner") for line in found["Bar"])
    assert any(line.endswith("not defined") for line in found["Hand method"])
    assert any("unbounded, fillet it" in line for line in found["Hand method"])


# --- looked at ----------------------------------------------------------------------------------------------


@needs_poppler
def test_pdf_pages_of_an_example(tmp_path):
    (tmp_path / "sheet.pdf").write_bytes(pdf("deck_plank"))
    subprocess.run([PDFTOPPM, "-r", "50", "-png", "sheet.pdf", "page"], cwd=tmp_path, check=True)
    pages = sorted(tmp_path.glob("page*.png"))
    assert 1 <= len(pages) <= 3
    for page in pages:
        share, rim = ink(page)
        assert 0.01 < share < 0.3
        assert not rim


@needs_chromium
@needs_poppler
def test_html_of_an_example_prints_on_three_pages(tmp_path):
    (tmp_path / "sheet.html").write_text(render_html(sheet("deck_plank"), drawn("deck_plank")), encoding="utf-8")
    command = [CHROMIUM, "--headless", "--no-sandbox", "--disable-gpu", f"--user-data-dir={tmp_path}/profile",
               "--no-pdf-header-footer", f"--print-to-pdf={tmp_path}/printed.pdf",
               f"file://{tmp_path}/sheet.html"]  # fmt: skip
    subprocess.run(command, capture_output=True, check=True, timeout=60)
    pages = pdf_text((tmp_path / "printed.pdf").read_bytes()).split("\f")[:-1]
    assert 1 <= len(pages) <= 3
    for page in pages:
        assert "Gate footbridge" in page
        assert "Revision A" in page


# --- scripts ------------------------------------------------------------------------------------------------

#: What each script must print.
PRINTED = {
    "sluice_lever": r"7 +70\d\d\d \(.*\) +57572.2 +-18 % +-20 %",
    "winch_shaft": r"smallest dimension that meets: 0\.8[78]",
    "deck_plank": r"torsion constant J +2204\d\d\d +2134\d\d\d +-3.2 %",
    "paddle_rail": r"arcs restored from chords +2",
    "notebook": r"J by hand / J = 0\.820\npeak by hand / peak = 0\.799",
}


@pytest.mark.parametrize("name", SCRIPTS)
def test_every_script_runs(name, capsys, monkeypatch):
    monkeypatch.setenv("MPLBACKEND", "Agg")
    runpy.run_path(str(EXAMPLES / f"{name}.py"), run_name="__main__")
    out, err = capsys.readouterr()
    assert err == ""
    assert re.search(PRINTED[name], out), out


def test_the_drawing_is_what_its_script_writes(tmp_path):
    shutil.copy(EXAMPLES / "paddle_rail_drawing.py", tmp_path)
    subprocess.run([sys.executable, str(tmp_path / "paddle_rail_drawing.py")], check=True)
    shutil.copy(EXAMPLES / "paddle_rail.toml", tmp_path)
    again, kept = (read_job(folder / "paddle_rail.toml").section.outline for folder in (tmp_path, EXAMPLES))
    assert again == kept
    corner = 1.0 - math.pi / 4.0  # what a fillet of radius 1 adds or takes
    area = 70.0 * 34.0 - 16.0 * 18.0 + 2.0 * corner * (4.0**2 - 5.0**2) - math.pi * 5.0**2
    assert kept.area == pytest.approx(area, rel=1e-9)
