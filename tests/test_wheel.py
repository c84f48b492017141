"""The wheel holds what the checkout holds: the sample sites are read from it, with no checkout in sight."""

from __future__ import annotations

import json
import subprocess
import sys
from hashlib import sha256
from pathlib import Path

import pytest

from sample_sites.catalogue import SAMPLE_SITES

ROOT = Path(__file__).resolve().parents[1]
PIP = [sys.executable, "-m", "pip", "--disable-pip-version-check", "--quiet"]
READ_SAMPLE_SITES = """
import json, sys
sys.path.insert(0, sys.argv[1])
from hashlib import sha256
from sample_sites import catalogue
read = {site.name: {name: sha256(content).hexdigest() for name, content in site.files().items()}
        for site in catalogue.SAMPLE_SITES}
json.dump({"module": catalogue.__file__, "sites": read}, sys.stdout)
"""


def run(*command: str, cwd: Path) -> str:
    """Standard output of a command that must succeed; what it complained about is in the failure."""
    done = subprocess.run(command, cwd=cwd, capture_output=True, text=True, check=False)
    assert done.returncode == 0, done.stderr
    return done.stdout


@pytest.fixture(scope="module")
def installed(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A folder into which a freshly built wheel was installed, without network."""
    built = tmp_path_factory.mktemp("wheel")
    run(
        *PIP,
        "wheel",
        "--no-index",
        "--no-deps",
        "--no-build-isolation",
        "--wheel-dir",
        str(built),
        str(ROOT),
        cwd=built,
    )
    (wheel,) = built.glob("ohmwalk-*.whl")
    target = tmp_path_factory.mktemp("installed")
    run(*PIP, "install", "--no-index", "--no-deps", "--target", str(target), str(wheel), cwd=target)
    return target


def test_sample_sites_from_the_wheel_equal_the_checkouts(installed: Path, tmp_path: Path) -> None:
    # -I -S: neither the working folder nor site-packages, where the checkout may be installed as editable
    read = json.loads(run(sys.executable, "-I", "-S", "-c", READ_SAMPLE_SITES, str(installed), cwd=tmp_path))
    assert Path(read["module"]).is_relative_to(installed)
    expected = {
        site.name: {
            path.name: sha256(path.read_bytes()).hexdigest()
            for path in (ROOT / "sample_sites" / site.folder_name).iterdir()
            if path.name != "expected.toml"
        }
        for site in SAMPLE_SITES
    }
    assert read["sites"] == expected


def test_wheel_holds_every_data_file_of_the_packages(installed: Path) -> None:
    for package in ("audit", "rules", "db", "sample_sites"):
        for path in (ROOT / package).rglob("*"):
            if path.is_file() and path.suffix != ".pyc":
                assert (installed / path.relative_to(ROOT)).read_bytes() == path.read_bytes()


def test_nothing_but_the_packages_is_installed(installed: Path) -> None:
    names = {entry.name for entry in installed.iterdir() if not entry.name.endswith(".dist-info")}
    assert names == {"audit", "rules", "db", "sample_sites", "bin"}
