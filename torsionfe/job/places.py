"""Files that a job names: found beside the job, never outside the folders that it may read from."""

from __future__ import annotations

import hashlib
import os
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

from torsionfe.errors import InputError

__all__ = ["MOST_BYTES", "InputFile", "digest_of", "inside", "read_bytes"]

#: Larger job files are refused.
MOST_BYTES = 1_000_000


@dataclass(frozen=True, slots=True)
class InputFile:
    """A file that a job was read from.

    Attributes
    ----------
    name : str
        As the job names it, with ``/`` between folders.
    sha256 : str
        Of its bytes (FIPS 180-4), in hexadecimal.
    """

    name: str
    sha256: str


def digest_of(files: Sequence[InputFile]) -> str:
    """Return one digest for several files: the SHA-256 of their lines ``sha256, two spaces, name``.

    That is what ``sha256sum FILE... | sha256sum`` prints, the job file first.
    """
    lines = "".join(f"{file.sha256}  {file.name}\n" for file in files)
    return hashlib.sha256(lines.encode()).hexdigest()


def read_bytes(path: Path, most: int) -> bytes:
    """Return the bytes of a regular file.

    Raises
    ------
    InputError
        No such file, no regular file, it cannot be read, or it holds more than ``most`` bytes.
    """
    try:
        if not path.is_file():
            raise InputError(f"{str(path)!r} is no file" if path.exists() else f"there is no file {str(path)!r}")
        with open(path, "rb") as handle:
            data = handle.read(most + 1)
    except (OSError, ValueError) as error:
        if isinstance(error, InputError):
            raise
        raise InputError(f"{str(path)!r:.200} cannot be read: {getattr(error, 'strerror', error)}") from error
    if len(data) > most:
        raise InputError(f"{str(path)!r} holds over {most} bytes, which is the most that is read")
    return data


def inside(folder: Path, name: str, others: Sequence[Path] = ()) -> Path:
    """Return the path of a file that a job names, symbolic links followed.

    Parameters
    ----------
    folder : Path
        The job file's own.
    name : str
        Relative to it.
    others : sequence of Path
        More folders that the job may read from.

    Raises
    ------
    InputError
        The file lies, or a link leads, outside of all of them.
    """
    if "\0" in name:
        raise InputError("a file's name holds a zero byte")
    real = Path(os.path.realpath(folder / name))
    homes = [Path(os.path.realpath(home)) for home in (folder, *others)]
    if not any(real.is_relative_to(home) for home in homes):
        raise InputError(
            f"{name!r} leads out of the job file's folder, to {str(real)!r}: "
            "name its folder in folders = [...] at the top of the job file, or copy the file beside the job"
        )
    return real
