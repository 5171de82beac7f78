"""`python3 tests [--quick] [--bench] [pytest arguments]`: linters, types, layers, then the tests.

--quick leaves the slow tests and those beside other libraries out, as do arguments for pytest. --bench runs
the benchmarks, and them alone, so that nothing disturbs their clocks. --expect-python 3.12 fails unless that
is the Python which runs the tests.
"""

import os
import sys

HERE = os.path.dirname(os.path.abspath(__file__))

# Run as a folder, Python puts tests/ itself first on its path, where `import app` would find nothing.
sys.path[0] = os.path.dirname(HERE)

from app.bootstrap.python import SETUP_ERROR, require_supported_python

require_supported_python()

# Everything from here on may be written for the supported Pythons only.
import argparse
import subprocess

from app.bootstrap.environment import ROOT, RUNTIME, Program, enter, private_environment, python_of
from app.errors import SetupError

NEEDS = (
    *RUNTIME,
    "pytest",
    "xdist",
    "hypothesis",
    "mpmath",
    "httpx2",
    "plotly",
    "playwright",
    "axe_playwright_python",
    "ruff",
    "mypy",
    "importlinter",
    "hatchling",
)

LIBRARIES = Program(folder=HERE, needs=("lifelines", "statsmodels", "sksurv"), lock_name="peers.lock")
"""General survival libraries: they need other versions of what the program needs, so they live apart."""

LINT_IMPORTS = "from importlinter.cli import lint_imports_command; lint_imports_command()"

CHECKS = {
    "ruff check, likely mistakes": ["-m", "ruff", "check", "."],
    "ruff format, layout": ["-m", "ruff", "format", "--check", "."],
    "mypy, types": ["-m", "mypy"],
    "import-linter, layers": ["-c", LINT_IMPORTS, "--no-logo"],
}


def arguments() -> tuple[argparse.Namespace, list[str]]:
    """Our own options, and the rest, which is pytest's."""
    parser = argparse.ArgumentParser(prog="python3 tests", description=__doc__, allow_abbrev=False)
    parser.add_argument("--quick", action="store_true", help="leave the slow tests out")
    parser.add_argument("--bench", action="store_true", help="run the benchmarks alone")
    parser.add_argument("--expect-python", metavar="SERIES", help="fail under any other Python, as in 3.12")
    return parser.parse_known_args()


def require_python(series: str | None) -> None:
    """End unless this is the Python asked for: a version manager may hand over another one without a word."""
    if series is not None and series != ".".join(map(str, sys.version_info[:2])):
        print(f"The tests run under another Python than asked. Found {sys.version}. Accepted: {series}.")
        sys.exit(SETUP_ERROR)


def run(title: str, command: list[str], python: str = sys.executable) -> bool:
    """Run one step under its title; whether it passed."""
    print(f"\n== {title}", flush=True)
    return subprocess.run([python, *command], cwd=ROOT, check=False).returncode == 0


def run_beside_libraries(options: argparse.Namespace) -> bool:
    """The survival estimators beside general libraries, in the environment of these; left out by --quick."""
    folder, option = ("bench", ["--bench", "-s"]) if options.bench else ("reference", [])
    try:
        python = python_of(private_environment(LIBRARIES))
    except SetupError as error:
        print(error)
        return False
    command = ["-m", "pytest", "-W", "ignore", "-p", "no:cacheprovider", *option, f"tests/{folder}/libraries"]
    return run("pytest, beside lifelines, statsmodels and scikit-survival", command, str(python))


def pytest_command(options: argparse.Namespace, rest: list[str]) -> list[str]:
    """Two processes halve the time on two cores; benchmarks have the machine to themselves."""
    if options.bench:
        return ["-m", "pytest", "--bench", "-s", *rest]
    return ["-m", "pytest", "-n", "2", *(["--quick"] if options.quick else []), *rest]


def main() -> int:
    """Every step is run, whatever the others say; pytest comes last, so that its closing line does."""
    options, rest = arguments()
    require_python(options.expect_python)
    print(f"Python {sys.version}")
    checks = {} if options.bench else CHECKS
    failed = [title for title, command in checks.items() if not run(title, command)]
    if not options.quick and not rest and not run_beside_libraries(options):
        failed.append("pytest beside the libraries")
    if failed:
        print(f"\nFailed, so that this run fails whatever the tests say: {'; '.join(failed)}")
    passed = run("pytest", pytest_command(options, rest))
    return 0 if passed and not failed else 1


enter(Program(folder=HERE, needs=NEEDS), sys.argv[1:])

if __name__ == "__main__":
    sys.exit(main())
