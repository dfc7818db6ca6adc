"""Reads a mesh file in a process of its own; run as a script by `torsionfe.outline.files.meshes`.

Readers of mesh formats trust the counts that a file states: one wrong number can make them wait or allocate for
ever, and some end the process. So they run here, with limits on memory and time, and hand back plain arrays.
"""

from __future__ import annotations

import contextlib
import io
import os
import sys
import warnings
from typing import Any

__all__ = ["arrays_of", "main"]

_MEMORY = 4 * 2**30


def arrays_of(path: str, kind: str) -> dict[str, Any]:
    """Return the points and the cells of a mesh file, each block by its type.

    Parameters
    ----------
    path : str
    kind : str
        The name that ``meshio`` has for the format; "" for what the file's ending says.
    """
    import meshio

    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        # numbers that end too early are no number that was meant
        warnings.filterwarnings("error", message="string or file could not be read")
        mesh = meshio.read(path, kind or None)
    arrays = {"points": mesh.points}
    for k, block in enumerate(mesh.cells):
        arrays[f"{k:06d} {block.type}"] = block.data
    return arrays


def _limit(seconds: int) -> None:
    """Set limits on memory and processor time, where the system has them."""
    with contextlib.suppress(ImportError, ValueError, OSError):
        import resource

        resource.setrlimit(resource.RLIMIT_AS, (_MEMORY, _MEMORY))
        resource.setrlimit(resource.RLIMIT_CPU, (seconds, seconds))


def main(path: str, kind: str, seconds: int) -> int:
    """Write the arrays of a mesh file to the standard output; return 0, or 1 with the reason on the error one."""
    answer = os.dup(1)
    os.dup2(2, 1)  # what the readers print is no part of the answer
    sys.stdout = io.StringIO()
    _limit(seconds)
    import numpy as np

    try:
        arrays = arrays_of(path, kind)
        data = io.BytesIO()
        np.savez(data, **arrays)
    except (Exception, SystemExit) as error:
        said = sys.stdout.getvalue().strip()
        text = f"{type(error).__name__}: {error} {said}".encode(errors="replace")[:300]
        os.write(2, b"\n" + text)
        return 1
    with os.fdopen(answer, "wb") as stream:
        stream.write(data.getvalue())
    return 0


if __name__ == "__main__":
    sys.exit(main(sys.argv[1], sys.argv[2], int(sys.argv[3])))
