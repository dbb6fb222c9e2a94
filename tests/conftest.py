"""What every test may rely on: one folder of compiled kernels for all workers."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from app.file_lock import locked
from app.kernel_cache import KernelCache, prepare_kernel_cache

_CACHE = pytest.StashKey[KernelCache]()


def pytest_configure(config: pytest.Config) -> None:
    """Keep kernels in pytest's own cache, in every worker and in what a test starts."""
    folder = getattr(config, "cache", None)
    root = None if folder is None else Path(folder.mkdir("kernels"))
    config.stash[_CACHE] = prepare_kernel_cache(root)


@pytest.fixture(scope="session")
def compiled_kernels(pytestconfig: pytest.Config) -> KernelCache:
    """Kernels of the section solver, compiled by one worker while the others wait."""
    root = pytestconfig.stash[_CACHE].folder.parent
    with locked(root / ".compiling"):
        cache = prepare_kernel_cache(root)
        if not cache.warm:
            from solver.section.flow import FlowSettings, section_flow
            from solver.section.geometry import naca_outline

            angle, reynolds = np.radians([1.0, 2.0]), np.array([2e5, 3e5])
            section_flow(
                naca_outline("2412"), angle=angle, reynolds=reynolds, settings=FlowSettings()
            )
            cache.mark_warm()
    return cache
