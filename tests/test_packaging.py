"""The wheel: built from the source distribution, without network, and run apart from this clone."""

from __future__ import annotations

import os
import shutil
import subprocess
import sys
import zipfile
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[1]


def copy_of_the_project(place: Path) -> Path:
    """Copy what git knows or would take, so that a left-over build folder cannot help and none is left behind."""
    listing = ["git", "ls-files", "--cached", "--others", "--exclude-standard", "-z"]
    listed = subprocess.run(listing, cwd=ROOT, capture_output=True, check=True).stdout.decode()
    for name in filter(None, listed.split("\0")):
        if (ROOT / name).is_file():
            (place / name).parent.mkdir(parents=True, exist_ok=True)
            shutil.copy(ROOT / name, place / name)
    return place


@pytest.fixture(scope="module")
def wheel(tmp_path_factory: pytest.TempPathFactory) -> Path:
    project = copy_of_the_project(tmp_path_factory.mktemp("project"))
    out = tmp_path_factory.mktemp("wheel")
    build = [sys.executable, "-m", "build", "--no-isolation", "--outdir", str(out), "."]
    done = subprocess.run(build, cwd=project, capture_output=True, text=True, timeout=60, check=False)
    assert done.returncode == 0, done.stdout + done.stderr
    (found,) = out.glob("tauledger-*.whl")
    return found


def test_the_wheel_has_every_module_and_every_file_that_is_read_as_data(wheel: Path) -> None:
    with zipfile.ZipFile(wheel) as archive:
        packed = {name for name in archive.namelist() if not name.startswith("tauledger-")}
    package = {
        f"tauledger/{path.relative_to(ROOT / 'src/tauledger')}" for path in (ROOT / "src/tauledger").rglob("*.py")
    }
    data = {"tauledger/py.typed", "tauledger/COPYING", "tauledger/report/review.schema.json"}
    scripts = ("page.js", "cursor.js")
    data |= {f"tauledger/report/{name}" for name in ("page.html.j2", "index.html.j2", "page.css", *scripts)}
    grammar = {f"tauledger/grammar/{path.name}" for path in (ROOT / "grammar").iterdir() if path.is_file()}
    assert packed == package | data | grammar


def test_the_wheel_reviews_a_board_apart_from_this_clone(wheel: Path, tmp_path: Path) -> None:
    """Installed into a folder by unpacking, as pip does, and found before this clone."""
    with zipfile.ZipFile(wheel) as archive:
        archive.extractall(tmp_path / "site")
    shutil.copy(ROOT / "fixtures" / "echo_preamp.cir", tmp_path)
    environment = {**os.environ, "PYTHONPATH": str(tmp_path / "site"), "PYTHONIOENCODING": "utf-8"}
    where = [sys.executable, "-P", "-c", "import tauledger; print(tauledger.__file__)"]
    told = subprocess.run(where, cwd=tmp_path, env=environment, capture_output=True, text=True, timeout=30, check=True)
    assert told.stdout.startswith(str(tmp_path / "site"))
    run = [sys.executable, "-P", "-m", "tauledger", "review", "echo_preamp.cir", "--verbose"]
    done = subprocess.run(run, cwd=tmp_path, env=environment, capture_output=True, text=True, timeout=60, check=False)
    assert (done.returncode, done.stderr) == (0, "")
    assert "echo_preamp.cir at 27 °C" in done.stdout
