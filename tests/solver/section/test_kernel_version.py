"""The kernels' version: changed by whatever changes what is compiled, and by nothing else."""

from __future__ import annotations

import re
import shutil
from pathlib import Path

import pytest

from solver.section import kernel_version as module
from solver.section.kernel_version import (
    KERNEL_SOURCES,
    SECTION_SOURCES,
    kernel_version,
    section_version,
    version_of,
)

SECTION = Path(module.__file__).parent


@pytest.fixture
def sources(tmp_path):
    """A copy of the section solver with a kernel of each kind, to be edited."""
    folder = tmp_path / "section"
    shutil.copytree(SECTION, folder, ignore=shutil.ignore_patterns("__pycache__"))
    for name in ("panelling.py", "potential_flow.py", "boundary_layer/deep/inner.py"):
        path = folder / name
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_bytes(b"VALUE = 1.0\n")
    return folder


def test_a_copy_has_the_version_of_this_installation(tmp_path):
    folder = tmp_path / "elsewhere"
    shutil.copytree(SECTION, folder, ignore=shutil.ignore_patterns("__pycache__"))
    assert version_of(folder) == kernel_version()
    assert re.fullmatch("[0-9a-f]{16}", kernel_version())


def test_an_edit_of_any_kernel_source_changes_it(sources):
    kernels = sorted({path for pattern in KERNEL_SOURCES for path in sources.glob(pattern)})
    assert len(kernels) >= 3
    seen = {version_of(sources)}
    for path in kernels:
        path.write_bytes(path.read_bytes() + b"\n# one more line\n")
        seen.add(version_of(sources))
    assert len(seen) == len(kernels) + 1


def test_a_kernel_source_that_comes_goes_or_is_renamed_changes_it(sources):
    inner = sources / "boundary_layer/deep/inner.py"
    before = version_of(sources)
    moved = inner.rename(inner.with_name("other.py"))
    renamed = version_of(sources)
    moved.unlink()
    gone = version_of(sources)
    assert len({before, renamed, gone}) == 3


def test_what_one_file_loses_and_another_gains_is_a_change(sources):
    first, second = sources / "panelling.py", sources / "potential_flow.py"
    first.write_bytes(b"A = 1\nB = 2\n")
    second.write_bytes(b"C = 3\n")
    before = version_of(sources)
    first.write_bytes(b"A = 1\n")
    second.write_bytes(b"B = 2\nC = 3\n")
    assert version_of(sources) != before


def test_other_files_and_line_ends_do_not_change_it(sources):
    before = version_of(sources)
    (sources / "geometry.py").write_text("nothing to do with kernels\n")
    (sources / "boundary_layer/__pycache__").mkdir()
    (sources / "boundary_layer/__pycache__/inner.cpython-311.pyc").write_bytes(b"compiled")
    (sources / "panelling.py").write_bytes(b"VALUE = 1.0\r\n")
    assert version_of(sources) == before


def test_the_section_s_version_follows_what_no_kernel_is_made_of(sources):
    kernels, section = version_of(sources), version_of(sources, SECTION_SOURCES)
    fairing = sources / "fairing.py"
    fairing.write_bytes(fairing.read_bytes() + b"\n# one more line\n")
    assert version_of(sources) == kernels
    assert version_of(sources, SECTION_SOURCES) != section
    assert section_version() != kernel_version()
