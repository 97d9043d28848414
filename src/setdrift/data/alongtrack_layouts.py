"""Layouts of along-track files: however observations are arranged, one flat series of them."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from setdrift.data.netcdf import attribute, floats, variables
from setdrift.errors import SetdriftError

BASE = "sea_level_anomaly"
"""The role whose variable has one value for each observation; the others follow its dimensions."""

EVERYWHERE = {"time": ("time", "time_offset"), "latitude": ("latitude",), "longitude": ("longitude",)}
"""What must tell any two observations apart, and the roles that do so together."""


@dataclass(frozen=True)
class Layout:
    """How the variables of a file are spread over its observations.

    Attributes
    ----------
    kind : str
        For messages: points, table (two or more dimensions), contiguous ragged or indexed ragged.
    dimensions : tuple of str
        Dimensions of the observations, those of size 1 left out.
    shape : tuple of int
        Their sizes.
    instance : str
        The dimension of what a ragged layout has one value a row for; empty otherwise.
    rows : (n,) array of int64, or None
        Row of each observation of a ragged layout.
    """

    kind: str
    dimensions: tuple[str, ...]
    shape: tuple[int, ...]
    instance: str = ""
    rows: NDArray[np.int64] | None = None

    @property
    def size(self) -> int:
        """The number of observations."""
        return int(np.prod(self.shape, dtype=np.int64))

    def flat(self, variable: Any, values: NDArray[Any]) -> NDArray[Any]:
        """Return a variable's values as one series, repeated along the dimensions that it does not have.

        Parameters
        ----------
        variable : netCDF4.Variable
            A variable that fits the layout.
        values : array
            Its values, in its own shape.

        Returns
        -------
        (n,) array
            One value for each observation, the last dimension running fastest.
        """
        names = _dimensions(variable)
        values = values.reshape(list(names.values()))
        if self.rows is not None and tuple(names) == (self.instance,):
            return np.asarray(values[self.rows])
        if len(names) == len(self.shape) == 1:
            return values
        kept = [name for name in self.dimensions if name in names]
        values = values.transpose([list(names).index(name) for name in kept])
        values = values.reshape([names.get(name, 1) for name in self.dimensions])
        return np.array(np.broadcast_to(values, self.shape)).ravel()


def layout_of(file: Any, located: Mapping[str, Any]) -> Layout:
    """Tell how a file's observations are arranged.

    Known are points (one dimension), tables (records by samples, trajectories by observations; size-1 dimensions
    count nowhere), and the contiguous and indexed ragged arrays of the CF conventions.

    Parameters
    ----------
    file : netCDF4.Dataset
        The open file.
    located : mapping
        Variable of each role.

    Returns
    -------
    Layout
        The arrangement.

    Raises
    ------
    SetdriftError
        A variable fits no known arrangement, or there are no observations.
    """
    where = file.filepath()
    base = located[BASE]
    dimensions = _dimensions(base)
    if len(dimensions) < sum(size != 1 for size in base.shape):
        what = f"variable {base.name} has one dimension twice ({', '.join(base.dimensions)})"
        raise SetdriftError(where, what, "give each observation one value")
    names, shape = tuple(dimensions), tuple(dimensions.values())
    if 0 in shape:
        raise SetdriftError(where, "holds no records", "nothing need be done if that is as expected")
    layout = Layout("points" if len(shape) <= 1 else "table", names, shape)
    if len(shape) == 1:
        layout = _ragged(file, layout) or layout
    for variable in located.values():
        _check_fit(where, layout, base, variable)
    for roles in EVERYWHERE.values():
        _check_cover(where, layout, base, [located[role] for role in roles if role in located])
    return layout


def _dimensions(variable: Any) -> dict[str, int]:
    """Return names and sizes of the dimensions that count: those of size 1 do not."""
    return {name: size for name, size in zip(variable.dimensions, variable.shape, strict=True) if size != 1}


def _check_fit(where: str, layout: Layout, base: Any, variable: Any) -> None:
    """Refuse a variable with a dimension that observations do not have."""
    dimensions = _dimensions(variable)
    if len(dimensions) == len(layout.shape) == 1:
        # one series each: the name of its dimension does not matter, its length does
        size = next(iter(dimensions.values()))
        if size == layout.shape[0] or (layout.rows is not None and tuple(dimensions) == (layout.instance,)):
            return
        what = f"variable {variable.name} has {size} values for {layout.shape[0]} of {base.name}"
        raise SetdriftError(where, what, "name variables of one length in the configuration")
    known = dict(zip(layout.dimensions, layout.shape, strict=True))
    repeated = len(dimensions) < sum(size != 1 for size in variable.shape)
    if repeated or any(known.get(name) != size for name, size in dimensions.items()):
        what = f"variable {variable.name} {_described(variable)}, but {base.name} {_described(base)}"
        raise SetdriftError(where, what, "name variables that share their dimensions")


def _check_cover(where: str, layout: Layout, base: Any, sources: list[Any]) -> None:
    """Refuse observations that would all have one time, or one place, along a dimension."""
    own = [_dimensions(v) for v in sources if tuple(_dimensions(v)) != (layout.instance,)]
    if any(len(names) == len(layout.shape) for names in own) or set().union(*own) >= set(layout.dimensions):
        return
    what = f"variable {base.name} {_described(base)}, but variable {sources[0].name} {_described(sources[0])}"
    remedy = "name variables with one value for each observation (variables.time_offset may add to a record's time)"
    raise SetdriftError(where, what, remedy)


def _described(variable: Any) -> str:
    count = len(variable.dimensions)
    names = f" ({', '.join(variable.dimensions)})" if count else ""
    return f"has {count} dimension{'' if count == 1 else 's'}{names}"


def _ragged(file: Any, layout: Layout) -> Layout | None:
    """Return the layout of a CF ragged array, if a variable declares one over the observations."""
    observations, size = layout.dimensions[0], layout.shape[0]
    for name, variable in variables(file).items():
        if len(variable.dimensions) != 1:
            continue
        if attribute(variable, "sample_dimension") == observations:
            counts = _whole(file, name, variable, size)
            if counts.sum() != size:
                what = f"variable {name} counts {counts.sum()} observations, but there are {size}"
                raise SetdriftError(file.filepath(), what, "replace the file or move it away")
            rows = np.repeat(np.arange(counts.size), counts)
            return Layout("contiguous ragged", layout.dimensions, layout.shape, variable.dimensions[0], rows)
        instance = attribute(variable, "instance_dimension")
        if instance and variable.dimensions[0] == observations:
            length = _length(file, instance)
            rows = _whole(file, name, variable, length - 1)
            return Layout("indexed ragged", layout.dimensions, layout.shape, instance, rows)
    return None


def _whole(file: Any, name: str, variable: Any, largest: int) -> NDArray[np.int64]:
    """Read counts or indices, all of which must be sound."""
    values = floats(variable)
    if not np.all((values >= 0) & (values <= largest) & (values == np.rint(values))):
        what = f"variable {name}, which tells what belongs together, holds values that are not 0 to {largest}"
        raise SetdriftError(file.filepath(), what, "replace the file or move it away")
    return values.astype(np.int64)


def _length(file: Any, dimension: str) -> int:
    """Return the length of a dimension, by the variables that have it."""
    for variable in variables(file).values():
        if dimension in variable.dimensions:
            return int(variable.shape[variable.dimensions.index(dimension)])
    # without any variable of its own, nothing will be looked up in it
    return int(np.iinfo(np.int32).max)
