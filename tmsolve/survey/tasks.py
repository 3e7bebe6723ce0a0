"""Blocks as tasks of any executor of `concurrent.futures`: threads, processes, clusters."""

from __future__ import annotations

import os
import pickle
import sys
import sysconfig
from collections.abc import Callable, Iterator, Mapping, Sequence
from concurrent.futures import FIRST_COMPLETED, Executor, Future, ThreadPoolExecutor, wait
from functools import lru_cache
from types import FunctionType
from typing import Any

import numpy as np

from .._optional import require
from ..declare import Chain
from ..errors import MissingExtra, ParameterError
from ..observe.readings import Reading
from .blocks import BlockResult, compute_block

__all__ = ["Task", "results"]

#: A block: its number, the readings wanted, the scanned parameters.
Task = tuple[int, Sequence[int], Mapping[str, np.ndarray]]


def results(
    chain: Chain,
    readings: Sequence[Reading],
    sources: Sequence[Any],
    tasks: Sequence[Task],
    executor: Executor | None,
) -> Iterator[tuple[Task, BlockResult]]:
    """Yield tasks with their results as they are finished.

    Parameters
    ----------
    readings, sources : sequence
        The readings, and what they were made of: names or callables.
    """

    def here(wanted: Sequence[int], values: Mapping[str, np.ndarray]) -> BlockResult:
        return compute_block(chain, [readings[i] for i in wanted], values)

    if executor is None:
        for task in tasks:
            yield task, here(*task[1:])
    elif isinstance(executor, ThreadPoolExecutor):
        yield from _windowed(executor, tasks, lambda task: executor.submit(here, *task[1:]))
    else:
        cargo = _pack(chain, sources)
        yield from _windowed(executor, tasks, lambda task: executor.submit(_elsewhere, cargo, *task[1:]))


def _windowed(
    executor: Executor, tasks: Sequence[Task], submit: Callable[[Task], Future[BlockResult]]
) -> Iterator[tuple[Task, BlockResult]]:
    # Few tasks are queued at a time, so that an interrupt has little to wait for.
    workers = getattr(executor, "_max_workers", None) or os.cpu_count() or 1
    waiting = list(reversed(tasks))
    running: dict[Future[BlockResult], Task] = {}
    try:
        while waiting or running:
            while waiting and len(running) < 4 * workers:
                task = waiting.pop()
                running[submit(task)] = task
            for future in wait(running, return_when=FIRST_COMPLETED).done:
                yield running[future], future.result()
                del running[future]
    finally:
        for future in running:
            future.cancel()


def _elsewhere(cargo: bytes, wanted: Sequence[int], values: Mapping[str, np.ndarray]) -> BlockResult:
    """Compute a block in another process."""
    chain, readings = _unpack(cargo)
    return compute_block(chain, [readings[i] for i in wanted], values)


@lru_cache(maxsize=4)
def _unpack(cargo: bytes) -> tuple[Chain, list[Reading]]:
    from ..observe.readings import parse_reading

    (cell, terms, observables, name, fixed), sources = pickle.loads(cargo)
    chain = Chain(cell, terms, observables, name=name).fix(**fixed)
    return chain, [parse_reading(source, chain) for source in sources]


def _pack(chain: Chain, sources: Sequence[Any]) -> bytes:
    """Pickle a chain; functions travel by value, since another process need not find their file."""
    parts = dict(chain.cell), chain.terms, dict(chain.observables), chain.name, dict(chain.fixed)
    functions = [term.function for term in chain.terms]
    functions += [term.function for terms in chain.observables.values() for term in terms]
    functions += [source for source in sources if callable(source)]
    try:
        cloudpickle = require("cloudpickle", extra="cluster")
    except MissingExtra as error:
        if all(_importable(function) for function in functions):
            return pickle.dumps((parts, list(sources)))
        name = next(f.__name__ for f in functions if not _importable(f))
        raise MissingExtra(
            f"the function {name} cannot be sent to another process as it is; {error}; "
            "or use concurrent.futures.ThreadPoolExecutor"
        ) from error
    modules = {sys.modules[f.__module__] for f in functions if _by_value(f)}
    for module in modules:
        cloudpickle.register_pickle_by_value(module)
    try:
        return bytes(cloudpickle.dumps((parts, list(sources))))
    except (pickle.PicklingError, TypeError, AttributeError) as cause:
        raise ParameterError(
            f"the chain cannot be sent to another process: {cause}; use concurrent.futures.ThreadPoolExecutor"
        ) from cause
    finally:
        for module in modules:
            cloudpickle.unregister_pickle_by_value(module)


def _importable(function: Any) -> bool:
    """Whether another process finds a function under its name in an installed library."""
    return "<" not in getattr(function, "__qualname__", "<") and not _by_value(function)


def _by_value(function: Any) -> bool:
    """Whether a function comes from a file of the user's, not from an installed library."""
    module = sys.modules.get(getattr(function, "__module__", "") or "")
    file = getattr(module, "__file__", None)
    if not isinstance(function, FunctionType) or module is None or module.__name__ == "__main__" or file is None:
        return False
    libraries = {sysconfig.get_path(kind) for kind in ("stdlib", "platstdlib", "purelib", "platlib")}
    return not any(os.path.abspath(file).startswith(path + os.sep) for path in libraries)
