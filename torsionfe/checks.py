"""Checks of single arguments: they return the clean value or say what is wrong with it."""

from __future__ import annotations

import math
from collections.abc import Sequence
from difflib import get_close_matches
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from torsionfe.errors import InputError

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]

__all__ = ["Floats", "Ints", "finite", "finite_array", "non_negative", "one_of", "positive"]


def finite(name: str, value: Any) -> float:
    """Return ``value`` as a finite float, or raise `InputError`."""
    if isinstance(value, (bool, str, bytes)):
        raise InputError(f"{name} must be a number, got {value!r}")
    try:
        number = float(value)
    except (TypeError, ValueError, OverflowError):
        raise InputError(f"{name} must be a number, got {value!r}") from None
    if not math.isfinite(number):
        raise InputError(f"{name} must be finite, got {number}")
    return number


def positive(name: str, value: Any) -> float:
    """Return ``value`` as a finite float above zero, or raise `InputError`."""
    number = finite(name, value)
    if number <= 0.0:
        raise InputError(f"{name} must be greater than 0, got {number:g}")
    return number


def non_negative(name: str, value: Any) -> float:
    """Return ``value`` as a finite float, zero or more, or raise `InputError`."""
    number = finite(name, value)
    if number < 0.0:
        raise InputError(f"{name} must be 0 or more, got {number:g}")
    return number


def one_of(name: str, value: Any, allowed: Sequence[str]) -> str:
    """Return ``value`` if it is one of ``allowed``, or raise `InputError` naming the nearest."""
    if value in allowed:
        return str(value)
    text = str(value)
    near = [word for word in allowed if word.lower() == text.lower()] or get_close_matches(text, allowed, n=1)
    hint = f"; did you mean {near[0]!r}?" if near else ""
    raise InputError(f"{name} must be one of {', '.join(map(repr, allowed))}, got {value!r}{hint}")


def finite_array(name: str, values: ArrayLike, columns: int | None = None) -> Floats:
    """Return ``values`` as a new float array, all finite, ``(n,)`` or ``(n, columns)``.

    Raises
    ------
    InputError
        Wrong shape, not numbers, or a NaN or infinity (its row is named).
    """
    try:
        array = np.array(values, dtype=float)
    except (TypeError, ValueError, OverflowError):
        raise InputError(f"{name} must be numbers, one row a point") from None
    wanted = "(n,)" if columns is None else f"(n, {columns})"
    if array.ndim != (1 if columns is None else 2) or (columns is not None and array.shape[1] != columns):
        raise InputError(f"{name} must have the shape {wanted}, got {array.shape}")
    bad = np.flatnonzero(~np.isfinite(array.reshape(len(array), -1)).all(axis=1))
    if len(bad):
        raise InputError(f"{name}[{bad[0]}] is not finite: {array[bad[0]]}")
    return array
