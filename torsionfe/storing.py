"""Files written whole or not at all: beside first, then renamed."""

from __future__ import annotations

import contextlib
import os
import secrets
from pathlib import Path

from torsionfe.errors import InputError

__all__ = ["store"]


def store(path: str | os.PathLike[str], data: bytes) -> Path:
    """Write a file beside its place and rename it, so that no reader ever sees half of it.

    Raises
    ------
    InputError
        The folder does not exist or cannot be written to; an older file of that name is as it was.
    """
    target = Path(path)
    beside = target.with_name(f".{target.name}.{secrets.token_hex(6)}.part")
    try:
        with open(beside, "xb") as handle:
            handle.write(data)
            handle.flush()
            os.fsync(handle.fileno())
        os.replace(beside, target)
    except BaseException as error:  # an interrupt leaves no half-written file either
        with contextlib.suppress(OSError, ValueError):
            beside.unlink()
        if not isinstance(error, (OSError, ValueError)):
            raise
        raise InputError(f"{str(target)!r} cannot be written: {getattr(error, 'strerror', error)}") from error
    return target
