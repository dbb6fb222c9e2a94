"""Where compiled kernels are kept, and that starting up does not load their compiler."""

from __future__ import annotations

import json
import os
import subprocess
import sys
import tempfile
import time
from pathlib import Path

import pytest

from app import kernel_cache
from app.kernel_cache import (
    LONGEST_UNUSED,
    VARIABLE,
    clear_kernel_cache,
    default_folder,
    prepare_kernel_cache,
)
from solver.section.kernel_version import kernel_version

ROOT = Path(__file__).resolve().parents[2]
OTHERS = ("0123456789abcdef", "fedcba9876543210", "00000000ffffffff")


@pytest.fixture(autouse=True)
def _given_back(monkeypatch):
    """Give the test run its own folder back, and let no user's setting in."""
    monkeypatch.setenv(VARIABLE, os.environ.get(VARIABLE, ""))
    monkeypatch.delenv(VARIABLE)
    if (numba := sys.modules.get("numba")) is not None:
        monkeypatch.setattr(numba.config, "CACHE_DIR", numba.config.CACHE_DIR)


@pytest.fixture
def user_folder(monkeypatch, tmp_path):
    folder = tmp_path / "cache of the user" / "halfspan"
    monkeypatch.setattr(kernel_cache.platformdirs, "user_cache_dir", lambda *_a, **_k: str(folder))
    return folder


def fresh(code: str, *arguments: str, **environment: str) -> subprocess.CompletedProcess[str]:
    """Run code where nothing has been imported yet."""
    return subprocess.run(
        [sys.executable, "-c", code, *arguments],
        capture_output=True,
        text=True,
        check=False,
        cwd=ROOT,
        env={**os.environ, "OPENBLAS_NUM_THREADS": "1", **environment},
        timeout=120,
    )


def other_version(root: Path, name: str, *, age: float, size: int = 10) -> Path:
    """Kernels of another version, last used some seconds ago."""
    folder = root / name
    (folder / "inside").mkdir(parents=True)
    (folder / "inside" / "kernel.nbc").write_bytes(b"x" * size)
    os.utime(folder, (time.time() - age,) * 2)
    return folder


def test_kernels_go_to_the_folder_of_their_version_in_the_users_cache(user_folder):
    cache = prepare_kernel_cache()
    assert cache.folder == user_folder / "kernels" / kernel_version()
    assert cache.version == kernel_version()
    assert cache.folder.is_dir()
    assert os.environ[VARIABLE] == str(cache.folder)


def test_a_second_call_and_a_process_started_later_keep_the_folder(user_folder):
    first = prepare_kernel_cache()
    assert prepare_kernel_cache() == first
    code = "from app.kernel_cache import prepare_kernel_cache as p; print(p().folder)"
    child = fresh(code)
    assert child.stderr == ""
    assert child.stdout.strip() == str(first.folder)


def test_a_folder_the_user_set_for_numba_is_kept_to(monkeypatch, tmp_path, user_folder):
    monkeypatch.setenv(VARIABLE, str(tmp_path / "own"))
    cache = prepare_kernel_cache()
    assert cache.folder == tmp_path / "own" / "halfspan" / kernel_version()
    assert not user_folder.exists()


def test_a_numba_that_is_loaded_already_is_told(monkeypatch, tmp_path):
    class Config:
        CACHE_DIR = ""

    class Numba:
        config = Config

    monkeypatch.setitem(sys.modules, "numba", Numba)
    cache = prepare_kernel_cache(tmp_path)
    assert str(cache.folder) == Config.CACHE_DIR


def test_warm_only_once_all_kernels_are_noted_as_compiled(monkeypatch, tmp_path):
    cache = prepare_kernel_cache(tmp_path)
    assert not cache.warm
    (cache.folder / "half.nbi").write_bytes(b"an index that an interrupted run left")
    assert not prepare_kernel_cache(tmp_path).warm
    cache.mark_warm()
    assert prepare_kernel_cache(tmp_path).warm
    monkeypatch.setattr(kernel_cache, "package_version", lambda _name: "0.1")
    assert not prepare_kernel_cache(tmp_path).warm  # compiled by another numba


def test_a_folder_that_cannot_be_written_gives_one_for_this_process(tmp_path, caplog):
    (tmp_path / "a file").write_text("where the folder should be")
    code = (
        "import os, sys, json\n"
        "from pathlib import Path\n"
        "from app.kernel_cache import prepare_kernel_cache as p\n"
        "cache = p(Path(sys.argv[1]))\n"
        "print(json.dumps([str(cache.folder), cache.folder.is_dir(), cache.warm,\n"
        "                  os.environ['NUMBA_CACHE_DIR'], cache.folder.parent.stat().st_mode]))\n"
    )
    child = fresh(code, str(tmp_path / "a file"))
    folder, existed, warm, told, mode = json.loads(child.stdout)
    assert Path(folder).is_relative_to(tempfile.gettempdir())
    assert (existed, warm, told) == (True, False, folder)
    if os.name == "posix":
        assert mode & 0o077 == 0  # what is found there is run: nobody else may write
    assert not Path(folder).exists()  # gone with its process
    assert "cannot be kept" in child.stderr


def test_versions_not_used_for_long_are_removed_and_nothing_else(tmp_path):
    old = other_version(tmp_path, OTHERS[0], age=LONGEST_UNUSED + 3600.0)
    recent = other_version(tmp_path, OTHERS[1], age=LONGEST_UNUSED - 3600.0)
    foreign = other_version(tmp_path, "not a version", age=9 * LONGEST_UNUSED)
    own = other_version(tmp_path, kernel_version(), age=9 * LONGEST_UNUSED)
    target = other_version(tmp_path / "elsewhere", "kept", age=9 * LONGEST_UNUSED)
    (tmp_path / OTHERS[2]).symlink_to(target, target_is_directory=True)
    prepare_kernel_cache(tmp_path)
    assert not old.exists()
    assert recent.is_dir()
    assert foreign.is_dir()
    assert (target / "inside" / "kernel.nbc").exists()
    assert (own / "inside" / "kernel.nbc").exists()
    assert own.stat().st_mtime > time.time() - LONGEST_UNUSED  # its use is noted


def test_what_other_versions_take_is_limited_the_newest_stay(monkeypatch, tmp_path):
    monkeypatch.setattr(kernel_cache, "LARGEST_CACHE", 10_000)
    newest = other_version(tmp_path, OTHERS[0], age=60.0, size=4000)
    middle = other_version(tmp_path, OTHERS[1], age=120.0, size=4000)
    oldest = other_version(tmp_path, OTHERS[2], age=180.0, size=4000)
    prepare_kernel_cache(tmp_path)
    assert (newest.exists(), middle.exists(), oldest.exists()) == (True, True, False)


def test_the_cache_can_be_cleared(tmp_path):
    other_version(tmp_path, OTHERS[0], age=0.0)
    (tmp_path / "letter.txt").write_text("not a kernel")
    prepare_kernel_cache(tmp_path)
    assert clear_kernel_cache(tmp_path) == 2
    assert [path.name for path in tmp_path.iterdir()] == ["letter.txt"]
    assert clear_kernel_cache(tmp_path / "missing") == 0


def test_default_folder_below_the_users_cache(user_folder):
    assert default_folder() == user_folder / "kernels"


def test_numba_reads_the_folder_when_it_is_loaded_afterwards(tmp_path):
    module = tmp_path / "doubling.py"
    module.write_text(
        "from numba import njit\n\n\n@njit(cache=True)\ndef twice(x):\n    return 2.0 * x\n"
    )
    code = (
        "import sys\n"
        "from pathlib import Path\n"
        "from app.kernel_cache import prepare_kernel_cache\n"
        "cache = prepare_kernel_cache(Path(sys.argv[1]))\n"
        "assert 'numba' not in sys.modules, 'numba is loaded too early'\n"
        "sys.path.insert(0, sys.argv[2])\n"
        "from doubling import twice\n"
        "assert twice(1.5) == 3.0\n"
        "print(sum(twice.stats.cache_hits.values()))\n"
        "assert list(cache.folder.rglob('*.nbi')), 'nothing is kept there'\n"
    )
    arguments = (str(tmp_path / "kernels"), str(tmp_path))
    first, second = fresh(code, *arguments), fresh(code, *arguments)
    assert (first.stderr, second.stderr) == ("", "")
    assert (first.stdout.strip(), second.stdout.strip()) == ("0", "1")


def test_nothing_but_the_kernels_loads_numba():
    code = (
        "import importlib, pkgutil, sys\n"
        "import app, solver\n"
        "names = [m.name for package in (app, solver)\n"
        "         for m in pkgutil.walk_packages(package.__path__, package.__name__ + '.')]\n"
        "kernels = ('solver.section.boundary_layer', 'solver.section.kernels')\n"
        "wanted = [name for name in names\n"
        "          if not name.startswith(kernels) and not name.endswith('__main__')]\n"
        "for needed in ('app.cli', 'app.notebook', 'solver.section.geometry'):\n"
        "    assert needed in wanted\n"
        "for name in wanted:\n"
        "    importlib.import_module(name)\n"
        "    assert 'numba' not in sys.modules, f'{name} loads numba'\n"
    )
    imported = fresh(code)
    assert imported.stderr == ""
    assert imported.returncode == 0
