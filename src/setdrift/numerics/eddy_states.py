"""The state that trajectories carry from day to day, and their identifiers."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, fields
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

_DAYS = 2**20  # an identifier has room for as many days: up to the year 4840


@dataclass(frozen=True, eq=False)
class TrajectoryState:
    """Trajectories that may still go on, in the order of their identifiers.

    All arrays have shape (n,).

    Attributes
    ----------
    identifier : int64 array
        See `first_identifiers`.
    first_day, last_day : int64 array
        Days since 1970-01-01 on which the eddy was first and last seen.
    longitude, latitude : array
        Filtered position on the last day, degrees.
    eastward_drift, northward_drift : array
        m s-1.
    amplitude, radius : array
        Smoothed, m.
    polarity : int8 array
        1 anticyclonic, -1 cyclonic.
    """

    identifier: IntArray
    first_day: IntArray
    last_day: IntArray
    longitude: FloatArray
    latitude: FloatArray
    eastward_drift: FloatArray
    northward_drift: FloatArray
    amplitude: FloatArray
    radius: FloatArray
    polarity: NDArray[np.int8]

    def __len__(self) -> int:
        """Return the number of trajectories."""
        return int(self.identifier.size)


def no_trajectories() -> TrajectoryState:
    """State before the first day.

    Returns
    -------
    TrajectoryState
        Without a trajectory.
    """
    empty, days = np.empty(0), np.empty(0, np.int64)
    return TrajectoryState(days, days, days, empty, empty, empty, empty, empty, empty, np.empty(0, np.int8))


def state_to_arrays(state: TrajectoryState) -> dict[str, NDArray[Any]]:
    """Arrays that hold a state, to be kept.

    Parameters
    ----------
    state : TrajectoryState
        Any state.

    Returns
    -------
    dict of str to (n,) array
        By the names of the attributes.
    """
    return {field.name: getattr(state, field.name) for field in fields(state)}


def arrays_to_state(arrays: Mapping[str, ArrayLike]) -> TrajectoryState:
    """State from arrays that were kept.

    Parameters
    ----------
    arrays : mapping of str to (n,) array
        As from `state_to_arrays`.

    Returns
    -------
    TrajectoryState
        The same state.

    Raises
    ------
    ValueError
        If an array is missing or their sizes differ.
    """
    kinds = state_to_arrays(no_trajectories())
    missing = sorted(set(kinds) - set(arrays))
    if missing:
        raise ValueError(f"arrays must hold {', '.join(missing)}")
    state = TrajectoryState(**{name: np.array(arrays[name], dtype=kind.dtype) for name, kind in kinds.items()})
    if any(array.shape != (len(state),) for array in state_to_arrays(state).values()):
        raise ValueError("arrays must be one-dimensional and of one size")
    return state


def select(state: TrajectoryState, index: NDArray[np.bool_] | IntArray) -> TrajectoryState:
    """Pick some of the trajectories.

    Parameters
    ----------
    state : TrajectoryState
        Any state.
    index : (n,) bool array or (m,) int array
        Which ones.

    Returns
    -------
    TrajectoryState
        Only these, in the order of the index.
    """
    return TrajectoryState(**{name: array[index] for name, array in state_to_arrays(state).items()})


def join(*states: TrajectoryState) -> TrajectoryState:
    """Put trajectories of several states into one.

    Parameters
    ----------
    *states : TrajectoryState
        Any states.

    Returns
    -------
    TrajectoryState
        All trajectories, in the order given.
    """
    columns = [state_to_arrays(state) for state in states]
    return TrajectoryState(**{name: np.concatenate([part[name] for part in columns]) for name in columns[0]})


def first_identifiers(day: int, longitude: ArrayLike, latitude: ArrayLike, polarity: ArrayLike) -> IntArray:
    """Return identifiers of trajectories that begin with the given eddies.

    They hold the day, the position to 0.01 degree and the polarity, and nothing else, so that what happens to
    other eddies never changes them. Eddies of one day that agree in all of these are numbered in their order.

    Parameters
    ----------
    day : int
        Days since 1970-01-01, from 0 to 2^20 - 1.
    longitude, latitude : (n,) array
        Degrees.
    polarity : (n,) array
        1 or -1.

    Returns
    -------
    (n,) int64 array
        Below 2^52, thus exact as float64 also, unless eddies of a day agree.

    Raises
    ------
    ValueError
        If the day is out of range.
    """
    if not 0 <= day < _DAYS:
        raise ValueError(f"day must be from 0 to {_DAYS - 1}, not {day}")
    north = np.rint((np.asarray(latitude, dtype=np.float64) + 90.0) * 100.0).astype(np.int64)
    east = np.rint(np.asarray(longitude, dtype=np.float64) % 360.0 * 100.0).astype(np.int64) % 36000
    code = ((day * 2**15 + north) * 2**16 + east) * 2 + (np.asarray(polarity) > 0)
    order = np.argsort(code, kind="stable")
    _, start, count = np.unique(code[order], return_index=True, return_counts=True)
    repeat = np.empty_like(code)
    repeat[order] = np.arange(code.size) - np.repeat(start, count)
    identifiers: IntArray = code + repeat * 2**52
    return identifiers
