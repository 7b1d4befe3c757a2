"""What is not needed is not imported: starting the command costs no more than it must."""

import subprocess
import sys

import pytest

HEAVY = ("numpy", "scipy", "pyproj", "networkx", "shapely", "pydantic")


def imported_by(code):
    """Top-level packages in `sys.modules` after the code has run in a fresh interpreter."""
    line = [sys.executable, "-c", f"{code}\nimport sys\nprint(*{{name.split('.')[0] for name in sys.modules}})"]
    done = subprocess.run(line, capture_output=True, text=True, timeout=120, check=True)
    return set(done.stdout.split())


@pytest.mark.parametrize(
    "code", ["import adjust", "import cli.main", "from adjust import FieldDataError, NetworkError"]
)
def test_library_and_command_start_without_any_heavy_package(code):
    assert imported_by(code).isdisjoint(HEAVY)


@pytest.mark.parametrize("code", ["import adjust.quality", "import adjust.reports"])
def test_statistics_and_reports_do_without_scipy_stats(code):
    line = [sys.executable, "-c", f"{code}\nimport sys\nassert 'scipy.stats' not in sys.modules"]
    subprocess.run(line, check=True, timeout=120)
