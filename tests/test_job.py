"""Job files: what they may hold, what their errors say, and what they may not read."""

import hashlib
import re
import subprocess
import tomllib

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from torsionfe.errors import InputError, JobError
from torsionfe.job.job import SensitivityPlan
from torsionfe.job.keys import KEYS, SHAPES, shape_keys
from torsionfe.job.lines import key_lines, line_of
from torsionfe.job.places import inside
from torsionfe.job.reading import read_job
from torsionfe.job.starter import starter_text, write_starter
from torsionfe.outline import shapes
from torsionfe.outline.samples import sample

LEAST = 'title = "Lever"\nunit = "mm"\n'
BOX = 'outline = { shape = "rectangle", width = 40, height = 20 }\n'
OUT, FULL = LEAST + "[outline]\n", LEAST + BOX
BAR = """
[material]
source = "test"
shear_modulus = "27 GPa"
[[cases]]
torque = "450 N*m"
[bar]
length = 600
"""

ELASTIC = BAR.replace("[[cases]]", 'elastic_modulus = "71 GPa"\n[[cases]]')


@pytest.fixture
def job(tmp_path):
    def read(text, name="job.toml", **files):
        for file, data in files.items():
            (tmp_path / file.replace("__", ".")).write_text(data)
        path = tmp_path / name
        path.write_bytes(text if isinstance(text, bytes) else text.encode())
        return read_job(path)

    return read


# --- what a job says ----------------------------------------------------------------------------------------


def test_the_least_job(job):
    found = job(LEAST + BOX)
    assert found.heading.title == "Lever"
    assert found.section.outline == shapes.rectangle(40, 20)
    assert found.cases == ()
    assert found.bar is None
    assert found.sheet.paper == "a4"
    assert found.outputs.figures == ("svg",)


def test_numbers_come_in_the_jobs_units(job):
    found = job('title = "x"\nunit = "in"\noutline = { shape = "round_bar", diameter = "50.8 mm" }\n' + BAR)
    assert found.section.outline == shapes.round_bar(2.0)
    assert found.system.stress == "psi"
    assert found.material.shear_modulus == pytest.approx(27e9 / 6894.757293168, rel=1e-12)  # a psi in Pa
    assert found.cases[0].torque == pytest.approx(450.0 / 0.1129848290276167, rel=1e-12)  # lbf*in in N*m
    assert [item.text for item in found.stated][:2] == ["50.8 mm", "27 GPa"]


def test_every_number_is_kept_as_it_stands(job):
    found = job(LEAST + BOX + BAR)
    assert {".".join(map(str, item.path)): (item.text, item.value) for item in found.stated} == {
        "outline.width": ("40", 40.0),
        "outline.height": ("20", 20.0),
        "material.shear_modulus": ("27 GPa", 27e3),
        "cases.0.torque": ("450 N*m", 450e3),
        "bar.length": ("600", 600.0),
    }


def test_four_ways_to_give_an_outline(job):
    packaged = job('title="x"\nunit="cm"\noutline = { section = "sluice-lever" }')
    assert packaged.section.outline == sample("sluice-lever").scaled(0.1)
    points = job(LEAST + "outline = { vertices = [[0, 0], ['40 mm', 0], [40, 20], [0, 20]] }")
    assert points.section.outline.area == pytest.approx(800.0)
    text = "POLYGON ((0 0, 40 0, 40 20, 0 20, 0 0))"
    read = job(LEAST + 'outline = { file = "plate.wkt", file_unit = "mm" }', plate__wkt=text)
    assert read.section.outline == points.section.outline
    assert [file.name for file in read.files] == ["job.toml", "plate.wkt"]
    assert read.files[1].sha256 == hashlib.sha256(text.encode()).hexdigest()


def test_every_trade_shape_can_be_named(job):
    for name in SHAPES:
        assert callable(getattr(shapes, name))
        assert shape_keys(name)
    assert set(SHAPES) == set(shapes.__all__) - {"TradeShape"}
    voids = "voids = [[6, 6, 50, 48], [62, 6, 50, 48]]"
    many = job(LEAST + f'outline = {{ shape = "extrusion", width = 120, height = 60, {voids} }}')
    assert len(many.section.outline.voids) == 2
    assert job(LEAST + 'outline = { shape = "regular", sides = 6, across_flats = 30 }').section.outline.area > 0


def test_fillets_are_numbered_before_any_is_made(job):
    angle = "vertices = [[0, 0], [60, 0], [60, 12], [12, 12], [12, 50], [0, 50]]\n"
    fillets = "[[outline.fillets]]\nradius = 3\nat = [2, 4]\n[[outline.fillets]]\nradius = 6\n"
    found = job(OUT + angle + fillets)
    by_hand = job(LEAST + "[outline]\n" + angle).section.outline.filleted(6.0)  # vertex 3 becomes two
    by_hand = by_hand.filleted(3.0, at=[2, 5])
    assert found.section.outline.matches(by_hand)


def test_a_fillet_of_every_corner_keeps_the_trade_shape(job):
    tee = 'shape = "tee"\nflange_width = 60\ndepth = 50\nflange_thickness = 8\nweb_thickness = 7\n'
    found = job(OUT + tee + "[[outline.fillets]]\nradius = 5")
    assert found.section.outline.dimensions["root_radius"] == 5.0


def test_points_with_voids_and_arcs(job):
    ring = job(LEAST + "[outline]\nvertices = [[10, 0], [-10, 0]]\nbulges = [1, 1]\n"
               "[[outline.voids]]\nvertices = [[5, 0], [-5, 0]]\nbulges = [1, 1]")
    assert ring.section.outline.area == pytest.approx(np.pi * 75.0)


def test_a_stepped_bar_with_torques_at_stations(job):
    text = LEAST + BOX + """
[material]
source = "test"
shear_modulus = 27e3
shear_yield = 100
[[cases]]
name = "two"
at = [{ station = 1, torque = 5 }, { station = 2, torque = "1 N*m" }, { station = 2, torque = 1 }]
[bar]
held = 0
allowed_twist = "2 deg"
[[bar.segments]]
length = 10
[[bar.segments]]
name = "end"
length = 20
shear_modulus = 79e3
outline = { shape = "round_bar", diameter = 9 }
"""
    found = job(text)
    assert found.cases[0].torque == {1: 5.0, 2: 1001.0}
    parts = [(part.name, part.length, part.shear_modulus) for part in found.bar.segments]
    assert parts == [("0", 10, 27e3), ("end", 20, 79e3)]
    assert found.bar.segments[0].section is None
    assert found.bar.segments[1].section.outline == shapes.round_bar(9)
    assert found.material.allowables.twist == pytest.approx(np.radians(2.0))


def test_strengths_in_tension_go_through_the_criterion(job):
    found = job(LEAST + BOX + '[material]\nsource = "t"\ntensile_yield = 300\ncriterion = "Tresca"')
    assert found.material.allowables.shear_yield == 150.0


def test_held_warping_and_buckling(job):
    found = job(FULL + ELASTIC + 'warping_held = "both"\n[buckling]\nforce = "12 kN"\nlength_factor = 0.5')
    assert (found.bar.warping_held, found.material.elastic_modulus) == ("both", 71e3)
    assert (found.column.length, found.column.length_factor, found.column.force) == (600.0, 0.5, 12e3)
    alone = job(FULL + ELASTIC.split("[[cases]]", maxsplit=1)[0] + "[buckling]\nlength = 900")
    assert (alone.column.length, alone.column.length_factor, alone.column.force, alone.bar) == (900.0, 1.0, None, None)


def test_what_is_varied_by_a_little(job):
    assert job(FULL).sensitivity == SensitivityPlan(0.1, ("width", "height"))
    inches = 'title = "x"\nunit = "in"\noutline = { shape = "rectangle", width = 2.5, height = 1, corner_radius = 0 }'
    assert job(inches).sensitivity == SensitivityPlan(0.001, ("width", "height"))
    assert job(FULL + '[sensitivity]\nstep = 0.05\nof = "height"').sensitivity == SensitivityPlan(0.05, ("height",))
    six = 'outline = { shape = "regular", sides = 6, across_flats = 30 }'
    assert job(LEAST + six).sensitivity.of == ("across_flats",)
    points = job(LEAST + "outline = { vertices = [[0, 0], [400, 0], [400, 200]] }")
    assert points.sensitivity == SensitivityPlan(1.0)
    rounded = OUT + 'shape = "rectangle"\nwidth = 40\nheight = 20\n[[outline.fillets]]\nradius = 2\nat = [0]'
    assert job(rounded).sensitivity.of == ()


def test_tolerances_in_percent(job):
    found = job(LEAST + BOX + '[tolerance]\ntorsion_constant = "0.05 %"\npeak_stress = 0.01')
    assert (found.tolerance.torsion_constant, found.tolerance.peak_stress) == (0.0005, 0.01)


def test_a_sweeps_values(job):
    text = LEAST + BOX + """
[sweep.grid]
width = [40, "6 cm"]
height = { from = 10, to = 20, count = 3 }
corner_radius = { from = 1, to = 4, count = 3, spacing = "ratio" }
"""
    grid = dict(job(text).sweep.grid)
    assert grid == {"width": (40.0, 60.0), "height": (10.0, 15.0, 20.0), "corner_radius": (1.0, 2.0, 4.0)}


def test_a_date_and_line_ends_of_any_kind(job):
    found = job((LEAST + "date = 2031-04-30\n" + BOX).replace("\n", "\r\n").encode("utf-8-sig"))
    assert found.heading.date == "2031-04-30"


# --- what is wrong with it ----------------------------------------------------------------------------------

#: Text, the line that is named, and what the message says.
REGULAR = 'shape = "regular"\nsides = 6\nacross_flats = 20\n[sweep.grid]\n'
FILLETED = 'shape = "angle"\nleg_x = 60\nleg_y = 40\nthickness = 5\nfillets = [{ radius = 2 }]\n'
MILLION = "[sweep.grid]\nwidth = {from = 1, to = 2, count = 1002}\nheight = {from = 1, to = 2, count = 1002}"
WRONG = [
    (FULL + 'titel = "y"', 4, "no key 'titel': did you mean 'title'?"),
    (LEAST + "outline = { shape = 'rectangle', width = 40, hight = 20 }", 3, "no key 'hight': did you mean 'height'?"),
    (OUT + 'shape = "rectangel"\nwidth = 4\nheight = 3', 4, "did you mean 'rectangle'?"),
    (OUT + 'shape = "rectangel"\n', 4, "did you mean 'rectangle'?"),
    (OUT + 'shape = "rectangle"\nwidth = 40', 3, "[outline] needs 'height'"),
    (OUT + 'shape = "rectangle"\nwidth = 40\nheight = "20 kg"', 6, "outline.height: 'kg' is no unit"),
    (OUT + 'shape = "rectangle"\nwidth = 40\nheight = "20 MPa"', 6, "outline.height must be a length"),
    (OUT + 'shape = "rectangle"\nwidth = 40\nheight = true', 6, "outline.height must be a number"),
    (OUT + 'shape = "rectangle"\nwidth = 40\nheight = nan', 6, "outline.height must be finite"),
    (OUT + 'shape = "rectangle"\nwidth = 40\nheight = 1e999', 6, "outline.height must be finite"),
    (OUT + 'shape = "rectangle"\nwidth = 40\nheight = -1', 3, "outline: height must be greater than 0"),
    (OUT + 'shape = "angle"\nleg_x = 60\nleg_y = 40\nthickness = 50', 3, "outline: thickness 50"),
    (OUT + 'shape = "regular"\nsides = 2.5\nacross_flats = 3', 5, "outline.sides must be a whole number"),
    (OUT + 'section = "sluice-lver"', 4, "did you mean 'sluice-lever'?"),
    (OUT + 'section = "sluice-lever"\nfile = "a.dxf"', 5, "must have one of section, file, shape or vertices"),
    (OUT, 3, "got none of them"),
    (OUT + 'section = "sluice-lever"\nbulges = [1]', 5, "outline.bulges has no meaning beside 'section'"),
    (OUT + "vertices = [[0, 0], [1, 1, 1]]", 4, "outline.vertices must be a list of [x, y]"),
    (OUT + "vertices = [[0, 0], [2, 2], [2, 0], [0, 2]]", 4, "outline.vertices: "),
    (OUT + "vertices = [\n[0, 0],\n[2, 'x'],\n[2, 2]]", 6, "outline.vertices[1][1] must be a number with"),
    (OUT + "vertices = [[0, 0], [2, 0], [2, 2]]\nbulges = [0]", 5, "a list of 3 numbers"),
    (OUT + 'file = "none.dxf"', 4, "there is no file"),
    (OUT + 'file = "../none.dxf"', 4, "leads out of the job file's folder"),
    (OUT + 'file = "job.toml"', 4, "outline.file: job.toml: the ending '.toml' tells no format"),
    (OUT + 'section = "gate-beam"\n[[outline.fillets]]\nradius = 2', 5, "no sharp re-entrant corner"),
    (OUT + 'section = "gate-beam"\n[[outline.fillets]]\nradius = 2\nat = [99]', 5, "there is no vertex 99"),
    (OUT + 'section = "gate-beam"\n[[outline.fillets]]\nradius = 2\nat = [-1]', 7, "whole numbers from 0"),
    (LEAST, 1, "the job file needs 'outline'"),
    ('unit = "mm"\n' + BOX, 1, "needs 'title'"),
    ('title = "  "\nunit = "mm"\n' + BOX, 1, "title must not be empty"),
    ('title = 3\nunit = "mm"\n' + BOX, 1, "title must be text in quotes, got 3"),
    (f'title = "{"x" * 1001}"\nunit = "mm"\n' + BOX, 1, "1000 characters at most, got 1001"),
    ('title = "x"\nunit = "mmm"\n' + BOX, 2, "did you mean 'mm'?"),
    ('title = "x"\nunit = ""\n' + BOX, 2, "unit must be a unit of length"),
    ('title = "x"\nunit = "mm"\nforce = "kg"\n' + BOX, 2, "no unit of force"),
    (FULL + '[material]\nshear_modulus = "27 GPa"', 4, "[material] needs 'source'"),
    (FULL + '[material]\nsource = "t"\nshear_modulus = -2', 6, "must be greater than 0"),
    (FULL + '[material]\nsource = "t"\ntensile_yield = 3', 6, "criterion = 'von Mises' or 'Tresca'"),
    (FULL + '[material]\nsource = "t"\ntensile_yield = 3\nshear_yield = 3', 6, "in shear or in tension, not both"),
    (FULL + '[material]\nsource = "t"\nshear_yield = 3\nshear_ultimate = 2', 6, "are they exchanged?"),
    (FULL + '[material]\nsource = "t"\ntensile_yield = 3\ncriterion = "Mises"', 7, "did you mean 'von Mises'?"),
    (FULL + "[bar]\nlength = 3", 4, "[bar] needs a shear modulus"),
    (FULL + BAR.replace("600", "0"), 11, "bar.length must be greater than 0"),
    (FULL + BAR.replace("length = 600", ""), 10, "[bar] needs 'length', or segments"),
    (FULL + BAR + "held = [3]", 12, "there is no station 3, only 0 to 1"),
    (FULL + BAR + "held = []", 12, "bar.held is empty"),
    (FULL + BAR + "held = [0, 1]", 8, "acts at held stations only"),
    (FULL + BAR.replace("torque", "torqe"), 9, "[cases[0]] has no key 'torqe': did you mean 'torque'?"),
    (FULL + BAR + "[[cases]]\n[[cases]]\n", 12, "cases[1] needs 'torque'"),
    (FULL + BAR + '[[cases]]\nname = "1"\ntorque = 3', 13, "two cases are called '1'"),
    (FULL + BAR + "[[cases]]\ntorque = 3\nlimit_factor = 0", 12, "of case '2' must be greater than 0"),
    (FULL + BAR.split("[[cases]]", maxsplit=1)[0] + "[bar]\nlength = 2", 8, "[bar] needs a torque"),
    (FULL + ELASTIC + "warping_held = 'far'", 13, "must be one of 'near', 'both', got 'far'"),
    (FULL + ELASTIC + "warping_held = 'bot'", 13, "did you mean 'both'?"),
    (FULL + ELASTIC + "warping_hold = 'near'", 13, "did you mean 'warping_held'?"),
    (FULL + BAR + "warping_held = 'near'", 12, "bar.warping_held needs elastic_modulus in [material]"),
    (FULL + ELASTIC + "held = [0, 1]\nwarping_held = 'near'", 14, "held at station 0 only"),
    (FULL + ELASTIC.replace("71 GPa", "20 GPa"), 8, "is not above shear_modulus: are they exchanged?"),
    (FULL + ELASTIC.replace("71 GPa", "0 GPa"), 8, "material.elastic_modulus must be greater than 0"),
    (FULL + ELASTIC.replace("71 GPa", "71 mm"), 8, "material.elastic_modulus must be a stress"),
    (FULL + BAR + "[buckling]", 12, "[buckling] needs elastic_modulus and shear_modulus in [material]"),
    (FULL + ELASTIC + "[buckling]\nforce = '3 kNm'", 14, "buckling.force must be a force, such as '20 kN'"),
    (FULL + ELASTIC + "[buckling]\nforce = -3", 14, "buckling.force must be greater than 0"),
    (FULL + ELASTIC + "[buckling]\nlength = 0", 14, "buckling.length must be greater than 0"),
    (FULL + ELASTIC + "[buckling]\nlength_factor = 0", 14, "buckling.length_factor must be greater than 0"),
    (FULL + ELASTIC + "[buckling]\nlenght = 2", 14, "did you mean 'length'?"),
    (FULL + ELASTIC.split("[[cases]]", maxsplit=1)[0] + "[buckling]", 9, "there is no [bar] of one length"),
    (FULL + "[sensitivity]\nstep = 0", 5, "sensitivity.step must be greater than 0"),
    (FULL + "[sensitivity]\nstep = '1 MPa'", 5, "sensitivity.step must be a length"),
    (FULL + "[sensitivity]\nof = ['widht']", 5, "did you mean 'width'?"),
    (LEAST + 'outline = {section = "gate-beam"}\n[sensitivity]\nof = "depth"', 5, "set outline.shape"),
    (FULL + '[compare]\nplates = "deriv"', 5, "did you mean 'derive'?"),
    (FULL + "[compare]\nplates = []", 5, "compare.plates is empty"),
    (FULL + "[[compare.plates]]\nwidth = 3\nthickness = 0", 4, "thickness must be greater than 0"),
    (FULL + '[compare]\nidealisations = ["centerline"]', 5, "did you mean 'centreline'?"),
    (FULL + '[tolerance]\ntorsion_constant = "1 permille"', 5, "percent such as '0.1 %'"),
    (FULL + "[tolerance]\ntorsion_constant = 0", 5, "must be from 1e-09 to 1"),
    (FULL + "[tolerance]\norder = 9", 5, "a whole number from 1 to 6, got 9"),
    (FULL + '[sheet]\npaper = "A4"', 5, "did you mean 'a4'?"),
    (FULL + '[sheet]\nsections = ["strss"]', 5, "did you mean 'stress'?"),
    (FULL + "sheet = 3", 4, "sheet must be a table"),
    (FULL + "outline = 3", 4, "no valid TOML"),
    (FULL + '[outputs]\nfigures = ["gif"]', 5, "must be one of 'svg', 'pdf', 'png'"),
    (FULL + "[outputs]\npdf = 1", 5, "outputs.pdf must be true or false"),
    (FULL + "[sweep.grid]\nwith = [1]", 5, "[sweep.grid] has no key 'with': did you mean 'width'?"),
    (FULL + "[sweep.grid]\nwidth = [1, 1]", 5, "has a value twice"),
    (FULL + "[sweep.grid]\nwidth = {from = 1, to = 1, count = 3}", 5, "must differ"),
    (FULL + "[sweep.grid]\nwidth = {from = 1, count = 3}", 5, "needs 'to'"),
    (FULL + "[sweep.grid]", 4, "sweep.grid is empty: name a dimension, one of width, height, corner_radius"),
    (FULL + "[sweep.grid]\nwidth = []", 5, "sweep.grid.width must have 1 to"),
    (FULL + "[sweep.grid]\nwidth = [1, true]", 5, "must be a number"),
    (OUT + REGULAR + "sides = {from = 3, to = 5, count = 3}", 8, "sweep.grid.sides counts something: list its values"),
    (OUT + REGULAR + 'sides = [3, "4"]', 8, "sides must be plain numbers, got '4'"),
    (FULL + MILLION, 4, "sweep.grid has 1004004 sections; 1000000 at most"),
    (OUT + FILLETED + "[sweep.grid]\nleg_x = [50, 60]", 9, "can't vary a shape with outline.fillets"),
    (OUT + FILLETED.replace("2 }", "2, at = 9 }"), 8, "there is no vertex 9: the outer loop has 0 to 5"),
    (OUT + FILLETED.replace("2 }", "2 }, { radius = 1 }"), 8, "only one radius can be without 'at'"),
    (FULL + "[sheet]\nsections = [1]", 5, "text, or a list of texts"),
    (FULL + "cases = 3", 4, "cases must be one table or more, [[cases]]"),
    (FULL + "[compare]\nplates = [{width = 4, thickness = 2}]\nidealisations = ['shape']", 6, "no meaning beside"),
    (LEAST + 'outline = {section = "sluice-lever"}\n[compare]\nplates = "shape"', 5, "needs outline.shape"),
    (FULL + "[[cases]]\nat = [{ station = 1, torque = 450 }]", 4, "torques at stations need a [bar]"),
    (LEAST + 'outline = {section = "gate-beam"}\n[sweep.grid]\ndepth = [1]', 4, "set outline.shape"),
    (LEAST + 'folders = ["nowhere"]\n' + BOX, 3, "there is no folder 'nowhere'"),
    (FULL + "x = [", 4, "no valid TOML"),
    (b'title = "\xff"', 1, "no text in UTF-8"),
    ("x = " + "[" * 5000 + "]" * 5000, None, "no valid TOML"),
    ("x = " + "9" * 5000, None, "no valid TOML"),
]


@pytest.mark.parametrize(("text", "line", "words"), WRONG, ids=[f"{k}" for k in range(len(WRONG))])
def test_errors_name_file_line_and_remedy(job, text, line, words):
    with pytest.raises(JobError) as caught:
        job(text)
    message = str(caught.value)
    assert words in message
    assert message.startswith("job.toml, line " if line else "job.toml")
    if line:
        assert message.startswith(f"job.toml, line {line}: ")
        assert caught.value.line == line
    assert "\n" not in message or "outline" in message


def test_no_file_and_too_large_a_file(tmp_path):
    with pytest.raises(InputError, match="there is no file"):
        read_job(tmp_path / "none.toml")
    with pytest.raises(InputError, match="is no file"):
        read_job(tmp_path)
    (tmp_path / "large.toml").write_text("#" * 1_000_001)
    with pytest.raises(InputError, match="over 1000000 bytes"):
        read_job(tmp_path / "large.toml")


# --- what it may not read -----------------------------------------------------------------------------------


def test_files_outside_of_the_folders_are_refused(tmp_path):
    home, other = tmp_path / "home", tmp_path / "other"
    for folder in (home / "below", other):
        folder.mkdir(parents=True)
        (folder / "plate.wkt").write_text("POLYGON ((0 0, 4 0, 4 2, 0 2, 0 0))")
    (home / "link.wkt").symlink_to(other / "plate.wkt")
    (home / "door").symlink_to(other)

    def read(name, more=""):
        (home / "job.toml").write_text(f"{LEAST}{more}\noutline = {{ file = '{name}', file_unit = 'mm' }}")
        return read_job(home / "job.toml")

    assert read("below/plate.wkt").section.outline.area == 8.0
    assert read("below/../below/plate.wkt").section.outline.area == 8.0
    for name in ("../other/plate.wkt", str(other / "plate.wkt"), "link.wkt", "door/plate.wkt", "/etc/passwd"):
        with pytest.raises(JobError, match="leads out of the job file's folder"):
            read(name)
        if "passwd" not in name:
            assert read(name, 'folders = ["../other"]').section.outline.area == 8.0
    assert read(str(home / "below" / "plate.wkt")).section.outline.area == 8.0


def test_a_zero_byte_in_a_name_and_a_pipe(tmp_path):
    with pytest.raises(InputError, match="zero byte"):
        inside(tmp_path, "a\0b")
    (tmp_path / "job.toml").write_text(LEAST + 'folders = ["a\\u0000b"]\n' + BOX)
    with pytest.raises(JobError, match="no folder"):
        read_job(tmp_path / "job.toml")
    subprocess.run(["mkfifo", str(tmp_path / "pipe.wkt")], check=True)
    (tmp_path / "job.toml").write_text(LEAST + 'outline = { file = "pipe.wkt" }')
    with pytest.raises(JobError, match="is no file"):
        read_job(tmp_path / "job.toml")


def test_the_digest_is_what_common_tools_print(job, tmp_path):
    square = "POLYGON ((0 0, 4 0, 4 2, 0 2, 0 0))"
    found = job(LEAST + 'outline = { file = "plate.wkt", file_unit = "mm" }', plate__wkt=square)
    command = "sha256sum job.toml plate.wkt | sha256sum"
    printed = subprocess.run(command, shell=True, cwd=tmp_path, capture_output=True, text=True, check=True).stdout
    assert printed.split()[0] == found.digest
    before = found.digest
    assert job(LEAST + BOX).digest != before


# --- lines --------------------------------------------------------------------------------------------------


def test_lines_of_a_document_with_everything():
    text = '''# heading = 1
a = """
b = 1
""" # "x"
c.d = [1, # ]
  { e = "]", f = 2 },
]
"g h" = \'\'\'
[no]\'\'\'
[i."j.k"]
l = 1979-05-27T07:32:00Z
[[m]]
n = -1.5e3
[[m]]
[m.o]
p = true
[[m.q]]
[[m.q]]
r = [[1, 2],
     [3, 4]]
'''
    lines = key_lines(text)
    wanted = {
        ("a",): 2, ("c",): 5, ("c", "d"): 5, ("c", "d", 0): 5, ("c", "d", 1): 6, ("c", "d", 1, "f"): 6, ("g h",): 8,
        ("i", "j.k"): 10, ("i", "j.k", "l"): 11, ("m", 0): 12, ("m", 0, "n"): 13, ("m", 1): 14, ("m", 1, "o"): 15,
        ("m", 1, "o", "p"): 16, ("m", 1, "q", 0): 17, ("m", 1, "q", 1): 18, ("m", 1, "q", 1, "r", 1, 1): 20,
    }  # fmt: skip
    assert {path: lines.get(path) for path in wanted} == wanted
    assert ("b",) not in lines
    assert ("no",) not in lines
    assert line_of(lines, ("c", "d", 1, "z", 7)) == 6
    assert line_of(lines, ("zz",)) == 1


def paths_of(data, path=()):
    yield path
    if isinstance(data, dict):
        for key, value in data.items():
            yield from paths_of(value, (*path, key))
    elif isinstance(data, list):
        for k, value in enumerate(data):
            yield from paths_of(value, (*path, k))


def written(value):
    if isinstance(value, dict):
        return "{" + ", ".join(f"{quoted(key)} = {written(item)}" for key, item in value.items()) + "}"
    if isinstance(value, list):
        return "[\n" + ",\n".join(written(item) for item in value) + "]"
    return quoted(value) if isinstance(value, str) else str(value).lower()


def quoted(text):
    return '"' + "".join(f"\\u{ord(s):04x}" if s in '\\"' or ord(s) < 32 or ord(s) == 127 else s for s in text) + '"'


values = st.recursive(
    st.integers() | st.booleans() | st.text(max_size=8),
    lambda inner: st.lists(inner, max_size=3) | st.dictionaries(st.text(max_size=5), inner, max_size=3),
    max_leaves=12,
)


@given(st.dictionaries(st.text(max_size=6), values, max_size=4))
def test_every_path_of_any_document_has_its_line(data):
    text = "".join(f"# {quoted(key)} = [\n{quoted(key)} = {written(value)}\n" for key, value in data.items())
    assert tomllib.loads(text) == data
    lines = key_lines(text)
    assert set(lines) == set(paths_of(data)) - {()}
    order = [lines[path] for path in paths_of(data) if path]
    assert order == sorted(order)
    rows = text.split("\n")
    for key in data:
        assert rows[lines[(key,)] - 1].startswith(quoted(key))


# --- the starter --------------------------------------------------------------------------------------------


def test_the_starter_names_every_key_and_can_be_read(tmp_path):
    text = starter_text()
    for table, keys in KEYS.items():
        for key in keys:
            assert re.search(rf"\b{key}\b", text), f"the starter says nothing of {table}.{key}"
    for shape in SHAPES:
        assert shape in text
    path = write_starter(tmp_path / "lever.toml")
    assert read_job(path).section.outline == shapes.angle(62, 46, 13, 7, 4)
    with pytest.raises(InputError, match="exists"):
        write_starter(path)
    path.write_text("mine")
    assert write_starter(path, overwrite=True).read_text() == text
    with pytest.raises(InputError, match="cannot be written"):
        write_starter(tmp_path / "none" / "lever.toml")


def test_everything_that_the_starter_comments_out_is_valid(tmp_path):
    """Each commented key is read where it stands, alone or with the table that it belongs to."""
    lines = starter_text().split("\n")
    optional = [k for k, line in enumerate(lines) if re.match(r"# (\w+) = ", line)]
    heads = [k for k, line in enumerate(lines) if re.match(r"(# )?\[", line)]
    outline = {"section", "file", "file_unit", "layers", "restore_arcs", "facet_tolerance", "vertices", "bulges"}
    tried = 0
    for k in optional:
        key = lines[k].split()[1]
        above = [line for line in lines[:k] if line.strip()][-1]
        if any(lines[head].startswith("# [") for head in [head for head in heads if head < k][-1:]):
            continue  # of a table that is commented out itself
        if key in outline or above.startswith("# [[") or key in ("at", "width", "thickness", "shear_modulus", "length"):
            continue
        if key.startswith("tensile") or key in ("criterion", "folders", "maps", "root_radius", "outline"):
            continue
        if key == "warping_held":  # needs elastic_modulus, too
            continue
        text = "\n".join([*lines[:k], lines[k][2:], *lines[k + 1 :]])
        (tmp_path / "job.toml").write_text(text)
        assert read_job(tmp_path / "job.toml")
        tried += 1
    assert tried >= 15


def test_alternatives_in_the_starter_can_be_read(tmp_path):
    text = starter_text()

    def without_comments(begin, end=None):
        block = text[text.index(begin) : text.index(end) if end else None]
        return "\n".join(line.removeprefix("# ") for line in block.split("\n"))

    segments = without_comments("# [[bar.segments]]", "# --- the bar as")
    stations = without_comments("# [[cases]]\n# name = \"torques", "# --- the bar")
    one = text.replace('length = "250 mm"\n', "") + "\n" + segments + segments + stations
    (tmp_path / "job.toml").write_text(one)
    found = read_job(tmp_path / "job.toml")
    assert len(found.bar.segments) == 2
    assert found.cases[1].torque == {1: 200e3, 2: -50e3}
    (tmp_path / "job.toml").write_text(text + "\n" + without_comments("# [sweep]"))
    assert len(read_job(tmp_path / "job.toml").sweep.grid["root_radius"]) == 8
    elastic = without_comments('# elastic_modulus', "shear_yield")
    column = without_comments("# warping_held", "# [[bar.seg") + without_comments("# [buckling]", "# --- the hand")
    column += without_comments("# [sensitivity]", "# --- how sure")
    bar = text[: text.index("[bar]")].replace("shear_yield", elastic + "shear_yield", 1) + '[bar]\nlength = "250 mm"\n'
    (tmp_path / "job.toml").write_text(bar + column)
    found = read_job(tmp_path / "job.toml")
    assert (found.bar.warping_held, found.material.elastic_modulus) == ("near", 105e3)
    assert (found.column.force, found.column.length, found.column.length_factor) == (30e3, 250.0, 1.0)
    assert (found.sensitivity.step, found.sensitivity.of) == (0.1, ("thickness", "root_radius"))
    points = without_comments("# vertices = ", "# --- material")
    (tmp_path / "job.toml").write_text(LEAST + "[outline]\n" + points.replace("[2, 7]", "[0]"))
    assert len(read_job(tmp_path / "job.toml").section.outline.voids) == 1
