"""The commented job file that a newcomer begins with."""

from __future__ import annotations

import os
from importlib import resources
from pathlib import Path

from torsionfe.errors import InputError
from torsionfe.storing import store

__all__ = ["starter_text", "write_starter"]


def starter_text() -> str:
    """Return a job file that runs as it stands and explains every key."""
    return (resources.files("torsionfe.output") / "templates" / "starter.toml").read_text(encoding="utf-8")


def write_starter(path: str | os.PathLike[str], overwrite: bool = False) -> Path:
    """Write the starter job file; return its path.

    Raises
    ------
    InputError
        The file exists (unless ``overwrite``), or cannot be written.
    """
    target = Path(path)
    if not overwrite and os.path.lexists(target):
        raise InputError(f"{str(target)!r} exists: choose another name, or say --force to replace it")
    return store(target, starter_text().encode("utf-8"))
