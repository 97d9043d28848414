# setdrift: `make demo` runs the whole pipeline on the invented Tarn Sea, `make test` runs the tests.
# Each sets up what it needs in .venv first; a second call is quick.

PYTHON ?= python3
CORES ?= $(shell nproc)
BIN := .venv/bin
SCENARIO := build/tarn_sea
CONFIG := config/tarn_sea.yaml
PRODUCTS := results/products/tarn_sea
INSTALLED := .venv/installed
COMPILED := .venv/compiled

# one thread for each job's linear algebra: parallel jobs share the cores
export OPENBLAS_NUM_THREADS := 1

.PHONY: help setup demo test check bench docs clean

help:
	@echo "make demo    set up, invent the Tarn Sea's observations, run the whole pipeline, compare with the truth"
	@echo "make test    set up and run the tests"
	@echo "make check   lint, types, layers and workflow format"
	@echo "make bench   time and score the mapping, and time the reading, against references"
	@echo "make docs    regenerate the generated parts of the documentation (after make demo)"
	@echo "make setup   only set up .venv"
	@echo "make clean   remove what make demo made (not .venv)"

setup: $(COMPILED)

$(INSTALLED): pyproject.toml constraints.txt
	@echo "== set-up: Python packages into .venv"
	@test -x $(BIN)/python || $(PYTHON) -m venv .venv
	@$(BIN)/python -m pip install --quiet --constraint constraints.txt uv
	@$(BIN)/uv pip install --python $(BIN)/python --constraint constraints.txt --editable '.[test,check]'
	@touch $@

$(COMPILED): $(INSTALLED) $(wildcard src/setdrift/numerics/*.py)
	@echo "== set-up: compiling the fast loops (about half a minute, once)"
	@$(BIN)/setdrift prepare
	@touch $@

demo: $(COMPILED)
	@echo "== 1 of 3: the invented Tarn Sea and what four altimeters saw of it"
	@$(BIN)/python -m synthetic_tracks --output $(SCENARIO)
	@echo "== 2 of 3: from observations to published currents and eddies"
	@$(BIN)/snakemake --cores $(CORES) --configfile $(CONFIG)
	@echo "== 3 of 3: the published maps against the truth"
	@$(BIN)/setdrift verify $(CONFIG) --truth $(SCENARIO)/truth.nc
	@echo
	@echo "Maps and currents   $(PRODUCTS)/daily.zarr"
	@echo "Eddies              $(PRODUCTS)/eddies.zarr"
	@echo "Picture, open this  $$(ls $(PRODUCTS)/bulletin/*.png | tail -n 1)"
	@echo "Next: README.md, 'Reading the products'; config/README.md to point it at your own files"

test: $(COMPILED)
	@echo "== tests (the whole suite takes a few minutes)"
	@$(BIN)/python -m pytest --cov=setdrift.numerics --cov-report=term:skip-covered --cov-fail-under=95
	@echo "Next: make check for lint and types; DEVELOPERS.md to change something"

check: $(INSTALLED)
	@echo "== lint"
	@$(BIN)/ruff check .
	@$(BIN)/ruff format --check .
	@echo "== types"
	@$(BIN)/mypy
	@echo "== layers"
	@$(BIN)/lint-imports --no-logo
	@echo "== workflow format"
	@$(BIN)/snakefmt --check workflow

bench: $(COMPILED)
	@for file in benchmarks/*.py; do echo "== $$file"; $(BIN)/python $$file || exit 1; done

docs: $(COMPILED)
	@$(BIN)/python docs/generate.py

clean:
	rm -rf build results .snakemake
