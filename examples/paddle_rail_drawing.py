"""Write paddle_rail.dxf: a grooved rail as a drawing office might export it, arcs of the groove as short chords."""

import math
from pathlib import Path

import ezdxf

WIDTH, HEIGHT, CORNER = 70.0, 34.0, 5.0
GROOVE_LEFT, GROOVE_RIGHT, GROOVE_FLOOR, GROOVE_RADIUS = 27.0, 43.0, 16.0, 4.0
CHORDS = 12  # of each quarter circle in the groove
QUARTER = math.tan(math.pi / 8.0)  # the bulge of a true quarter circle


def chords(centre: tuple[float, float], start: float, end: float) -> list[tuple[float, float]]:
    """Return the points of an arc drawn as chords; angles in degrees."""
    steps = [math.radians(start + (end - start) * k / CHORDS) for k in range(CHORDS + 1)]
    return [(centre[0] + GROOVE_RADIUS * math.cos(a), centre[1] + GROOVE_RADIUS * math.sin(a)) for a in steps]


def loop() -> list[tuple[float, float, float]]:
    """Return the outer loop, counter-clockwise: x, y and the bulge of the edge that follows."""
    floor = GROOVE_FLOOR + GROOVE_RADIUS
    right = chords((GROOVE_RIGHT - GROOVE_RADIUS, floor), 0.0, -90.0)
    left = chords((GROOVE_LEFT + GROOVE_RADIUS, floor), -90.0, -180.0)
    return [
        (0.0, 0.0, 0.0),
        (WIDTH, 0.0, 0.0),
        (WIDTH, HEIGHT - CORNER, QUARTER),
        (WIDTH - CORNER, HEIGHT, 0.0),
        (GROOVE_RIGHT, HEIGHT, 0.0),
        *((x, y, 0.0) for x, y in right),
        *((x, y, 0.0) for x, y in left),
        (GROOVE_LEFT, HEIGHT, 0.0),
        (CORNER, HEIGHT, QUARTER),
        (0.0, HEIGHT - CORNER, 0.0),
    ]


def write(path: Path) -> None:
    """Write the drawing: the section, and a note on a layer of its own."""
    ezdxf.options.write_fixed_meta_data_for_testing = True  # no date
    drawing = ezdxf.new("R2010", units=ezdxf.units.MM)
    for name in ("SECTION", "NOTES"):
        drawing.layers.add(name)
    space = drawing.modelspace()
    space.add_lwpolyline(loop(), format="xyb", close=True, dxfattribs={"layer": "SECTION"})
    space.add_circle((12.0, 10.0), 5.0, dxfattribs={"layer": "SECTION"})
    space.add_text("GUIDE RAIL, INVENTED", height=3.0, dxfattribs={"layer": "NOTES"}).set_placement((0.0, -8.0))
    space.add_line((0.0, -4.0), (WIDTH, -4.0), dxfattribs={"layer": "NOTES"})
    drawing.saveas(path)


if __name__ == "__main__":
    write(Path(__file__).with_name("paddle_rail.dxf"))
