"""How the kernels are compiled.

In four ways, which differ in what a kernel costs and not in what it gives:

=================== ======================== ======================= ==================
decorator           for functions that       called from             kept on disk
=================== ======================== ======================= ==================
`compiled`          make arrays              Python, kernels         yes
`compiled_in_place` fill arrays they get     Python, kernels         yes
`compiled_part`     fill arrays they get     kernels, several places with its callers
`inlined`           do anything              kernels, one place      with its caller
=================== ======================== ======================= ==================

An array that a function gets is counted as one more user of it, and one less at the end:
for the small functions of a cell that is a third of their time. Functions that make no
arrays go without, since their callers hold what they are given.

The compiler optimizes a function afresh within every one that calls it, directly or not:
with steps in steps that takes most of its time and memory. Steps with one caller are
written out within it before it sets to work.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any, TypeVar, cast

import numba
import numpy as np

Function = TypeVar("Function", bound=Callable[..., object])
Constant = TypeVar("Constant", int, bool)

_COMMON: dict[str, Any] = {"nogil": True, "error_model": "numpy"}
"""Other threads run meanwhile; a division by zero gives infinity, as it does in numpy."""
_IN_PLACE: dict[str, Any] = {"_nrt": False}
"""Without numba's runtime, which counts users of arrays. A function that makes an array
is refused with it."""
_INSIDE: dict[str, Any] = {"no_cpython_wrapper": True, "no_cfunc_wrapper": True}
"""Without entrances from Python and C."""

_whole: Callable[[Any], Any] = numba.njit(cache=True, **_COMMON)
_in_place: Callable[[Any], Any] = numba.njit(cache=True, **_IN_PLACE, **_COMMON)
_part: Callable[[Any], Any] = numba.njit(**_INSIDE, **_IN_PLACE, **_COMMON)
_inline: Callable[[Any], Any] = numba.njit(inline="always", **_COMMON)


def compiled(function: Function) -> Function:
    """Compile a function on its first call, and keep what comes out on disk.

    Parameters
    ----------
    function : callable
        Of numbers, arrays and named tuples of them.

    Returns
    -------
    callable
        The same to its callers, Python's or compiled ones.
    """
    return cast(Function, _whole(function))


def compiled_in_place(function: Function) -> Function:
    """Compile a function that makes no arrays, and keep what comes out on disk.

    Parameters
    ----------
    function : callable
        It may take views of arrays that it is given, and return none.

    Returns
    -------
    callable
        The same to its callers, Python's or compiled ones.
    """
    return cast(Function, _in_place(function))


def compiled_part(function: Function) -> Function:
    """Compile a function that makes no arrays and that only compiled ones call.

    Parameters
    ----------
    function : callable
        It may take views of arrays that it is given, and return none.

    Returns
    -------
    callable
        The same to compiled callers. It cannot be called from Python.
    """
    return cast(Function, _part(function))


def inlined(function: Function) -> Function:
    """Compile a function within the one place that calls it.

    Parameters
    ----------
    function : callable
        A step of another one, with a name of its own for the reader's sake.

    Returns
    -------
    callable
        The same to compiled callers.
    """
    return cast(Function, _inline(function))


def of_one_type(value: Constant) -> Constant:
    """Hide the value of a constant from the compiler.

    Parameters
    ----------
    value : int or bool
        To be passed from one compiled function to another.

    Returns
    -------
    int or bool
        The same, of numpy's type. For every plain constant that a function is called
        with the compiler would make it once more.
    """
    return cast(Constant, np.asarray(value)[()])
