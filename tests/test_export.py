"""Data out: JSON after its schema, CSV and Markdown as text, fields that viewers read back, notebooks."""

import csv
import io
import json
import locale
import math
import os
import re
import sys
import types
from functools import cache
from html.parser import HTMLParser
from xml.etree import ElementTree

import jsonschema
import meshio
import numpy as np
import pytest

import torsionfe as tf
from torsionfe.member.margins import Margin
from torsionfe.outline import shapes
from torsionfe.outline.samples import sample
from torsionfe.output.fields import element_means, field_mesh, write_fields
from torsionfe.output.notebook import html_table, inline_svg, rich_html
from torsionfe.output.result_json import json_text, outline_of, plain_data, result_schema, to_json, write_json
from torsionfe.output.tables import Table, csv_text, markdown_text, tabulated, write_csv, write_markdown

VALID = jsonschema.Draft202012Validator(result_schema())


def star():
    turn = np.arange(10) * np.pi / 5.0
    reach = np.where(np.arange(10) % 2 == 0, 10.0, 4.0)
    return tf.Outline(np.stack([reach * np.cos(turn), reach * np.sin(turn)], axis=1))


SECTIONS = {
    "lever": lambda: sample("sluice-lever"),
    "plank": lambda: sample("deck-plank"),
    "sharp": lambda: shapes.angle(80.0, 80.0, 8.0),
    "star": star,
    "strip": lambda: shapes.rectangle(30.0, 10.0),
    "round": lambda: shapes.round_bar(50.0),
}


@cache
def solved(name, order=2):
    return tf.solve_torsion(SECTIONS[name](), rel_tol=1e-2, order=order, peak_tol=2e-2)


# --- JSON ---------------------------------------------------------------------------------------------------


def test_schema_is_a_schema_and_describes_every_member():
    schema = result_schema()
    jsonschema.Draft202012Validator.check_schema(schema)
    document = to_json(solved("lever"))
    assert set(schema["required"]) == set(document)
    assert set(schema["$defs"]["solution"]["required"]) == set(document["solution"])


@pytest.mark.parametrize("name", SECTIONS)
def test_documents_follow_the_schema(name):
    document = to_json(solved(name), unit="mm", torque=-4.5e5)
    VALID.validate(document)
    again = json.loads(json_text(document), parse_constant=pytest.fail)  # called for NaN and infinities
    assert again == document


def test_numbers_are_those_of_the_solution():
    solution = solved("plank")
    document = to_json(solution, unit="inch", torque=-3.0)
    body = document["solution"]
    assert document["length_unit"] == "in"
    assert body["torsion_constant"]["lower"] == solution.torsion_constant.lower
    spot = solution.hot_spot
    assert body["hot_spots"][0]["stress_per_torque"] == spot.stress_per_torque
    assert body["hot_spots"][0]["stress"] == 3.0 * spot.stress_per_torque
    assert body["passes"][-1]["unknowns"] == solution.passes[-1].unknowns
    assert to_json(solution)["solution"]["hot_spots"][0]["stress"] is None


def test_what_is_not_defined_is_null():
    body = to_json(solved("star"))["solution"]
    assert body["section_modulus"] is None
    assert body["hot_spots"] == []
    assert body["passes"][0]["stress_per_torque"] is None
    assert len(body["singular_corners"]) == 5


@pytest.mark.parametrize(
    "spoil",
    [
        lambda d: d.update(schema_version=2),
        lambda d: d.update(torque="450"),
        lambda d: d["solution"].pop("torsion_constant"),
        lambda d: d["solution"]["torsion_constant"].update(lower=None),
        lambda d: d["solution"].update(centre_of_twist=[1.0]),
        lambda d: d["solution"]["hot_spots"][0].update(stress_per_torque=-1.0),
        lambda d: d["solution"].update(passes=[]),
    ],
)
def test_schema_refuses_what_is_wrong(spoil):
    document = to_json(solved("lever"))
    VALID.validate(document)
    spoil(document)
    with pytest.raises(jsonschema.ValidationError):
        VALID.validate(document)


@pytest.mark.parametrize("name", ["plank", "lever"])
def test_the_section_can_be_made_again_from_its_document(name, tmp_path):
    path = write_json(solved(name), tmp_path / "result.json", unit="mm")
    assert outline_of(json.loads(path.read_text(encoding="ascii"))) == solved(name).outline


def test_documents_of_another_kind_are_refused():
    for wrong in ({}, {"schema": "torsionfe-result", "schema_version": 2}, {"schema": "x", "schema_version": 1}):
        with pytest.raises(tf.InputError, match="version 1, is needed"):
            outline_of(wrong)
    with pytest.raises(tf.InputError, match="can't be read"):
        outline_of({"schema": "torsionfe-result", "schema_version": 1, "solution": {}})


def test_parts_take_results_and_hostile_text():
    hostile = "</script>\u202e\ud800\x00 [\n  1,\n  2\n]"
    margin = Margin(hostile, "", "shear yield", 1.0, 1.5, math.inf, 2.0, math.nan)
    document = to_json(solved("strip"), parts={"margins": [margin], "table": np.eye(2), "j": tf.Bounds(1.0, 2.0)})
    VALID.validate(document)
    text = json_text(document)
    assert text.isascii()
    back = json.loads(text)["parts"]
    assert back["margins"][0] == {
        "case": hostile,
        "segment": "",
        "criterion": "shear yield",
        "torque": 1.0,
        "factor": 1.5,
        "applied": None,
        "allowable": 2.0,
        "margin": None,
        "note": "",
    }
    assert back["table"] == [[1.0, 0.0], [0.0, 1.0]]
    assert back["j"]["rel_gap"] == pytest.approx(2.0 / 3.0)


def test_whole_solutions_become_their_documents_body():
    assert plain_data([solved("strip")])[0] == to_json(solved("strip"))["solution"]


@pytest.mark.parametrize("thing", [len, object(), 1j, {"a": {"b": len}}])
def test_what_is_no_data_is_named(thing):
    with pytest.raises(tf.InputError, match="can't be written as JSON"):
        plain_data(thing)


def test_the_same_result_gives_the_same_text_and_lists_stay_on_a_line():
    document = to_json(solved("lever"))
    assert json_text(document) == json_text(to_json(solved("lever")))
    assert re.search(r'"centre_of_twist": \[-?[\d.e+-]+, -?[\d.e+-]+\]', json_text(document))


@pytest.mark.parametrize("torque", [math.nan, math.inf, True, "1"])
def test_torque_of_a_document_is_a_number(torque):
    with pytest.raises(tf.InputError, match="torque"):
        to_json(solved("strip"), torque=torque)


def test_unknown_units_are_refused():
    with pytest.raises(tf.UnitError):
        to_json(solved("strip"), unit="furlong")


# --- tables -------------------------------------------------------------------------------------------------


def rows_of(text):
    return list(csv.reader(io.StringIO(text, newline="")))


def test_csv_keeps_every_digit():
    solution = solved("sharp")
    rows = {row[0]: row for row in rows_of(csv_text(solution, "mm"))}
    assert rows["quantity"][1:4] == ["value", "lower bound", "upper bound"]
    assert float(rows["torsion constant"][1]) == solution.torsion_constant.value
    assert float(rows["torsion constant"][3]) == solution.torsion_constant.upper
    assert rows["torsion constant"][5] == "mm^4"
    assert [float(cell) for cell in rows["sharp re-entrant corner, stress unbounded"][6:]] == [8.0, 8.0]
    assert rows["sharp re-entrant corner, stress unbounded"][1] == ""
    assert rows["hot spot, shear stress per torque"][5] == "1/mm^3"
    assert len({len(row) for row in rows.values()}) == 1


def test_csv_is_the_same_in_every_locale():
    wanted = csv_text(solved("lever"))
    before = locale.setlocale(locale.LC_ALL)
    try:
        locale.setlocale(locale.LC_ALL, "")
        for name in ("de_DE.UTF-8", "fr_FR.UTF-8"):
            try:
                locale.setlocale(locale.LC_ALL, name)
            except locale.Error:
                continue
        assert csv_text(solved("lever")) == wanted
    finally:
        locale.setlocale(locale.LC_ALL, before)
    assert ";" not in wanted


@pytest.mark.parametrize("text", ["=1+1", "+1", "-1", "@SUM(A1)", 'a"b', "a,b", "a\nb", "\ud800", "<b>", "\u202eabc"])
def test_hostile_text_stays_text_in_csv(text, tmp_path):
    table = Table(("name", "value"), ((text, -1.5), ("", None)))
    cell = rows_of(write_csv(table, tmp_path / "a.csv").read_bytes().decode("utf-8"))[1]
    assert cell[1] == "-1.5"
    assert not cell[0].startswith(("=", "+", "-", "@"))
    assert cell[0].lstrip("'") == {"\ud800": "[U+D800]", "\u202eabc": "[U+202E]abc"}.get(text, text)


def test_markdown_is_a_table_and_nothing_in_it_is_markup():
    text = markdown_text(Table(("a|b", "n"), (("<img src=x> `c` *d* [e](f)\n# g", 1.23456789), ("", None))))
    lines = text.splitlines()
    assert len(lines) == 4
    assert all(len(re.findall(r"(?<!\\)\|", line)) == 3 for line in lines)
    assert re.fullmatch(r"\| -+ \| -+: \|", lines[1])
    assert not re.search(r"(?<!\\)[<`*\[#]", text)
    assert "1.2346" in lines[2]


def test_markdown_of_a_solution():
    text = markdown_text(solved("round"), "mm")
    j = solved("round").torsion_constant.value
    assert re.search(rf"^\| torsion constant +\| +{j:.0f} \|", text, re.MULTILINE)


def test_other_results_become_tables(tmp_path):
    class Sweep:
        columns = {"radius": np.array([1.0, 2.0]), "status": np.array(["ok", "failed"])}  # noqa: RUF012

    class Comparison:
        def as_table(self):
            return ["method", "J"], [("hand", np.float64(3.5)), ("exact", tf.Bounds(1.0, 2.0))]

    assert tabulated(Sweep()).rows == ((1.0, "ok"), (2.0, "failed"))
    assert tabulated(Comparison()) == Table(("method", "J"), (("hand", 3.5), ("exact", 1.5)))
    margins = [Margin(case, "", "twist", 1.0, 1.5, 2.0, 3.0, left) for case, left in (("a", math.nan), ("b", 0.5))]
    table = tabulated(margins)
    assert table.columns[0] == "case"
    assert [row[table.columns.index("margin")] for row in table.rows] == [None, 0.5]
    assert ("stress_per_torque", solved("round").hot_spot.stress_per_torque) in tabulated(solved("round").hot_spot).rows
    assert write_markdown(Sweep(), tmp_path / "a.md").read_text().startswith("| radius | status |")


@pytest.mark.parametrize("thing", [None, 3, "text", [], [1, 2], object()])
def test_what_is_no_table_is_refused(thing):
    with pytest.raises(tf.InputError, match="no result that can be a table"):
        tabulated(thing)


@pytest.mark.parametrize("write", [write_csv, write_markdown, write_json, write_fields])
def test_files_are_whole_or_not_there(write, tmp_path, monkeypatch):
    path = tmp_path / "a.vtu"
    path.write_bytes(b"older")

    def fail(*_):
        raise KeyboardInterrupt

    monkeypatch.setattr(os, "replace", fail)
    with pytest.raises(KeyboardInterrupt):
        write(solved("strip"), path)
    assert [(file.name, file.read_bytes()) for file in tmp_path.iterdir()] == [("a.vtu", b"older")]
    monkeypatch.undo()
    with pytest.raises(tf.InputError):
        write(solved("strip"), tmp_path / "none" / "a.vtu")
    assert write(solved("strip"), path) == path
    assert path.read_bytes() != b"older"


# --- fields -------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("order", [1, 2, 3])
def test_vtu_is_read_back_with_every_field(order, tmp_path):
    solution = solved("lever", order)
    found = meshio.read(write_fields(solution, tmp_path / "a.vtu"))
    mesh = solution.mesh
    kind, count = {1: ("triangle", 1), 2: ("triangle6", 1), 3: ("triangle", 9)}[order]
    assert [(block.type, len(block.data)) for block in found.cells] == [(kind, count * len(mesh.triangles))]
    assert found.points[: len(mesh.nodes), :2] == pytest.approx(mesh.nodes)
    assert (found.points[:, 2] == 0.0).all()
    stress = found.point_data["shear_stress_per_torque"]
    assert stress.shape == (len(found.points), 3)
    assert found.point_data["shear_stress_size_per_torque"] == pytest.approx(np.hypot(*stress[:, :2].T))
    assert found.point_data["stress_function"].min() == pytest.approx(0.0, abs=1e-9)
    low, high = solution.warping_extremes
    assert found.point_data["warping_function"].min() == pytest.approx(low)
    assert found.point_data["warping_function"].max() == pytest.approx(high)
    share = found.cell_data["bracket_share"][0]
    assert share.sum() == pytest.approx(solution.torsion_constant.rel_gap, rel=1e-6)


def test_middles_of_curved_sides_lie_on_the_arcs_and_nodes_go_round():
    mesh = field_mesh(solved("round"))
    nodes = mesh.points[mesh.cells[0].data][..., :2]
    corners = [0, 3, 1, 4, 2, 5]  # round the triangle: corner, middle, corner, ...
    x, y = nodes[:, corners].transpose(2, 0, 1)
    area = 0.5 * (x * np.roll(y, -1, axis=1) - np.roll(x, -1, axis=1) * y).sum(axis=1)
    assert (area > 0.0).all()
    boundary = np.hypot(*mesh.points[:, :2].T) > 25.0 * (1.0 - 1e-9)
    assert np.count_nonzero(boundary) == 2 * len(solved("round").mesh.sides)
    inner = ~np.isin(mesh.cells[0].data[:, 3:], np.flatnonzero(boundary))
    middle = 0.5 * (nodes[:, [0, 1, 2]] + nodes[:, [1, 2, 0]])
    assert nodes[:, 3:][inner] == pytest.approx(middle[inner])


def test_element_means_give_the_lower_bound_of_j_again():
    # 2 int phi = J_lower for the solved stress function of a solid section (Prandtl)
    solution = solved("strip")
    total = 2.0 * float(element_means(solution).stress_function @ solution.mesh.areas)
    assert total == pytest.approx(solution.torsion_constant.lower, rel=1e-9)


def test_element_means_are_those_of_the_stress_at_points():
    solution = solved("strip")
    means = element_means(solution)
    centre = solution.mesh.nodes[solution.mesh.triangles].mean(axis=1)
    # the stress of quadratic elements is linear on straight triangles: its mean is that of the centre
    assert means.stress == pytest.approx(solution.stress_at(centre), rel=1e-9, abs=1e-9 * means.magnitude.max())
    assert (means.magnitude >= np.hypot(*means.stress.T) * (1.0 - 1e-12)).all()


def test_a_torque_scales_the_stress_and_names_it(tmp_path):
    mesh = field_mesh(solved("strip"), torque=-200.0)
    plain = field_mesh(solved("strip"))
    assert mesh.point_data["shear_stress"] == pytest.approx(-200.0 * plain.point_data["shear_stress_per_torque"])
    size = mesh.cell_data["mean_shear_stress_size"][0]
    assert size == pytest.approx(200.0 * plain.cell_data["mean_shear_stress_size_per_torque"][0])
    with pytest.raises(tf.InputError, match="torque"):
        write_fields(solved("strip"), tmp_path / "a.vtu", torque=math.nan)


@pytest.mark.parametrize("ending", [".xdmf", ".xmf"])
@pytest.mark.parametrize("order", [2, 3])
def test_xdmf_is_one_file_that_is_read_back(ending, order, tmp_path, monkeypatch):
    # meshio's reader asks for the HDF5 library even for numbers in the text
    monkeypatch.setitem(sys.modules, "h5py", sys.modules.get("h5py", types.ModuleType("h5py")))
    path = write_fields(solved("lever", order), tmp_path / f"a{ending}")
    assert [file.name for file in tmp_path.iterdir()] == [path.name]
    found, given = meshio.read(path), field_mesh(solved("lever", order))
    assert (found.points == given.points).all()
    assert (found.cells[0].data == given.cells[0].data).all()
    for name, values in given.point_data.items():
        assert (found.point_data[name] == values).all()
    for name, (values,) in given.cell_data.items():
        assert (found.cell_data[name][0] == values).all()
    kinds = {item.get("AttributeType") for item in ElementTree.parse(path).iter("Attribute")}
    assert kinds == {"Scalar", "Vector"}


@pytest.mark.parametrize("ending", [".vtk", ".msh", ".avs", ".dat", ".VTU"])
def test_other_formats_hold_the_fields(ending, tmp_path):
    path = write_fields(solved("lever"), tmp_path / f"a{ending}")
    data = path.read_bytes()
    assert b"mean_warping_function" in data
    assert b"bracket_share" in data


@pytest.mark.parametrize("ending", [".stl", ".obj", ".inp", ".wkt", ".ply", ".node", ".svg"])
def test_formats_that_lose_fields_are_refused(ending, tmp_path, capsys):
    with pytest.raises(tf.InputError, match=r"write \.vtu or \.xdmf"):
        write_fields(solved("strip"), tmp_path / f"a{ending}")
    assert not list(tmp_path.iterdir())
    assert capsys.readouterr() == ("", "")


@pytest.mark.parametrize("name", ["a", "a.txt", "a.vtu.zip"])
def test_unknown_formats_are_refused(name, tmp_path):
    with pytest.raises(tf.InputError, match="ending of no format of fields"):
        write_fields(solved("strip"), tmp_path / name)


# --- notebooks ----------------------------------------------------------------------------------------------


class Page(HTMLParser):
    """The tags, ids and text of a page."""

    def __init__(self, page):
        super().__init__()
        self.tags, self.ids, self.used, self.words = [], [], [], []
        self.feed(page)

    def handle_starttag(self, tag, attrs):
        self.tags.append(tag)
        for name, value in attrs:
            if name == "id":
                self.ids.append(value)
            self.used += re.findall(r"url\(#([^)]+)\)", value or "")
            self.used += [value[1:]] if name.endswith("href") and value.startswith("#") else []

    def handle_data(self, data):
        self.words.append(data)


def test_a_solution_shows_itself():
    page = Page(solved("lever")._repr_html_())
    assert page.tags.count("table") == 1
    assert page.tags.count("svg") == 1
    assert "torsion constant J" in page.words
    assert "script" not in page.tags


def test_figures_on_one_page_have_ids_of_their_own():
    pages = [Page(inline_svg(solved(name).plot())) for name in ("lever", "round")]
    assert not set(pages[0].ids) & set(pages[1].ids)
    for page in pages:
        assert len(page.ids) == len(set(page.ids))
        assert page.used
        assert set(page.used) <= set(page.ids)


@pytest.mark.parametrize(
    "text", ["<script>alert(1)</script>", "</td></table><b>", "\" onload='x'", "&lt;", "\u202eabc\x00"]
)
def test_hostile_text_stays_text_on_a_page(text):
    page = Page(rich_html(text, [(text, text), (text,)], head=True))
    assert set(page.tags) == {"div", "table", "caption", "tbody", "tr", "th", "td"}
    shown = {"\u202eabc\x00": "[U+202E]abc[U+0000]"}.get(text, text)
    assert "".join(page.words) == shown * 4


def test_rows_of_a_table_are_of_equal_length():
    rows = re.findall(r"<tr>(.*?)</tr>", html_table("t", [("a", "b", "c"), ("d",), ()]))
    assert [len(re.findall(r"<td\b", row)) for row in rows] == [3, 3, 3]
