"""What can go wrong. Every message says what, where, the numbers on both sides, and the remedy."""

from __future__ import annotations

__all__ = [
    "InputError",
    "JobError",
    "JournalError",
    "MeshError",
    "MissingExtraError",
    "OutlineError",
    "OutlineWarning",
    "PlacedError",
    "ReadError",
    "SolveError",
    "TorsionError",
    "UnitError",
]


class TorsionError(Exception):
    """Base of every error that torsionfe raises on purpose."""


class InputError(TorsionError, ValueError):
    """An argument is out of its range, of the wrong shape, or not finite."""


class PlacedError(TorsionError):
    """An error that knows where.

    Parameters
    ----------
    message : str
        What is wrong, with the remedy.
    at : tuple of float, optional
        Where: coordinates in the outline's own unit.
    """

    def __init__(self, message: str, at: tuple[float, float] | None = None) -> None:
        super().__init__(message)
        self.at = at

    def __reduce__(self) -> tuple[object, ...]:
        """Keep the place when the error crosses a process boundary."""
        return type(self), (str(self), self.at)


class OutlineError(PlacedError, InputError):
    """An outline is not the boundary of a cross-section; ``at`` names the place where one can be named."""


class OutlineWarning(UserWarning):
    """An outline can be used, but the answer will carry a fault that the message names."""


class ReadError(OutlineError):
    """A file does not hold a readable outline."""


class JobError(InputError):
    """A job file holds something that it may not.

    Parameters
    ----------
    message : str
        What was found and what is allowed; it begins with the file and the line.
    line : int, optional
        Of the job file, from 1.
    """

    def __init__(self, message: str, line: int = 0) -> None:
        super().__init__(message)
        self.line = line

    def __reduce__(self) -> tuple[object, ...]:
        """Keep the line when the error crosses a process boundary."""
        return type(self), (str(self), self.line)


class JournalError(InputError):
    """The journal of a sweep can't be used: it is locked, another file, of another study, or can't be written."""


class UnitError(InputError):
    """A length unit is unknown, missing or contradicts another."""


class MeshError(PlacedError, RuntimeError):
    """An outline cannot be triangulated; ``at`` names the place."""


class SolveError(TorsionError, RuntimeError):
    """The equations could not be solved to the accuracy that the bounds need."""


class MissingExtraError(TorsionError, ImportError):
    """An optional library is not installed; the message names the extra that brings it."""

    @classmethod
    def of(cls, library: str, extra: str, purpose: str) -> MissingExtraError:
        """Return the error for ``library``, brought by ``pip install 'torsionfe[extra]'``."""
        return cls(f"{purpose} needs {library}, which is not installed: pip install 'torsionfe[{extra}]'")
