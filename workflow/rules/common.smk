# What all rules share: the checked configuration, the inventory of its input files, and how a job is called.
import sys

from setdrift.data.algorithms import settings_digest
from setdrift.data.configuration import load_configuration
from setdrift.errors import SetdriftError
from setdrift.operations.inventory import take_inventory
from setdrift.operations.plan import Plan


def stop(message):
    sys.exit(f"setdrift: {message}")


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
MANIFESTS = f"{WORK}/manifests"
JOB = f"{sys.executable} -m setdrift.cli job"


wildcard_constraints:
    block=r"\d{4}-\d{2}-\d{2}",
