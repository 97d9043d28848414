# What all rules share: the checked configuration, the inventory of its input files, and how a job is called.
import datetime as dt
import sys

from setdrift.data.algorithms import settings_digest
from setdrift.data.configuration import load_configuration
from setdrift.errors import SetdriftError
from setdrift.operations.inventory import take_inventory
from setdrift.operations.jobs import unfinished_jobs
from setdrift.operations.plan import Plan

BEGUN = dt.datetime.now(dt.UTC)


def stop(message):
    sys.exit(f"setdrift: {message}")


def print_products():
    print(
        f"setdrift: {CONFIGURATION.analysis} is done; its products are in {CONFIGURATION.products}",
        file=sys.stderr,
    )


def print_unfinished_jobs():
    print(
        f"setdrift: the run of {CONFIGURATION.analysis} did not finish; what was published before stands",
        *unfinished_jobs(CONFIGURATION.work, BEGUN),
        "mend the cause and run the same command again: what is done is kept",
        sep="\n",
        file=sys.stderr,
    )


if len(workflow.configfiles) != 1:
    stop("one configuration is needed; add --configfile config/NAME.yaml")
CONFIG = workflow.configfiles[0]
try:
    CONFIGURATION = load_configuration(CONFIG)
    INVENTORY = take_inventory(CONFIGURATION, lambda line: print(line, file=sys.stderr))
except SetdriftError as error:
    stop(error)

PLAN = Plan(CONFIGURATION, INVENTORY.days[0], INVENTORY.days[-1])
WINDOW = CONFIGURATION.mapping.window_days
WORK = CONFIGURATION.work
RECEIPTS = [f"{WORK}/fixed/fields.json", f"{WORK}/trajectories/links.json"]
RECEIPTS += [
    f"{WORK}/observations/{block.label}.json" for block in INVENTORY.observation_blocks
]
for stage in ("maps", "dynamic_topography", "currents", "eddies"):
    RECEIPTS += PLAN.receipts(stage)
MANIFESTS = f"{WORK}/manifests"
JOB = f"{sys.executable} -m setdrift.cli job"


wildcard_constraints:
    block=r"\d{4}-\d{2}-\d{2}",
