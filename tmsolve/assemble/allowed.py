"""How many entries of the transfer matrix can differ from zero."""

from __future__ import annotations

import numpy as np

from ..declare import Chain, Term
from ..tabulate.affine import affine_table
from .window import build_window

__all__ = ["allowed_entries"]


def allowed_entries(chain: Chain) -> int:
    """Count the entries that neither the cut nor an outright forbidden configuration removes.

    Examples
    --------
    >>> import math
    >>> from tmsolve.declare import Chain, bond, occupation
    >>> allowed_entries(Chain(occupation(), [bond(lambda s, t: math.inf if s and t else 0)]))
    3
    """
    window = build_window(chain)
    shape = [window.sizes[site] for site in window.sites]
    if window.interior:
        return window.nonzeros
    allowed = np.ones(shape, dtype=bool)
    for factor in window.factors:
        term = factor.source
        if isinstance(term, Term) and term.role == "energy":
            affine = affine_table(term, [chain.cell[kind] for kind, _ in term.places if kind])
            if affine is not None:
                finite = np.array([c != float("inf") for c in affine.constant.ravel()]).reshape(affine.constant.shape)
                axes = [window.sites.index(site) for site in factor.sites]
                allowed &= np.expand_dims(
                    finite.transpose(np.argsort(axes)), [i for i in range(len(shape)) if i not in axes]
                )
    return int(allowed.sum())
