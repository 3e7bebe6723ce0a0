"""Equitable partitions: classes of states that a table of labels cannot tell apart by counting.

A table of n × n labels is a complete directed graph whose edges have colours. Counting the
labels between states and classes, and splitting classes whose members count differently,
ends with the coarsest partition that counting cannot refine.
"""

from __future__ import annotations

import numpy as np

__all__ = ["checked", "class_members", "equitable", "hashed", "interned", "is_equitable", "mixed", "ranked", "refined"]

def equitable(table: np.ndarray, colours: np.ndarray | None = None) -> np.ndarray:
    """Return the coarsest equitable partition of the states of a table of labels.

    States i and j are in one class when they have the same colour and the same label
    ``table[i, i]``, and for every class C and label w the numbers of k ∈ C with
    ``table[i, k] == w`` (row) and with ``table[k, i] == w`` (column) agree. Both directions are
    always asked for. Then the sum of a function of the labels over a class of columns is the same
    in all rows of a class, and likewise for the transpose: the quotient matrices of both are well
    defined. Every orbit of a symmetry of the table lies in one class; the converse does not hold.

    Parameters
    ----------
    table : ndarray of int, shape (n, n)
        Labels; equal weights have equal labels (`interned` makes them from numbers).
    colours : ndarray of int, shape (n,), optional
        Classes that must not be joined.

    Returns
    -------
    ndarray of int, shape (n,)
        Class numbers in order of first appearance, so that class 0 holds state 0.

    Raises
    ------
    ValueError
        Not a square table of integers, or not one colour per state.
    ArithmeticError
        Every hash function tried collided, for which no table is known.

    Notes
    -----
    Counts are compared through sums of pseudo-random numbers mod 2⁶⁴. Numbers that collide leave
    a partition too coarse, which the exact count of `is_equitable` at the end discovers; the
    refinement then goes on with other numbers.

    Examples
    --------
    A ring of four states, and the same with state 0 singled out:

    >>> ring = np.array([[0, 1, 2, 1], [1, 0, 1, 2], [2, 1, 0, 1], [1, 2, 1, 0]])
    >>> equitable(ring).tolist()
    [0, 0, 0, 0]
    >>> equitable(ring, np.array([1, 0, 0, 0])).tolist()
    [0, 1, 2, 1]
    """
    labels = checked(table)
    n = len(labels)
    if colours is None:
        classes = np.zeros(n, dtype=np.intp)
    else:
        colours = np.asarray(colours)
        if colours.shape != (n,) or colours.dtype.kind not in "iu":
            raise ValueError(
                f"colours must be {n} integers, one per state of the table, "
                f"got {colours.dtype} of shape {colours.shape}"
            )
        classes = ranked(colours)
    if n == 0:
        return classes
    classes = _common(classes, ranked(labels.diagonal()))
    for attempt in range(64):
        classes = refined(hashed(labels, attempt), classes, attempt)
        if is_equitable(labels, classes):
            return classes
    raise ArithmeticError("colour refinement did not become equitable: 64 independent hash functions collided")


def interned(matrix: np.ndarray) -> np.ndarray:
    """Give equal numbers equal labels 0, 1, …, in increasing order of the numbers.

    Examples
    --------
    >>> interned(np.array([[0.5, -1.0], [-1.0, 0.5]])).tolist()
    [[1, 0], [0, 1]]
    """
    _, labels = np.unique(matrix, return_inverse=True)
    return labels.reshape(np.shape(matrix))


def ranked(values: np.ndarray) -> np.ndarray:
    """Renumber classes in order of first appearance.

    Examples
    --------
    >>> ranked(np.array([7, 3, 7, 0])).tolist()
    [0, 1, 0, 2]
    """
    _, first, inverse = np.unique(values, return_index=True, return_inverse=True)
    rank = np.empty(len(first), dtype=np.intp)
    rank[np.argsort(first)] = np.arange(len(first))
    return rank[inverse.ravel()]


def class_members(classes: np.ndarray) -> list[np.ndarray]:
    """Return the states of each class, in increasing order.

    Examples
    --------
    >>> [part.tolist() for part in class_members(np.array([0, 1, 0, 2]))]
    [[0, 2], [1], [3]]
    """
    order = np.argsort(classes, kind="stable")
    return np.split(order, np.flatnonzero(np.diff(classes[order])) + 1) if len(classes) else []


def is_equitable(table: np.ndarray, classes: np.ndarray) -> bool:
    """Whether no class can be split by counting labels; exact.

    Parameters
    ----------
    table : ndarray of int, shape (n, n)
        Labels.
    classes : ndarray of int, shape (n,)
        Class numbers.

    Examples
    --------
    >>> is_equitable(np.array([[0, 1], [2, 0]]), np.array([0, 0]))
    False
    """
    labels = checked(table)
    classes = ranked(np.asarray(classes))
    _, first = np.unique(classes, return_index=True)
    representative = first[classes]
    if not np.array_equal(labels.diagonal(), labels.diagonal()[representative]):
        return False
    narrow: type[np.signedinteger] = np.int32 if (labels.max(initial=0) + 1) * len(first) < 2**31 else np.int64
    codes = labels.astype(narrow) * narrow(len(first))
    return all(_same_counts(way + classes.astype(narrow), representative) for way in (codes, codes.T))


def _same_counts(codes: np.ndarray, representative: np.ndarray) -> bool:
    """Whether each row holds the same codes, equally often, as the row that represents it."""
    ordered = np.ascontiguousarray(codes)
    ordered.sort(axis=1)
    return bool(np.array_equal(ordered, ordered[representative]))


def hashed(labels: np.ndarray, seed: int = 0) -> np.ndarray:
    """Replace labels by pseudo-random 64-bit numbers, the same for the same label."""
    return mixed(np.arange(int(labels.max(initial=0)) + 1), 3 * seed)[labels]


def refined(numbers: np.ndarray, classes: np.ndarray, seed: int = 0) -> np.ndarray:
    """Split classes by hashed counts until none splits any more.

    Parameters
    ----------
    numbers : ndarray of uint64, shape (n, n)
        From `hashed`.
    classes : ndarray of int, shape (n,)
        Class numbers below n.
    seed : int
        Chooses the numbers that stand for the classes.
    """
    n = len(numbers)
    row, column = mixed(np.arange(n), 3 * seed + 1), mixed(np.arange(n), 3 * seed + 2)
    count = int(classes.max(initial=-1)) + 1
    while count < n:
        # Σ_k R(label) C(class): two rows with different counts agree with probability about 2⁻⁵⁴.
        signature = np.einsum("ij,j->i", numbers, row[classes]) + np.einsum("ij,i->j", numbers, column[classes])
        classes = _common(classes, signature)
        more = int(classes.max()) + 1
        if more == count:
            break
        count = more
    return classes


def _common(classes: np.ndarray, values: np.ndarray) -> np.ndarray:
    """Return the classes of states that agree in both, in order of first appearance."""
    order = np.lexsort((values, classes))
    new = (np.diff(classes[order]) != 0) | (np.diff(values[order]) != 0)
    joint = np.empty(len(classes), dtype=np.intp)
    joint[order] = np.concatenate([[0], np.cumsum(new)])
    return ranked(joint)


def mixed(numbers: np.ndarray, seed: int) -> np.ndarray:
    """Return well scattered 64-bit numbers (the finaliser of splitmix64).

    G. L. Steele, D. Lea and C. H. Flood, OOPSLA 2014, 453; constants from memory.
    """
    x = numbers.astype(np.uint64) + np.uint64(1) + (np.uint64(seed + 1) << np.uint64(40))
    x *= np.uint64(0x9E3779B97F4A7C15)
    for shift, factor in ((30, 0xBF58476D1CE4E5B9), (27, 0x94D049BB133111EB)):
        x = (x ^ (x >> np.uint64(shift))) * np.uint64(factor)
    return x ^ (x >> np.uint64(31))


def checked(table: np.ndarray) -> np.ndarray:
    """Return a square table with labels that are small and not negative."""
    labels = np.asarray(table)
    if labels.ndim != 2 or labels.shape[0] != labels.shape[1] or labels.dtype.kind not in "iu":
        raise ValueError(
            f"the table must hold n x n integer labels, got {labels.dtype} of shape {labels.shape}; "
            "interned(matrix) makes labels from numbers"
        )
    small = labels.size == 0 or (labels.min() >= 0 and labels.max() < 4 * labels.size)
    return labels.astype(np.int64, copy=False) if small else interned(labels)
