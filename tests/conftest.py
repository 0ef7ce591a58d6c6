"""What tests of every kind share."""

import os
import shutil

import pytest


@pytest.fixture(scope="session")
def gmsh_missing():
    """The install line if gmsh cannot be loaded on this machine, else an empty string."""
    from bemwave.geometry.mesher import library_missing

    return library_missing()


@pytest.fixture
def needs_gmsh(gmsh_missing):
    """For tests that mesh with gmsh: skipped without its system libraries, a failure in CI."""
    if gmsh_missing and os.environ.get("CI"):
        pytest.fail(gmsh_missing)
    if gmsh_missing:
        pytest.skip(gmsh_missing)


@pytest.fixture(scope="session")
def needs_browser():
    """For tests of the page in a browser: skipped without Chromium, a failure in CI."""
    missing = [name for name in ("chromium", "chromedriver") if shutil.which(name) is None]
    told = (
        f"{' and '.join(missing)} not found; on Debian: "
        "apt-get install -y --no-install-recommends chromium chromium-driver"
    )
    if missing and os.environ.get("CI"):
        pytest.fail(told)
    if missing:
        pytest.skip(told)
