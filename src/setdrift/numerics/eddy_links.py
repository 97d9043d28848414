"""Which of one set of points belongs to which of another, at the least total cost."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import linear_sum_assignment
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components
from scipy.spatial import KDTree

from setdrift.numerics.authalic import authalic_radius

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]


class Pairs(NamedTuple):
    """Pairs of a point of the first set and one of the second.

    Attributes
    ----------
    first, second : (n,) int array
        Indices into the two sets.
    value : (n,) array
        Of each pair: its distance (m) or its cost.
    """

    first: IntArray
    second: IntArray
    value: FloatArray


def nearby_pairs(
    longitude: FloatArray,
    latitude: FloatArray,
    other_longitude: FloatArray,
    other_latitude: FloatArray,
    distance: float,
) -> Pairs:
    """Pairs of points no farther apart than a distance, on the sphere of the Earth's area.

    Parameters
    ----------
    longitude, latitude : (n,) array
        First set, degrees.
    other_longitude, other_latitude : (m,) array
        Second set, degrees.
    distance : float
        m.

    Returns
    -------
    Pairs
        With their distances, ordered by first and second.
    """
    if longitude.size == 0 or other_longitude.size == 0:
        return Pairs(np.empty(0, np.int64), np.empty(0, np.int64), np.empty(0))
    radius = authalic_radius()
    chord = 2.0 * np.sin(min(0.5 * distance / radius, 0.5 * np.pi))
    tree, other = KDTree(_unit_vectors(longitude, latitude)), KDTree(_unit_vectors(other_longitude, other_latitude))
    near = tree.sparse_distance_matrix(other, chord, output_type="ndarray")
    near = near[np.lexsort((near["j"], near["i"]))]
    arc = 2.0 * radius * np.arcsin(np.minimum(0.5 * near["v"], 1.0))
    return Pairs(near["i"].astype(np.int64), near["j"].astype(np.int64), arc)


def _unit_vectors(longitude: FloatArray, latitude: FloatArray) -> FloatArray:
    """Points on the unit sphere, (n, 3)."""
    east, north = np.deg2rad(longitude), np.deg2rad(latitude)
    return np.stack([np.cos(north) * np.cos(east), np.cos(north) * np.sin(east), np.sin(north)], axis=1)


def cheapest_links(costs: Pairs, size: int, other_size: int, unlinked_cost: float) -> IntArray:
    """Link each point to at most one of the other set so that the total cost is least.

    A point without a link costs `unlinked_cost`. Points that no pair connects do not influence each other, so
    each connected group is solved on its own.

    Parameters
    ----------
    costs : Pairs
        The pairs that may be linked, with their costs.
    size, other_size : int
        Points in the first and in the second set.
    unlinked_cost : float
        Cost of a point of the first set without a link.

    Returns
    -------
    (size,) int array
        For each point of the first set the one of the second, or -1.

    References
    ----------
    Crouse (2016), On implementing 2D rectangular assignment algorithms (the solver in scipy).
    """
    partner = np.full(size, -1, dtype=np.int64)
    cheap = costs.value < unlinked_cost
    first, second, gain = costs.first[cheap], costs.second[cheap], costs.value[cheap] - unlinked_cost
    total = size + other_size
    graph = coo_array((np.ones(first.size), (first, second + size)), shape=(total, total))
    _, group = connected_components(graph, directed=False)
    order = np.argsort(group[first], kind="stable")
    ends = np.flatnonzero(np.diff(group[first[order]])) + 1
    for members in np.split(order, ends):
        rows, row = np.unique(first[members], return_inverse=True)
        columns, column = np.unique(second[members], return_inverse=True)
        table = np.zeros((rows.size, columns.size))  # no gain: not a pair, or left unlinked
        table[row, column] = gain[members]
        chosen, with_column = linear_sum_assignment(table)
        linked = table[chosen, with_column] < 0.0
        partner[rows[chosen[linked]]] = columns[with_column[linked]]
    return partner
