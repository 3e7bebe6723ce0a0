"""The verb scan."""

from __future__ import annotations

import os
from collections.abc import Callable, Iterator, Mapping, Sequence
from concurrent.futures import BrokenExecutor, Executor
from contextlib import nullcontext
from typing import Any

import numpy as np

from ..assemble.window import build_window
from ..declare import Chain
from ..errors import ParameterError, SolveError
from ..observe.solution import Solution
from .fingerprint import chain_key, content_key
from .grid import Failure, Grid
from .outputs import GRID_SUFFIXES, check_writable
from .plan import Plan, make_plan
from .progress import Progress
from .provenance import provenance
from .store import Store
from .tasks import Task, results

__all__ = ["ScanInterrupted", "scan"]

_SMALLEST_BLOCK, _LARGEST_BLOCK = 1024, 8192
_LARGEST_TABLE = 2**22


class ScanInterrupted(KeyboardInterrupt):
    """A scan was stopped by Ctrl-C; what had been finished is in ``partial``.

    It is a `KeyboardInterrupt`, so a program that does not ask for it stops as usual.

    Attributes
    ----------
    partial : Grid
        The scan with NaN at the points not reached, which are masked.
    """

    def __init__(self, partial: Grid) -> None:
        reached = partial.size - int(partial.attrs["unreached"])
        super().__init__(f"stopped after {reached} of {partial.size} points; they are in .partial")
        self.partial = partial


def scan(
    chain: Chain,
    axes: Mapping[str, Any],
    read: Sequence[str | Callable[[Solution], Any]],
    *,
    executor: Executor | None = None,
    store: str | os.PathLike[str] | None = None,
    progress: Callable[[int, int], object] | bool | None = None,
    out: str | os.PathLike[str] | None = None,
) -> Grid:
    """Compute readings of an infinite chain over the outer product of some axes.

    Points where something fails are masked and recorded, and the others are kept.

    Parameters
    ----------
    chain : Chain
        Parameters that are no axis are fixed by ``chain.fix(…)``, T included, or have a default.
    axes : mapping of str to array or Axis
        One-dimensional values by parameter (or ``"T"``), in the order of the array axes.
    read : sequence of str or callable
        Readings such as ``"specific_heat"`` or ``"susceptibility(m)"``, or functions that take
        a `Solution` and return one number per point.
    executor : concurrent.futures.Executor, optional
        Computes blocks of points in parallel; it is not shut down. Other executors than
        threads need functions that can be pickled, or the extra ``cluster``.
    store : path-like, optional
        A file in which finished blocks are kept; a scan that was stopped takes them from there.
    progress : callable, bool, optional
        Function of (points done, total); by default a line on standard error if that is a terminal.
    out : path-like, optional
        Where to save the grid (``.csv``, ``.npz`` or ``.nc``), also when interrupted; checked first.

    Raises
    ------
    ParameterError
        What concerns the scan as a whole: unknown parameters or readings, missing values.
    OutputError
        ``out`` or ``store`` cannot be written.
    ScanInterrupted
        Ctrl-C; its ``.partial`` holds the finished points.
    SolveError
        The workers of an executor died; ``.partial`` holds the finished points.

    Examples
    --------
    >>> from tmsolve import Chain, axis, bond, ising, scan, site
    >>> chain = Chain(ising(), [bond(lambda s, t, J: -J*s*t), site(lambda s, h=0: -h*s)], {"m": lambda s: s})
    >>> grid = scan(chain.fix(J=1), {"T": axis("T", "0.5", 2, 4), "h": [0, 1]}, read=["mean(m)"])
    >>> grid["mean(m)"].shape
    (4, 2)
    >>> grid["mean(m)"][1].round(6).tolist()
    [0.0, 0.993434]
    """
    target = None if out is None else check_writable(out, GRID_SUFFIXES)
    plan = make_plan(chain, axes, read)
    if executor is not None and not isinstance(executor, Executor):
        raise ParameterError(
            f"executor= takes a concurrent.futures.Executor such as ThreadPoolExecutor(), got {executor!r}"
        )
    collected = _Collected(plan)
    bar = Progress(plan.size, progress)
    with nullcontext() if store is None else Store(store) as kept:
        try:
            for done in _finished(plan, collected, kept, executor):
                bar.update(done)
        except KeyboardInterrupt:
            raise ScanInterrupted(_saved(collected.grid(), target)) from None
        except BrokenExecutor as cause:
            raise SolveError(
                f"the workers of the executor died ({cause}); the points finished so far are in .partial, "
                "and store= lets a scan go on where it stopped",
                _saved(collected.grid(), target),
            ) from cause
        finally:
            bar.close()
    return _saved(collected.grid(), target)


def _saved(grid: Grid, target: Any) -> Grid:
    if target is not None:
        grid.save(target)
    return grid


class _Collected:
    """Results of a scan as they come in."""

    def __init__(self, plan: Plan) -> None:
        self.plan = plan
        self.values = np.full((len(plan.readings), plan.size), np.nan)
        self.pending = np.full((len(plan.readings), plan.size), True)
        self.failed: dict[tuple[int, str], None] = {}

    def take(self, reading: int, start: int, values: np.ndarray, failed: Sequence[tuple[int, str]]) -> None:
        """Enter one reading over one block."""
        self.values[reading, start : start + len(values)] = values
        self.pending[reading, start : start + len(values)] = False
        self.failed.update({(start + point, message): None for point, message in failed})

    def grid(self) -> Grid:
        """Return what there is."""
        plan = self.plan
        unreached = np.asarray(self.pending.any(axis=0))
        mask = unreached.copy()
        mask[[point for point, _ in self.failed]] = True
        missing = int(unreached.sum())
        attrs = {**provenance(plan.chain, plan.coords), "complete": not missing, "unreached": missing}
        units = {name: "energy" if name == "T" else "" for name in plan.coords}
        return Grid(
            tuple(plan.coords),
            {name: values.copy() for name, values in plan.coords.items()},
            {r.name: v.reshape(plan.shape).copy() for r, v in zip(plan.readings, self.values, strict=True)},
            {**units, **{r.name: r.unit for r in plan.readings}},
            {**{name: name for name in plan.coords}, **{r.name: r.latex for r in plan.readings}},
            attrs,
            tuple(self._failure(point, message) for point, message in sorted(self.failed)),
            mask.reshape(plan.shape),
        )

    def _failure(self, point: int, message: str) -> Failure:
        index = tuple(int(i) for i in np.unravel_index(point, self.plan.shape))
        coords = zip(self.plan.coords.items(), index, strict=True)
        where = {name: float(values[i]) for (name, values), i in coords}
        return Failure(index, where, message)


def _finished(plan: Plan, collected: _Collected, kept: Store | None, executor: Executor | None) -> Iterator[int]:
    """Compute what the store does not hold; yield the number of points done after every block."""
    block = min(max(plan.size // 16, _SMALLEST_BLOCK), _LARGEST_BLOCK)
    # One table of a block holds this many numbers at most: matrices of hundreds of states come in small blocks.
    block = min(block, max(1, _LARGEST_TABLE // build_window(plan.chain).nonzeros))
    starts = range(0, plan.size, block)
    base = [] if kept is None else [_reading_key(plan, i) for i in range(len(plan.readings))]
    tasks: list[Task] = []
    keys: dict[tuple[int, int], str] = {}
    for start in starts:
        values = plan.values(start, min(start + block, plan.size))
        wanted = []
        for i in range(len(plan.readings)):
            keys[start, i] = content_key(base[i], values) if kept is not None else ""
            record = None if kept is None else kept.get(keys[start, i])
            if record is None:
                wanted.append(i)
            else:
                collected.take(i, start, *record)
        if wanted:
            tasks.append((start, wanted, values))
    if not tasks:
        yield plan.size
    for (start, numbers, _), result in results(plan.chain, plan.readings, plan.sources, tasks, executor):
        for number, i in enumerate(numbers):
            record = result.values[number], result.failures_of(number)
            collected.take(i, start, *record)
            if kept is not None:
                kept.put(keys[start, i], record)
        yield plan.size - int(collected.pending.any(axis=0).sum())


def _reading_key(plan: Plan, number: int) -> str:
    source = plan.sources[number]
    return content_key(chain_key(plan.chain), source if callable(source) else plan.readings[number].name)
