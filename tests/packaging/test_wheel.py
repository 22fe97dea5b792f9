"""The program as a user gets it: built into a wheel, installed in an environment of its own, started there."""

import email
import os
import subprocess
import sys
import sysconfig
import tarfile
import venv
import zipfile
from pathlib import Path

import pytest

from tests.paths import TOP, needs_command_line
from worksheet import __version__

CARRIED = ("themes", "sample_projects")


def _run(*command: str | Path, folder: Path) -> str:
    clean = {name: value for name, value in os.environ.items() if not name.startswith("PYTHON")}
    done = subprocess.run(
        command, cwd=folder, env=clean, capture_output=True, text=True, check=False, stdin=subprocess.DEVNULL
    )
    assert done.returncode == 0, done.stdout + done.stderr
    return done.stdout


def _build(kind: str, folder: Path) -> Path:
    # The backend itself, without isolation: the test needs no network.
    _run(sys.executable, "-m", "hatchling", "build", "-t", kind, "-d", folder, folder=TOP)
    (built,) = folder.iterdir()
    return built


@pytest.fixture(scope="module")
def wheel(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A wheel of the working tree."""
    return _build("wheel", tmp_path_factory.mktemp("wheel"))


@pytest.fixture(scope="module")
def installed(wheel: Path, tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Folder of programs of an environment that holds the wheel, and sees the libraries of this one."""
    home = tmp_path_factory.mktemp("environment")
    venv.create(home, with_pip=False)
    python = home / "bin" / "python"
    _run(
        sys.executable, "-m", "pip", "--python", python, "install", "-q", "--no-deps", "--no-index", wheel, folder=home
    )
    purelib = _run(python, "-c", "import sysconfig; print(sysconfig.get_path('purelib'))", folder=home).strip()
    # A line in a .pth file adds the folder alone and not what its own .pth files add, so the checkout that may
    # be installed there in editable form stays out of sight.
    libraries = dict.fromkeys((sysconfig.get_path("purelib"), sysconfig.get_path("platlib")))
    Path(purelib, "libraries.pth").write_text("\n".join(libraries) + "\n", "utf-8")
    return home / "bin"


def _own_files(name: str) -> dict[str, bytes]:
    paths = [path for path in (TOP / name).rglob("*") if path.is_file() and "__pycache__" not in path.parts]
    return {path.relative_to(TOP).as_posix(): path.read_bytes() for path in paths}


def test_wheel_carries_code_and_data_and_nothing_else(wheel: Path) -> None:
    with zipfile.ZipFile(wheel) as archive:
        held = {name: archive.read(name) for name in archive.namelist() if not name.endswith("/")}
    assert {name.partition("/")[0] for name in held} == {"worksheet", f"biasbook-{__version__}.dist-info"}
    assert "worksheet/py.typed" in held
    for folder in CARRIED:
        expected = {f"worksheet/_data/{name}": content for name, content in _own_files(folder).items()}
        assert expected
        assert {name: data for name, data in held.items() if name.startswith(f"worksheet/_data/{folder}/")} == expected
    code = {name: content for name, content in _own_files("worksheet").items() if "_data" not in name}
    assert {name: data for name, data in held.items() if name in code} == code


def test_wheel_says_what_it_needs(wheel: Path) -> None:
    with zipfile.ZipFile(wheel) as archive:
        metadata = email.message_from_bytes(archive.read(f"biasbook-{__version__}.dist-info/METADATA"))
        scripts = archive.read(f"biasbook-{__version__}.dist-info/entry_points.txt").decode()
    assert metadata["Requires-Python"] == ">=3.11"
    needed = [line for line in metadata.get_all("Requires-Dist", []) if "extra ==" not in line]
    assert "textual<8.3,>=8.2" in needed
    assert not [line for line in needed if "<" in line and not line.startswith("textual")]
    assert "biasbook = worksheet.cli.main:entry" in scripts


def test_sdist_carries_what_a_build_and_a_test_run_need(tmp_path: Path) -> None:
    with tarfile.open(_build("sdist", tmp_path)) as archive:
        held = {name.partition("/")[2] for name in archive.getnames()}
    needed = {"README.md", "DEVELOPERS.md", "pyproject.toml", ".ci/run", "tests/conftest.py", "worksheet/py.typed"}
    assert needed <= held
    for folder in CARRIED:
        assert set(_own_files(folder)) <= held


def test_installed_program_finds_its_data(installed: Path, tmp_path: Path) -> None:
    code = "from worksheet.model.resources import data_folder as f; import worksheet; print(worksheet.__file__)"
    code += "; print(f('themes')); print(f('sample_projects'))"
    where, *folders = _run(installed / "python", "-c", code, folder=tmp_path).splitlines()
    package = Path(where).parent
    assert package.is_relative_to(installed.parent)
    assert folders == [str(package / "_data" / name) for name in CARRIED]


@needs_command_line
def test_installed_program_starts_a_project_and_reads_it(installed: Path, tmp_path: Path) -> None:
    assert "review" in _run(installed / "biasbook", "--help", folder=tmp_path)
    _run(installed / "biasbook", "start", tmp_path / "project", folder=tmp_path)
    assert (tmp_path / "project" / "biasbook.toml").is_file()
    assert "source-follower" in _run(installed / "biasbook", "stages", folder=tmp_path)
