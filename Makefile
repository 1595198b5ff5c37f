# Everything a user or contributor types. `make help` lists it; DEVELOPERS.md tells more.

SHELL := /bin/bash
.SHELLFLAGS := -eu -o pipefail -c
.DEFAULT_GOAL := help
.PHONY: help run test check tests bench fuzz data picture lock clean

VENV := .venv
BIN := $(VENV)/bin
SAMPLE := samples/reformer-outlet.thalweg
# Two test processes fit the smallest machine; `make test WORKERS=8` uses a bigger one.
WORKERS := 2
# Tests render into memory, never on the screen.
OFFSCREEN := QT_QPA_PLATFORM=offscreen
INSTALL := $(BIN)/python -m pip install -qq --disable-pip-version-check

help: ## this list
	@awk -F ':.*## ' '/^[a-z]+:.*## / { printf "  make %-9s %s\n", $$1, $$2 }' Makefile

run: $(VENV)/for-run ## open the window on a sample (makes the environment the first time)
	@$(BIN)/thalweg $(SAMPLE)

test: check tests ## all checks and all tests

check: $(VENV)/for-check ## format, lint, types and the import contract
	@echo "== format and lint"
	@$(BIN)/ruff format --check --quiet . || { $(BIN)/ruff format --check .; exit 1; }
	@$(BIN)/ruff check --quiet --output-format concise .
	@echo "== types"
	@$(BIN)/mypy
	@echo "== imports"
	@$(BIN)/lint-imports --no-cache | tail -n 8

tests: $(VENV)/for-check ## the tests alone; one file: make tests TESTS=tests/gui/test_window.py
	@echo "== tests"
	@$(OFFSCREEN) $(BIN)/python -m pytest -q -n $(WORKERS) --dist loadgroup --benchmark-disable $(TESTS)

bench: $(VENV)/for-check ## speed beside general-purpose solvers; writes tests/bench/notes.md
	@$(OFFSCREEN) $(BIN)/python -m tests.bench

fuzz: $(VENV)/for-check ## 20,000 random problems and 1000 real mixtures; fewer or others: make fuzz FUZZ="--count 500 --first 7"
	@$(OFFSCREEN) $(BIN)/python -m tests.fuzz $(FUZZ)
	@$(OFFSCREEN) $(BIN)/python -m tests.fuzz.real 0 1000

data: $(VENV)/for-data ## write the tables of species_db/data/ again from their sources
	@$(BIN)/python -m species_db.build

picture: $(VENV)/for-run ## draw the window into samples/window.png, no screen needed
	@$(OFFSCREEN) $(BIN)/python -m gui.picture samples/window.png $(SAMPLE)

lock: ## choose newer versions for locks/ (needs uv)
	@for group in run check data; do \
	  flags="--group build"; \
	  [ $$group = check ] && flags="pyproject.toml --group build --group check -c locks/run.txt"; \
	  [ $$group = data ] && flags="--group build --group data -c locks/check.txt"; \
	  [ $$group = run ] && flags="pyproject.toml --group build"; \
	  echo "locks/$$group.txt"; \
	  uv pip compile --quiet --no-config --upgrade --generate-hashes --universal --python-version 3.11 \
	    --no-emit-index-url --no-header --no-annotate $$flags -o locks/$$group.txt > /dev/null; \
	done

clean: ## remove the environment and everything made by tools
	rm -rf $(VENV) *.egg-info build dist .pytest_cache .mypy_cache .ruff_cache .import_linter_cache .hypothesis .benchmarks
	find gui solver species_db tests -name __pycache__ -prune -exec rm -rf {} +

# The environment. Each stamp says that its lock is installed, so a second `make` starts at once.

$(BIN)/python:
	@python=; \
	for name in python3.12 python3.13 python3.11 python3 python; do \
	  if $$name -c 'import sys; sys.exit(sys.version_info < (3, 11))' > /dev/null 2>&1; then python=$$name; break; fi; \
	done; \
	if [ -z "$$python" ]; then \
	  echo "Thalweg needs Python 3.11 or newer, and none was found. Install it and run make again." >&2; exit 1; \
	fi; \
	if ! $$python -c 'import ensurepip, venv' > /dev/null 2>&1; then \
	  echo "$$python cannot make an environment: its venv module is missing." >&2; \
	  echo "On Debian or Ubuntu: apt install python3-venv. Then run make again." >&2; exit 1; \
	fi; \
	echo "Making the environment in $(VENV) with $$($$python --version)"; \
	$$python -m venv $(VENV)

$(VENV)/for-%: locks/%.txt pyproject.toml | $(BIN)/python
	@echo "Installing the packages of locks/$*.txt"
	@$(INSTALL) --require-hashes -r locks/$*.txt
	@$(INSTALL) --no-deps --no-build-isolation --editable .
	@touch $@
