# Needs Python 3.11 or newer and make; everything else is installed into .venv from the lock.
#
#   make site        the site of content/, built into output/
#   make test        style, types, layers, tests
#   make judges      the programs that the tests are held against, where the machine lacks them
#   make fuzz        hostile input for SECONDS=300, guided by coverage; installs atheris
#   make kills       builds killed at COUNT=200 random moments
#   make mutants     do the tests notice a change? SAMPLE=50 of them, of FILE=generator/moonwrit/...py, against TESTS
#   make benchmarks  tests/benchmarks/, alone on the machine
#   make catalogues  the texts of theme and code brought into the message catalogues
#   make lock        requirements.lock again, after a change of pyproject.toml
#   make clean       removes whatever make has made

PYTHON ?= python3
BIN := .venv/bin
READY := .venv/.ready

.PHONY: site test judges fuzz kills mutants benchmarks catalogues lock clean

site: $(READY)
	$(BIN)/moonwrit publish

# The tests come last, so that their own summary is the last line.
test: $(READY)
	$(BIN)/ruff check
	$(BIN)/mypy
	$(BIN)/lint-imports
	$(BIN)/pytest -n 2

judges:
	.ci/judges

SECONDS ?= 300
fuzz: $(READY)
	$(BIN)/python -m pip install --quiet 'atheris>=2.3,<4'
	$(BIN)/python tests/fuzz/guided.py $(SECONDS)

SAMPLE ?= 50
mutants: $(READY)
	$(BIN)/python tests/mutants.py $(FILE) $(SAMPLE) $(TESTS)

COUNT ?= 200
kills: $(READY)
	$(BIN)/python tests/fuzz/killed.py $(COUNT)

benchmarks: $(READY)
	$(BIN)/python tests/benchmarks/run.py

catalogues: $(READY)
	$(BIN)/python themes/catalogues.py

# Without the extra long-range, whose file is 114 MB. Versions already locked are kept where they still fit; delete the lock first to take the newest of all.
lock: | $(BIN)/python
	$(BIN)/python -m pip install --quiet uv
	$(BIN)/uv pip compile pyproject.toml --quiet --output-file requirements.lock \
		--universal --python-version 3.11 --fork-strategy fewest --extra dev --extra pdf --extra cluster --extra parquet \
		--generate-hashes --no-emit-index-url --custom-compile-command 'make lock'

clean:
	rm -rf .venv .judges .fuzz .benchmarks .hypothesis .import_linter_cache .mypy_cache .pytest_cache .ruff_cache dist
	find output -mindepth 1 ! -name .gitkeep -delete
	find generator tests -name __pycache__ -prune -exec rm -rf {} +

$(READY): requirements.lock pyproject.toml | $(BIN)/python
	$(BIN)/python -m pip install --quiet --require-hashes -r requirements.lock
	$(BIN)/python -m pip install --quiet --no-deps --no-build-isolation -e .
	touch $@

$(BIN)/python:
	@$(PYTHON) -c 'import sys; sys.exit(sys.version_info < (3, 11))' || \
		{ echo 'Moonwrit needs Python 3.11 or newer; name it: make PYTHON=/path/to/python3' >&2; exit 1; }
	$(PYTHON) -m venv .venv
