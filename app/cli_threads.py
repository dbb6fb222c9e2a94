"""The linear algebra of the ``halfspan`` command on one thread."""

from __future__ import annotations

import os


def pin_threads() -> None:
    """Keep the linear algebra on one thread: small systems only lose by more.

    Takes effect for libraries loaded afterwards; :func:`pin_loaded` sees to
    those that ask differently.
    """
    for library in ("OPENBLAS", "OMP", "MKL", "VECLIB_MAXIMUM", "BLIS", "NUMEXPR"):
        os.environ[f"{library}_NUM_THREADS"] = "1"


def pin_loaded() -> None:
    """Hold the libraries that are loaded already to one thread."""
    from threadpoolctl import threadpool_limits  # type: ignore[import-untyped]

    threadpool_limits(limits=1, user_api="blas")
