"""Do the tests notice? Faults put on purpose into a copy of the package must fail a small set of its tests.

`mutants.toml` lists them. The copy runs without numba's compiler: a fault costs seconds, not a compilation.
"""

import os
import shutil
import subprocess
import sys
import tomllib
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[1]
LIST = tomllib.loads((Path(__file__).with_name("mutants.toml")).read_text(encoding="utf-8"))
MUTANTS = {mutant["name"]: mutant for mutant in LIST["mutant"]}
ALL_TESTS = sorted({*LIST["tests"], *(test for mutant in LIST["mutant"] for test in mutant.get("tests", ()))})


def test_the_list_fits_the_code():
    """Every original stands exactly once where it is said to, the faults are many and named apart."""
    assert len(LIST["mutant"]) == len(MUTANTS) >= 14
    for name, mutant in MUTANTS.items():
        text = (ROOT / mutant["file"]).read_text(encoding="utf-8")
        assert text.count(mutant["original"]) == 1, name
        assert mutant["replacement"] != mutant["original"], name
        assert mutant["breaks"], name


@pytest.fixture(scope="module")
def copy(tmp_path_factory):
    """The package and what its tests need, in a folder of their own."""
    folder = tmp_path_factory.mktemp("mutants")
    ignore = shutil.ignore_patterns("__pycache__", "*.nbi", "*.nbc")
    shutil.copytree(ROOT / "soiltemp", folder / "soiltemp", ignore=ignore)
    shutil.copytree(ROOT / "tests" / "helpers", folder / "tests" / "helpers", ignore=ignore)
    shutil.copy(ROOT / "tests" / "__init__.py", folder / "tests" / "__init__.py")
    shutil.copy(ROOT / "pyproject.toml", folder)
    for test in ALL_TESTS:
        shutil.copy(ROOT / test, folder / test)
    return folder


def run_tests(folder, tests):
    """Run tests in the copy, to the first failure; give exit status and the end of the output."""
    done = subprocess.run(
        [sys.executable, "-m", "pytest", "-x", "-q", "-p", "no:cacheprovider", *tests],
        cwd=folder, capture_output=True, text=True, timeout=300, check=False,
        env={**os.environ, "NUMBA_DISABLE_JIT": "1", "PYTHONPATH": str(folder), "PYTHONDONTWRITEBYTECODE": "1"},
    )  # fmt: skip
    return done.returncode, done.stdout[-2000:] + done.stderr[-1000:]


@pytest.mark.long
def test_without_a_fault_all_pass(copy):
    status, output = run_tests(copy, ALL_TESTS)
    assert status == 0, output
    # it was the copy that ran
    where = subprocess.run(
        [sys.executable, "-c", "import soiltemp; print(soiltemp.__file__)"], cwd=copy, capture_output=True, text=True,
        check=True, env={**os.environ, "PYTHONPATH": str(copy)},
    )  # fmt: skip
    assert Path(where.stdout.strip()).is_relative_to(copy)


@pytest.mark.long
@pytest.mark.parametrize("name", MUTANTS)
def test_fault_is_noticed(copy, name):
    mutant = MUTANTS[name]
    path = copy / mutant["file"]
    text = path.read_text(encoding="utf-8")
    try:
        path.write_text(text.replace(mutant["original"], mutant["replacement"]), encoding="utf-8")
        status, output = run_tests(copy, mutant.get("tests", LIST["tests"]))
    finally:
        path.write_text(text, encoding="utf-8")
    # 1: tests failed. Anything else (no tests found, a fault that does not even import) proves nothing.
    assert status == 1, output
    assert "error during collection" not in output, output
