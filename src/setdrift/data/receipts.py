"""Receipts: what each job made, and the digests that the next stage's days depend on."""

from __future__ import annotations

import datetime as dt
from collections.abc import Callable, Iterable
from pathlib import Path
from typing import Any

import xarray as xr

from setdrift.data.configuration import Configuration
from setdrift.data.day_store import DayStore, refresh_days
from setdrift.data.days import Block, blocks_between, days_between
from setdrift.data.records import read_record, write_record
from setdrift.errors import SetdriftError


def receipt_path(configuration: Configuration, stage: str, block: Block) -> Path:
    """Return where the receipt of a stage's job for a block is kept."""
    return configuration.work / stage / f"{block.label}.json"


def refresh_block(
    configuration: Configuration,
    stage: str,
    block: Block,
    days: Iterable[dt.date],
    made_from: Callable[[dt.date], str],
    make: Callable[[dt.date], xr.Dataset],
    announce: Callable[[str], None],
) -> dict[str, Any]:
    """Make the days of a stage's block that are missing or out of date, and write the receipt.

    Parameters
    ----------
    configuration : Configuration
        The analysis.
    stage : str
        The stage's folder.
    block : Block
        The days the job handles.
    days : iterable of date
        Those of them that are wanted.
    made_from : callable
        Digest of all a day depends on.
    make : callable
        Computes a day.
    announce : callable
        Told of each day, for the log.

    Returns
    -------
    dict
        The receipt.
    """
    contents = refresh_days(DayStore(configuration.work / stage), days, made_from, make, announce)
    receipt = {"stage": stage, "block": block.label, "days": {day: {"content": c} for day, c in contents.items()}}
    write_record(receipt_path(configuration, stage, block), receipt)
    return receipt


def contents_between(configuration: Configuration, stage: str, first: dt.date, last: dt.date) -> dict[dt.date, str]:
    """Read the content digests of a stage's days.

    Parameters
    ----------
    configuration : Configuration
        The analysis.
    stage : str
        The stage's folder.
    first, last : date
        Days wanted, both included.

    Returns
    -------
    dict
        Content digest by day.

    Raises
    ------
    SetdriftError
        A receipt is missing, or lacks a day.
    """
    found: dict[str, Any] = {}
    for block in blocks_between(first, last, configuration.block_days):
        found |= read_record(receipt_path(configuration, stage, block))["days"]
    wanted = days_between(first, last)
    lacking = [day for day in wanted if day.isoformat() not in found]
    if lacking:
        raise SetdriftError(
            str(configuration.work / stage),
            f"receipts lack {len(lacking)} day(s), first {lacking[0]}",
            "run the workflow again from the start of this stage",
        )
    return {day: found[day.isoformat()]["content"] for day in wanted}


def analysed_days(configuration: Configuration, block: Block) -> list[dt.date]:
    """Return the analysed days of a block.

    Parameters
    ----------
    configuration : Configuration
        The analysis.
    block : Block
        The days a job handles.

    Returns
    -------
    list of date
        At least one.

    Raises
    ------
    SetdriftError
        The block holds none.
    """
    first, last = analysed_period(configuration)
    days = block.days_within(first, last)
    if not days:
        raise SetdriftError(
            f"block {block.label}", f"holds no analysed day ({first} to {last})", "choose another or change period"
        )
    return days


def analysed_period(configuration: Configuration) -> tuple[dt.date, dt.date]:
    """Return the first and last analysed day, as the inventory settled them.

    Parameters
    ----------
    configuration : Configuration
        The analysis.

    Returns
    -------
    first, last : date
        Both included.
    """
    settled = read_record(configuration.work / "manifests" / "period.json")
    return dt.date.fromisoformat(settled["first"]), dt.date.fromisoformat(settled["last"])
