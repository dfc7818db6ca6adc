"""Thin cells: Bredt and Batho against exact tubes, published tables and identities."""

from __future__ import annotations

import json
import math
import re
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from torsionfe.closed_form import exact
from torsionfe.closed_form.cell_lines import thin_cells
from torsionfe.closed_form.cells import CellWall, ThinCells, cell_sum, thin_cells_of
from torsionfe.closed_form.derive import derive_plates
from torsionfe.closed_form.plates import Plate, plate_sum
from torsionfe.errors import InputError
from torsionfe.outline import shapes
from torsionfe.outline.outline import Outline

CASES = json.loads((Path(__file__).parent / "reference" / "torsion_cases.json").read_text(encoding="utf-8"))
BY_NAME = {case["id"]: case for case in CASES}
HOLLOW = [case for case in CASES if len(case["geometry"]["loops"]) > 1]
HOLLOW = [c for c in HOLLOW if all(e is None or e["type"] == "arc" for w in c["geometry"]["loops"] for e in w["edges"])]


def outline_of(case: dict) -> Outline:
    loops = [
        (loop["role"], loop["vertices"], [0.0 if edge is None else edge["bulge"] for edge in loop["edges"]])
        for loop in case["geometry"]["loops"]
    ]
    voids = [Outline(vertices, bulges) for role, vertices, bulges in loops if role == "hole"]
    return next(Outline(vertices, bulges, voids) for role, vertices, bulges in loops if role == "outer")


def rate(size: list[float], error: list[float]) -> float:
    return float(np.polyfit(np.log(size), np.log(np.abs(error)), 1)[0])


# --- against exact tubes as the wall thins ------------------------------------------------------------


def test_bredt_on_round_tubes_misses_by_the_square_of_the_wall():
    walls = [0.4, 0.2, 0.1, 0.05]
    errors = []
    for wall in walls:
        true = exact.concentric_tube(2.0 + wall, wall)
        hand = cell_sum(thin_cells_of("tube", {"outer_diameter": 2.0 + wall, "wall": wall}))
        errors.append(hand.torsion_constant / true.torsion_constant - 1.0)
        # exactly: J_Bredt / J = 1 / (1 + (t / 2r)^2)
        assert hand.torsion_constant / true.torsion_constant == pytest.approx(1.0 / (1.0 + wall**2 / 4.0), rel=1e-14)
    assert rate(walls, errors) == pytest.approx(2.0, abs=0.03)


def test_bredt_on_confocal_tubes_misses_by_the_square_of_the_wall():
    # int ds/t = 2 pi / (xi_o - xi_i) on confocal ellipses, midway between which the area is taken
    walls, errors = [4.0, 2.0, 1.0, 0.5], []
    focus = math.sqrt(30.0**2 - 20.0**2)
    for wall in walls:
        true = exact.confocal_tube(60.0, 40.0, 2.0 * (20.0 - wall))
        outer, inner = math.asinh(20.0 / focus), math.asinh((20.0 - wall) / focus)
        area = math.pi * focus**2 * math.sinh(outer + inner) / 2.0
        flexibility = 2.0 * math.pi / (outer - inner)
        length = 160.0  # the perimeter does not enter J; the thinnest wall only the stress
        cells = ThinCells((CellWall(length, length / flexibility * 0.9, flexibility=flexibility),), (area,))
        errors.append(cell_sum(cells).torsion_constant / true.torsion_constant - 1.0)
    assert rate(walls, errors) == pytest.approx(2.0, abs=0.05)


def test_bredt_on_eccentric_tubes_with_a_wall_that_varies():
    # the middle line and int ds/t from the medial axis of two circles; exact series (Macdonald 1893) beside it
    walls, errors, peaks = [5.0, 3.0, 2.0], [], []
    for wall in walls:
        e = 0.3 * wall
        hole = shapes.round_bar(100.0 - 2.0 * wall).translated(e, 0.0)
        bar = shapes.round_bar(100.0)
        hand = cell_sum(thin_cells(Outline(bar.vertices, bar.bulges, [hole])))
        true = exact.eccentric_tube(100.0, 100.0 - 2.0 * wall, e)
        errors.append(hand.torsion_constant / true.torsion_constant - 1.0)
        peaks.append(hand.peak_stress(1.0) / true.stress_per_torque - 1.0)
        assert hand.cells.walls[0].thickness == pytest.approx(0.7 * wall, rel=1e-3)
    assert rate(walls, errors) == pytest.approx(2.0, abs=0.1)
    assert rate(walls, peaks) == pytest.approx(1.0, abs=0.15)
    assert all(error < 0.0 for error in errors + peaks)


# --- published and reference values -------------------------------------------------------------------


@pytest.mark.parametrize("name", ["twocell_sharp_t2_w2_60_40", "twocell_sharp_t8_w6_60_40"])
def test_two_cells_agree_with_the_reference_to_every_digit(name):
    p, quantities = BY_NAME[name]["parameters"], BY_NAME[name]["quantities"]
    left, right, h = p["b1"], p["b2"], p["h"]
    cells = ThinCells(
        (
            CellWall(2.0 * left + h, p["t"], (0,), "left"),
            CellWall(2.0 * right + h, p["t"], (1,), "right"),
            CellWall(h, p["t_web"], (0, 1), "web"),
        ),
        (left * h, right * h),
    )
    hand = cell_sum(cells)
    assert hand.torsion_constant == pytest.approx(quantities["J_bredt_two_cell"]["value"], rel=1e-13)
    # beside the solved value of the sharp section: low, the more the thicker the walls
    low = hand.torsion_constant / quantities["J"]["value"] - 1.0
    assert -0.06 < low < -0.013


@pytest.mark.parametrize("name", ["shs_100_8", "shs_60_12"])
def test_rounded_boxes_agree_with_the_reference(name):
    p, quantities = BY_NAME[name]["parameters"], BY_NAME[name]["quantities"]
    sizes = {"width": p["B"], "height": p["B"], "wall": p["t"], "outer_radius": p["r_o"], "inner_radius": p["r_i"]}
    cells = thin_cells_of("box", sizes)
    assert cell_sum(cells).torsion_constant == pytest.approx(quantities["J_bredt"]["value"], rel=1e-13)
    with_strips = cell_sum(cells, strips=True).torsion_constant
    assert with_strips == pytest.approx(quantities["J_bredt_plus_open"]["value"], rel=1e-13)


@pytest.mark.parametrize(
    ("name", "constant", "modulus"),
    [("shs_100x5", 439e4, 81.8e3), ("shs_200x10", 7031e4, 655e3), ("rhs_100x50x5", 135e4, 36.9e3)],
)
def test_hollow_section_tables_are_bredt_with_strips(name, constant, modulus):
    """EN 10210-2 tables (from memory), J and W_t to the printed three digits: corner radii 1.5 t and 1.0 t."""
    p, quantities = BY_NAME[name]["parameters"], BY_NAME[name]["quantities"]
    sizes = {"width": p.get("H", p["B"]), "height": p["B"], "wall": p["t"]}
    hand = cell_sum(thin_cells_of("box", {**sizes, "outer_radius": p["r_o"], "inner_radius": p["r_i"]}), strips=True)
    assert constant == pytest.approx(quantities["J_published"]["value"])
    assert modulus == pytest.approx(quantities["W_t_published"]["value"])
    assert hand.torsion_constant == pytest.approx(constant, rel=0.5 / 135.0)
    assert float(f"{hand.torsion_constant:.3g}") == pytest.approx(float(f"{constant:.3g}"))
    assert float(f"{hand.section_modulus:.3g}") == pytest.approx(modulus)


@pytest.mark.parametrize("case", HOLLOW, ids=lambda case: case["id"])
def test_cells_of_hollow_outlines_come_within_the_thin_wall_error(case):
    """The solved value beside Bredt on the medial axis: always low, and by (t / 2r)**2 or so."""
    outline = outline_of(case)
    cells = thin_cells(outline)
    assert len(cells.areas) == len(outline.voids)
    low = cell_sum(cells).torsion_constant / case["quantities"]["J"]["value"] - 1.0
    assert low < 1e-4
    thick = {"tube_30_15": 0.11, "ecctube_50_30_15": 0.17, "shaft_4holes": 0.15, "shs_60_12": 0.08}
    assert -low < thick.get(case["id"], 0.07)


SHAPES = [
    shapes.tube(100, 5),
    shapes.box(100, 60, 5),
    shapes.box(100, 60, 5, 7.5, 2.5),
    shapes.finned_box(60, 40, 3, 20, 4),
    shapes.multi_cell(120, 60, 3, 3, 2, web=2),
    shapes.multi_cell(120, 60, 3, 3, outer_radius=6, inner_radius=3),
]


@pytest.mark.parametrize("shape", SHAPES, ids=lambda shape: shape.kind)
def test_derived_cells_are_those_that_the_trade_shape_states(shape):
    stated, derived = cell_sum(shape.thin_cells()), cell_sum(derive_plates(shape).cells)
    # the medial axis cuts sharp corners, where the section is thicker: up to 2 % more
    excess = derived.torsion_constant / stated.torsion_constant - 1.0
    assert -1e-4 < excess < 0.02
    assert derived.section_modulus == pytest.approx(stated.section_modulus, rel=0.02)
    assert [fin.width for fin in derived.cells.fins] == pytest.approx([f.width for f in stated.cells.fins])
    assert [fin.thickness for fin in derived.cells.fins] == pytest.approx([f.thickness for f in stated.cells.fins])


# --- identities ---------------------------------------------------------------------------------------


def test_a_web_on_the_line_of_symmetry_carries_nothing():
    half = CellWall(2.0 * 50.0 + 60.0, 4.0, (0,)), CellWall(2.0 * 50.0 + 60.0, 4.0, (1,))
    two = cell_sum(ThinCells((*half, CellWall(60.0, 3.0, (0, 1))), (3000.0, 3000.0)))
    one = cell_sum(ThinCells.single([(320.0, 4.0)], 6000.0))
    assert two.torsion_constant == pytest.approx(one.torsion_constant, rel=1e-14)
    assert two.wall_stress(1e6) == pytest.approx([*one.wall_stress(1e6)] * 2 + [0.0], abs=1e-9)


@given(
    st.lists(st.floats(10.0, 100.0), min_size=1, max_size=5),
    st.floats(10.0, 100.0),
    st.lists(st.floats(1.0, 5.0), min_size=6, max_size=6),
)
def test_flows_balance_the_torque_and_every_cell_twists_alike(widths, height, thickness):
    n = len(widths)
    ends = [2.0 * height if n == 1 else height if k in (0, n - 1) else 0.0 for k in range(n)]
    walls = [CellWall(2.0 * b + ends[k], thickness[k], (k,)) for k, b in enumerate(widths)]
    walls += [CellWall(height, thickness[5], (k, k + 1)) for k in range(n - 1)]
    hand = cell_sum(ThinCells(tuple(walls), tuple(b * height for b in widths)))
    torque, areas = 1e4, np.array(hand.cells.areas)
    rate_of_twist = torque / hand.torsion_constant
    # equilibrium: T = 2 sum q_i A_i; compatibility: int (q / t) ds = 2 A_i G theta' around every cell
    assert 2.0 * float(hand.circulations @ areas) * rate_of_twist == pytest.approx(torque, rel=1e-9)
    flow = hand.shear_flow(torque)
    for cell in range(n):
        around = sum(
            (q if wall.cells[0] == cell else -q) * wall.compliance
            for q, wall in zip(flow, walls, strict=True)
            if cell in wall.cells
        )
        assert around == pytest.approx(2.0 * areas[cell] * rate_of_twist, rel=1e-9)
    assert hand.wall_stress(torque) == pytest.approx(np.abs(flow) / [wall.thickness for wall in walls])


def test_fins_add_their_own_constant_and_share_the_torque_by_stiffness():
    fins = [Plate(40.0, 10.0, "fin"), Plate(20.0, 6.0)]
    bare = cell_sum(ThinCells.single([(100.0, 5.0)] * 4, 1e4))
    hand = cell_sum(ThinCells.single([(100.0, 5.0)] * 4, 1e4, fins))
    alone = plate_sum(fins)
    assert hand.torsion_constant == pytest.approx(bare.torsion_constant + alone.torsion_constant_twist)
    share = alone.torsion_constant_twist / hand.torsion_constant
    assert hand.fin_stress(1e6) == pytest.approx(alone.peak_stress(1e6 * share))
    assert hand.wall_stress(1e6).max() < bare.wall_stress(1e6).max()
    assert hand.governing == "wall 0"
    assert hand.twist_rate(1e6, 27e3) == pytest.approx(1e6 / (27e3 * hand.torsion_constant))
    thick = cell_sum(ThinCells.single([(20.0, 1.0)] * 4, 400.0, [Plate(200.0, 60.0, "lug")]))
    assert thick.governing == "lug"
    assert thick.peak_stress(1.0) == thick.fin_stress(1.0)[0]
    nameless = cell_sum(ThinCells.single([(20.0, 1.0)] * 4, 400.0, [Plate(9.0, 3.0, "small"), Plate(200.0, 60.0)]))
    assert nameless.governing == "fin 1"
    told = re.search(r"torsion constant +\S+, (\S+) % of it from the fins", str(nameless))
    part = nameless.fin_sum.torsion_constant_twist / nameless.torsion_constant
    assert float(told[1]) == pytest.approx(100.0 * part, rel=1e-2)


def test_a_wall_in_pieces_is_the_wall():
    whole = cell_sum(ThinCells.single([(400.0, 5.0)], 1e4))
    pieces = cell_sum(ThinCells.single([(150.0, 5.0), (200.0, 5.0), (50.0, 5.0)], 1e4))
    assert pieces.torsion_constant == pytest.approx(whole.torsion_constant, rel=1e-14)
    varied = CellWall(400.0, 4.0, flexibility=400.0 / 5.0)
    assert cell_sum(ThinCells((varied,), (1e4,))).torsion_constant == pytest.approx(whole.torsion_constant)
    assert cell_sum(ThinCells((varied,), (1e4,))).peak_stress(1.0) == pytest.approx(1.25 * whole.peak_stress(1.0))


def test_the_printed_table_names_walls_cells_fins_and_doubts():
    text = str(cell_sum(shapes.finned_box(60, 40, 3, 20, 4).thin_cells(), strips=True))
    for word in ("left fin", "bottom", "l t^3/3 added", "of it from the fins", "finned box, middle of the walls"):
        assert word in text
    assert "is not thin" in str(cell_sum(thin_cells_of("tube", {"outer_diameter": 60.0, "wall": 15.0})))


@pytest.mark.parametrize(
    ("make", "message"),
    [
        (lambda: CellWall(0.0, 1.0), "length must be greater than 0"),
        (lambda: CellWall(1.0, math.nan, name="web"), "thickness of wall 'web' must be finite"),
        (lambda: CellWall(1.0, 1.0, (0, 0)), "one or two different numbers"),
        (lambda: CellWall(1.0, 1.0, ()), "one or two different numbers"),
        (lambda: CellWall(1.0, 1.0, (-1,)), "one or two different numbers"),
        (lambda: CellWall(100.0, 5.0, flexibility=30.0), "at most length / thickness = 20, got 30"),
        (lambda: ThinCells((CellWall(1.0, 1.0),), ()), "areas is empty"),
        (lambda: ThinCells((CellWall(1.0, 1.0),), (0.0,)), r"areas\[0\] must be greater than 0"),
        (lambda: ThinCells((CellWall(1.0, 1.0, (1,)),), (1.0,)), "a wall bounds cell 1, but there are 1 areas"),
        (lambda: ThinCells((CellWall(1.0, 1.0),), (1.0, 2.0)), "cell 1 has no wall"),
        (lambda: ThinCells(("wall",), (1.0,)), r"walls\[0\] must be a CellWall"),  # type: ignore[arg-type]
        (lambda: cell_sum(ThinCells((CellWall(1.0, 1.0, (0, 1)),), (1.0, 1.0))), "no outer wall"),
        (lambda: cell_sum([1.0]), "cells must be a ThinCells"),  # type: ignore[arg-type]
        (lambda: thin_cells_of("angle", {}), "no cells are known for the kind 'angle'"),
        (lambda: thin_cells_of("box", {"width": 1.0}), "needs the dimension 'height'; given: width"),
        (lambda: thin_cells_of("tube", {"outer_diameter": 10.0, "wall": 5.0}), "leave no void"),
        (lambda: thin_cells_of("box", {"width": 10.0, "height": 20.0, "wall": 6.0}), "leave no void"),
        (
            lambda: thin_cells_of("box", {"width": 50.0, "height": 50.0, "wall": 5.0, "outer_radius": 90.0}),
            "mean corner radius 45 does not fit: at most 22.5",
        ),
        (lambda: thin_cells(shapes.angle(80, 80, 8)), "the outline has no void"),
    ],
)
def test_impossible_cells_are_refused(make, message):
    with pytest.raises(InputError, match=message):
        make()
