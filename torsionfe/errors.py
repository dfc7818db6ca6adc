"""What can go wrong. Every message says what, where, the numbers on both sides, and the remedy."""

from __future__ import annotations

__all__ = [
    "InputError",
    "MeshError",
    "MissingExtraError",
    "OutlineError",
    "OutlineWarning",
    "ReadError",
    "SolveError",
    "TorsionError",
    "UnitError",
]


class TorsionError(Exception):
    """Base of every error that torsionfe raises on purpose."""


class InputError(TorsionError, ValueError):
    """An argument is out of its range, of the wrong shape, or not finite."""


class OutlineError(InputError):
    """An outline is not the boundary of a cross-section.

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


class OutlineWarning(UserWarning):
    """An outline can be used, but the answer will carry a fault that the message names."""


class ReadError(OutlineError):
    """A file does not hold a readable outline."""


class UnitError(InputError):
    """A length unit is unknown, missing or contradicts another."""


class MeshError(TorsionError, RuntimeError):
    """An outline cannot be triangulated; ``at`` names the place.

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


class SolveError(TorsionError, RuntimeError):
    """The equations could not be solved to the accuracy that the bounds need."""


class MissingExtraError(TorsionError, ImportError):
    """An optional library is not installed; the message names the extra that brings it."""

    @classmethod
    def of(cls, library: str, extra: str, purpose: str) -> MissingExtraError:
        """Return the error for ``library``, brought by ``pip install 'torsionfe[extra]'``."""
        return cls(f"{purpose} needs {library}, which is not installed: pip install 'torsionfe[{extra}]'")
