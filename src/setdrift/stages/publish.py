"""Publishing days of maps and currents, and the eddies found in them."""

from __future__ import annotations

import datetime as dt
from collections.abc import Callable, Mapping
from typing import Any

import numpy as np
from numpy.typing import NDArray

from setdrift.data.algorithms import settings_digest
from setdrift.data.configuration import Configuration
from setdrift.data.conventions import DAILY_VARIABLES
from setdrift.data.daily_product import DailyProduct
from setdrift.data.day_store import DayStore
from setdrift.data.digests import digest
from setdrift.data.eddy_product import publish_eddy_store
from setdrift.data.fixed import load_fixed_fields
from setdrift.data.grids import analysis_grid, working_grid
from setdrift.data.lock import only_publisher
from setdrift.data.receipts import analysed_period, contents_between
from setdrift.data.records import read_record, write_record

STAGES = ("maps", "dynamic_topography", "currents")


def publish_daily(configuration: Configuration, now: dt.datetime, announce: Callable[[str], None]) -> None:
    """Bring the daily product in line with the analysed days.

    Parameters
    ----------
    configuration : Configuration
        The analysis.
    now : datetime
        Time of publication, UTC.
    announce : callable
        Told what changed, for the log.
    """
    first, last = analysed_period(configuration)
    contents = [contents_between(configuration, stage, first, last) for stage in STAGES]
    sources = {day: digest([content[day] for content in contents]) for day in contents[0]}
    rows, columns = working_grid(configuration).window(analysis_grid(configuration))
    stores = [(stage, DayStore(configuration.work / stage)) for stage in STAGES]

    def load_day(day: dt.date) -> Mapping[str, NDArray[Any]]:
        loaded = {stage: store.load(day) for stage, store in stores}
        return {v.name: loaded[v.stage][v.name].values[rows, columns] for v in DAILY_VARIABLES if v.stage in loaded}

    fixed = load_fixed_fields(configuration)
    fields = {name: np.asarray(values)[rows, columns] for name, values in fixed.data_vars.items()}
    product = DailyProduct(configuration, {str(name): field for name, field in fields.items()}, load_day, now)
    with only_publisher(configuration.products):
        account = product.publish(sources)
    announce(", ".join(f"{len(days)} days {what}" for what, days in account.items()))
    for day in account["retired"]:
        announce(f"{day} retired: it is no longer in the analysed period")
    write_record(
        configuration.work / "published" / "daily.json", {day.isoformat(): source for day, source in sources.items()}
    )


def publish_eddies(configuration: Configuration, now: dt.datetime, announce: Callable[[str], None]) -> None:
    """Put the eddies and trajectories of all analysed days in the place of those published before.

    Parameters
    ----------
    configuration : Configuration
        The analysis.
    now : datetime
        Time of publication, UTC.
    announce : callable
        Told what was published, for the log.
    """
    first, last = analysed_period(configuration)
    detected = contents_between(configuration, "eddies", first, last)
    linked = read_record(configuration.work / "trajectories" / "links.json")["days"]
    source = digest(settings_digest(configuration, "eddy_product"), list(detected.values()), linked)
    eddies, trajectories = (DayStore(configuration.work / stage) for stage in ("eddies", "trajectories"))
    days = {day: eddies.load(day) for day in detected}
    identifiers = {day: trajectories.load(day)["trajectory"].values for day in detected}
    with only_publisher(configuration.products):
        written = publish_eddy_store(configuration, days, identifiers, source, now)
    count = sum(values.size for values in identifiers.values())
    announce(f"{count} detections on {len(days)} days{'' if written else ', unchanged'}")
    write_record(configuration.work / "published" / "eddies.json", {"source": source, "detections": count})
