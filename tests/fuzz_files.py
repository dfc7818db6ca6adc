"""Mutated files: each must end in an outline or in a typed error, in bounded time and memory.

    python tests/fuzz_files.py [count] [format ...]

runs ``count`` (10,000) mutations a format outside the test suite and prints a table; the suite runs a sample.
"""

import collections
import contextlib
import io
import multiprocessing
import os
import pathlib
import random
import re
import resource
import signal
import sys
import tempfile
import time
import warnings

import ezdxf
import meshio
import numpy as np
from drawn import angle, circle, faceted, rectangle

from torsionfe.errors import ReadError, TorsionError
from torsionfe.outline.files import meshes, read_outline_report, write_outline
from torsionfe.outline.files.mesh_worker import arrays_of
from torsionfe.outline.outline import Outline

HANG = 20  # seconds after which a file counts as one that hangs
MEMORY = 4 * 2**30
NUMBER = re.compile(rb"[-+]?[0-9]+\.?[0-9]*(?:[eE][-+]?[0-9]+)?")
#: A numbered place in the file, or coordinates.
PLACE = re.compile(
    r"\b(?:line|char|character|byte|ring|point|vertices|node|column):? -?[0-9]|\(-?[0-9.e+-]+, -?[0-9.e+-]+\)"
)
STRANGE = [
    b"nan", b"inf", b"-inf", b"1e308", b"-1e308", b"1e400", b"1e-320", b"0", b"-0.0", b"-1", b"1", b"2", b"7", b"64",
    b"255", b"65536", b"2147483648", b"99999999999999999999", b"1e17", b"0x10", b"", b"abc", b"1_0", b"1,5", b"\xff",
    b"\xd9\xa3", b"360", b"1.5707963267948966", b"0.1",
]  # fmt: skip
MESHES = ("vtk", "msh", "vtu", "stl", "obj", "off", "ply", "su2", "inp", "mesh", "bdf", "avs", "xml")
FORMATS = ("dxf", "wkt", "geojson", "csv", *MESHES)


def outlines():
    return [
        angle().filleted(8.0).filleted(4.0, at=[2]),
        Outline(rectangle(60, 40).vertices, voids=[circle(20, 20, 6), rectangle(10, 10, 40, 15)]),
        faceted(angle().filleted(8.0), 6),
    ]


def plate_mesh(order=1):
    """A plate with a round hole, as rings of triangles or quadratic triangles."""
    n = 16
    turn = 2.0 * np.pi * np.arange(n) / n
    ring = np.stack([np.cos(turn), np.sin(turn)], axis=1)
    square = ring / np.abs(ring).max(axis=1)[:, None]
    points = np.concatenate([5.0 * ring, 0.5 * (5.0 * ring + 15.0 * square), 15.0 * square])
    k = np.arange(n)
    after = (k + 1) % n
    lower = np.concatenate([np.stack([k, k + n, after], axis=1) + j * n for j in range(2)])
    upper = np.concatenate([np.stack([after, k + n, after + n], axis=1) + j * n for j in range(2)])
    cells = np.concatenate([lower, upper])
    if order == 1:
        return points, [("triangle", cells)]
    edges = np.stack([cells, np.roll(cells, -1, axis=1)], axis=2)
    ends, number = np.unique(np.sort(edges.reshape(-1, 2), axis=1), axis=0, return_inverse=True)
    middle = points[ends].mean(axis=1)
    hole = (ends < n).all(axis=1)
    middle[hole] *= 5.0 / np.hypot(*middle[hole].T)[:, None]
    return np.concatenate([points, middle]), [("triangle6", np.hstack([cells, number.reshape(-1, 3) + len(points)]))]


def drawing_seeds():
    """Drawings of every kind of entity, and a bare one of the oldest version, which is quick to read."""
    document = ezdxf.new("R2010")
    document.header["$INSUNITS"] = 4
    space = document.modelspace()
    space.add_line((0, 0), (40, 0))
    space.add_line((40, 20), (40, 0))
    space.add_arc((30, 20), 10, 0, 90)
    space.add_line((30, 30), (0, 30))
    space.add_spline([(0, 30, 0), (-5, 25, 0), (-5, 5, 0), (0, 0, 0)])
    space.add_ellipse((15, 15), (6, 0), 0.5)
    block = document.blocks.new("HOLE")
    block.add_circle((0, 0), 1)
    space.add_blockref("HOLE", (30, 10), dxfattribs={"xscale": 2, "yscale": 3, "rotation": 20})
    space.add_lwpolyline([(3, 3, 0.4), (8, 3, 0), (8, 8, 0)], format="xyb", close=True)
    space.add_polyline2d([(30, 18, 0.2), (35, 18, 0), (33, 22, 0)], format="xyb", close=True)
    space.add_text("section")
    yield document
    for outline in outlines()[:2]:
        document = ezdxf.new("R12")
        for loop in (outline, *outline.voids):
            rows = np.column_stack([loop.vertices, loop.bulges]).tolist()
            document.modelspace().add_polyline2d(rows, format="xyb", close=True)
        yield document


def bare_drawing():
    """A drawing of entities only, as small programs write them."""
    tags = [(0, "SECTION"), (2, "ENTITIES")]
    corners = [(0, 0), (40, 0), (40, 20), (0, 20)]
    for (x, y), (u, v) in zip(corners, corners[1:] + corners[:1], strict=True):
        tags += [(0, "LINE"), (8, "0"), (10, x), (20, y), (11, u), (21, v)]
    tags += [(0, "ARC"), (8, "0"), (10, 20), (20, 10), (40, 4), (50, 0), (51, 180)]
    tags += [(0, "LINE"), (8, "0"), (10, 16), (20, 10), (11, 24), (21, 10)]
    tags += [(0, "CIRCLE"), (8, "0"), (10, 6), (20, 10), (40, 3), (0, "ENDSEC"), (0, "EOF")]
    return "".join(f"{code}\n{value}\n" for code, value in tags).encode()


@contextlib.contextmanager
def quiet():
    out, err = contextlib.redirect_stdout(io.StringIO()), contextlib.redirect_stderr(io.StringIO())
    with warnings.catch_warnings(), out, err:
        warnings.simplefilter("ignore")
        yield


def seeds(kind, folder):
    """Good files of a format, as bytes."""
    if kind == "dxf":
        texts = [bare_drawing()] * 6
        for document in drawing_seeds():
            text = io.StringIO()
            document.write(text)
            texts.append(text.getvalue().encode())
        return texts
    if kind in MESHES:
        return mesh_seeds(kind, folder)
    made = []
    for outline in outlines():
        name = write_outline(outline, folder / f"seed.{kind}", unit="mm")
        made.append(name.read_bytes())
    if kind == "csv":
        made.append(b"0;0;0\n30;0;1,5\n30;10;0\n0;10;2\n")
        made.append(b"x [mm],y [mm],radius,loop\n0,0,1,0\n9,0,1,0\n9,9,,0\n0,9,,0\n3,3,,1\n5,3,,1\n5,4,,1\n")
    if kind == "wkt":
        made.append(b"MULTIPOLYGON (((0 0, 30 0, 30 10, 0 10, 0 0), (5 2, 8 2, 8 5, 5 2)))")
    return made


def mesh_seeds(kind, folder):
    """Meshes of a format, text and binary, linear and quadratic, as far as it has them."""
    points, cells = plate_mesh()
    if kind == "bdf":
        lines = ["BEGIN BULK", *(f"GRID,{k},,{x:.5f},{y:.5f},0.0" for k, (x, y) in enumerate(points, 1))]
        lines += [f"CTRIA3,{k},1,{a + 1},{b + 1},{c + 1}" for k, (a, b, c) in enumerate(cells[0][1].tolist(), 1)]
        return ["\n".join([*lines, "ENDDATA", ""]).encode()]
    made = []
    name = folder / f"seed.{kind}"
    extra = ({"file_format": "gmsh"}, {"file_format": "gmsh22", "binary": False}) if kind == "msh" else ()
    for order in (1, 2):
        points, cells = plate_mesh(order)
        flat = points if kind == "su2" else np.column_stack([points, np.zeros(len(points))])
        for options in ({}, {"binary": False}, *extra):
            with contextlib.suppress(Exception), quiet():
                meshio.write(name, meshio.Mesh(flat, cells), **options)
                if any(len(block) for key, block in arrays_of(str(name), "").items() if "triangle" in key):
                    made.append(name.read_bytes())
    return made


def mutated(data, rng, others):
    """A file with one to four things wrong with it."""
    data = bytearray(data)
    for _ in range(rng.choice([1, 1, 1, 2, 4])):
        if not data:
            break
        at, length = rng.randrange(len(data)), rng.choice([1, 1, 2, 8, 40, 400])
        what = rng.randrange(10)
        if what == 0:
            data[at] = rng.randrange(256)
        elif what == 1:
            data[at] ^= 1 << rng.randrange(8)
        elif what == 2:
            del data[at : at + length]
        elif what == 3:
            data[at:at] = bytes(rng.randrange(256) for _ in range(length))
        elif what == 4:
            data[at:at] = data[at : at + length] * rng.choice([1, 2, 50])
        elif what == 5:
            del data[at:]
        elif what == 6:
            lines = data.split(b"\n")
            a, b = rng.randrange(len(lines)), rng.randrange(len(lines))
            lines[a], lines[b] = lines[b], lines[a]
            data = bytearray(b"\n".join(lines))
        elif what == 7:
            other = rng.choice(others)
            cut = rng.randrange(len(other) + 1)
            data[at : at + length] = other[cut : cut + length]
        else:
            numbers = list(NUMBER.finditer(bytes(data[:200_000])))
            if numbers:
                one = rng.choice(numbers)
                data[one.start() : one.end()] = rng.choice(STRANGE)
    return bytes(data)


# --- meshes in one lasting process, so that ten thousand of them need not start as many -----------------


def _serve(pipe):
    resource.setrlimit(resource.RLIMIT_AS, (MEMORY, MEMORY))
    sys.stdout = sys.stderr = open(os.devnull, "w")  # noqa: SIM115
    while True:
        path = pipe.recv()
        try:
            answer = arrays_of(path, "")
        except (Exception, SystemExit) as error:
            answer = f"{type(error).__name__}: {error}"[:300]
        pipe.send(answer)


class LastingReader:
    """Stands in for the process that reads one mesh, with the same limits."""

    def __init__(self, seconds):
        self.seconds, self.process, self.restarts = seconds, None, 0

    def __call__(self, path, kind, seconds):
        if self.process is None or not self.process.is_alive():
            self.pipe, theirs = multiprocessing.Pipe()
            self.process = multiprocessing.Process(target=_serve, args=(theirs,), daemon=True)
            self.process.start()
        self.pipe.send(str(path))
        try:
            answer = self.pipe.recv() if self.pipe.poll(self.seconds) else "the time is up"
        except EOFError:
            answer = "the process died"
        if answer in ("the time is up", "the process died"):
            self.stop()
            self.restarts += 1
        if isinstance(answer, str):
            raise ReadError(answer)
        return {name: np.asarray(value) for name, value in answer.items()}

    def stop(self):
        if self.process is not None:
            self.process.kill()
            self.process.join()
            self.process = None


def outcome(path):
    """What reading a file ends in, and the error if it is one that must not be."""
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("error")
            read_outline_report(path)
    except TorsionError as error:
        if getattr(error, "at", None):
            return "at coordinates", None
        return "at a line" if PLACE.search(str(error)) else "no place", None
    except Exception as error:
        return "other exception", error
    return "outline", None


def fuzz(kind, count, seed, folder, reader=None):
    """Read ``count`` mutated files; return the tally, the slowest (seconds) and what must not have been."""
    rng = random.Random(f"{kind} {seed}")
    good = seeds(kind, folder)
    tally, slowest, bad = collections.Counter(), 0.0, []
    path = folder / f"file.{kind}"
    for _ in range(count):
        data = mutated(rng.choice(good), rng, good)
        path.write_bytes(data)
        start = time.perf_counter()
        word, error = outcome(path)
        spent = time.perf_counter() - start
        slowest = max(slowest, spent)
        tally[word] += 1
        if error is not None or spent > HANG:
            bad.append((error, data))
    return tally, slowest, bad


def main(count, kinds):
    def hang(*_):
        raise RuntimeError("it hangs")

    signal.signal(signal.SIGALRM, hang)
    reader = LastingReader(1.0)
    meshes._arrays = reader
    total = []
    print("each error is a typed one; at: its coordinates, or a line, character or point that its message names")
    print("format    files  outline  at x, y  at a line  no place  other  slowest, s  peak, MB")
    with tempfile.TemporaryDirectory() as name:
        for kind in kinds:
            before = reader.restarts
            tally, slowest, bad = fuzz(kind, count, 1, pathlib.Path(name), reader)
            peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024
            print(
                f"{kind:8s} {count:6d} {tally['outline']:8d} {tally['at coordinates']:8d} {tally['at a line']:10d} "
                f"{tally['no place']:9d} {tally['other exception']:6d} {slowest:11.2f} {peak:9.0f}"
                + (f"  (reader stopped {reader.restarts - before} times)" if reader.restarts > before else ""),
                flush=True,
            )
            for k, (error, data) in enumerate(bad[:10]):
                kept = pathlib.Path(tempfile.gettempdir()) / f"fuzz_{kind}_{k}.{kind}"
                kept.write_bytes(data)
                print(f"    {error!r:.150} {kept}", flush=True)
            total += bad
    reader.stop()
    return len(total)


if __name__ == "__main__":
    count = int(sys.argv[1]) if len(sys.argv) > 1 else 10_000
    sys.exit(min(main(count, sys.argv[2:] or FORMATS), 1))
