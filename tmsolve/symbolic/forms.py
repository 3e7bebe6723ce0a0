"""The verb `closed_form`: from a chain to its formulas within a time limit."""

from __future__ import annotations

from ..declare.chain import Chain
from ..errors import SolveError, TooLargeError
from ..tabulate.colours import numbers_of_colours
from .arguments import positive_seconds
from .closed import ClosedForm
from .colours.check import colour_mismatch
from .colours.matrix import ColourMatrix, colour_matrix
from .deadline import Clock, TimeUp, limited
from .matrix import SymbolicMatrix, symbolic_matrix
from .perron import ordered_eigenvalues, perron_of
from .report import reason
from .spectrum import solve_spectrum
from .verify import mismatch

__all__ = ["ClosedForm", "closed_form"]

#: Part of the time limit that writing the matrix down may take.
_ASSEMBLY = 0.6


def closed_form(chain: Chain, *, time_limit: float = 30) -> ClosedForm:
    """Derive the eigenvalues of a chain's transfer matrix and what follows from them as formulas.

    Boltzmann factors become positive symbols, the matrix is split by the permutations that
    leave it unchanged, and the characteristic polynomials of the blocks are factored; factors
    of degree 1 and 2 (3 where all eigenvalues are real) are solved. Every closed form is
    compared with the matrix at random rational points before it is returned. Where there is
    none, or the time runs out, the factored polynomial and the recurrence of Z_N remain.

    With ``colours("q")`` everything is a function of the positive symbol q, multiplicities too.
    Z_N holds for every whole q; eigenvalues and what follows from single ones hold from the q on
    that the text of the form names, below which some of them are not there.

    Parameters
    ----------
    chain : Chain
        Parameters fixed by ``chain.fix`` enter as exact numbers, the others as symbols.
    time_limit : float
        Seconds, for the derivation and for each later question to the result.

    Raises
    ------
    DeclarationError
        An energy branches on a free parameter or is not exact.
    TooLargeError
        The matrix itself cannot be written down in time.

    Examples
    --------
    >>> from tmsolve import Chain, bond, closed_form, ising
    >>> form = closed_form(Chain(ising(), [bond(lambda s, t, J: -J*s*t)]))
    >>> print(form.free_energy)
    -log(2*cosh(J*beta))/beta
    >>> form.partition_function(3)
    2*exp(3*J*beta) + 6*exp(-J*beta)

    The number of colours may be a symbol:

    >>> from tmsolve import colours
    >>> potts = Chain(colours("q"), [bond(lambda s, t, J: -J*(s == t))])
    >>> closed_form(potts).partition_function()
    (q - 1)*(exp(J*beta) - 1)**N + (q + exp(J*beta) - 1)**N
    """
    clock = Clock(positive_seconds(time_limit))
    try:
        matrix = limited(clock.share(_ASSEMBLY), _matrix, chain)
    except TimeUp:
        raise TooLargeError(
            f"the symbolic transfer matrix was not assembled within the time limit of {time_limit:g} s; "
            "use solve(chain.at(…)) for numbers, or give a longer time_limit"
        ) from None
    spectrum = solve_spectrum(matrix, clock)
    closed = ClosedForm(chain, spectrum.is_solved, reason(spectrum), float(time_limit), spectrum)
    return _proof_read(closed, clock) if closed.is_closed else closed


def _matrix(chain: Chain) -> SymbolicMatrix:
    return colour_matrix(chain) if numbers_of_colours(chain) else symbolic_matrix(chain)


def _proof_read(form: ClosedForm, clock: Clock) -> ClosedForm:
    spectrum = form.spectrum
    try:
        wrong = limited(clock.left, _wrong, form)
    except TimeUp:
        spectrum = spectrum.note("the closed form found was not checked against the matrix in time and is withheld")
        return ClosedForm(form.chain, False, reason(spectrum), form.time_limit, spectrum)
    if wrong is not None:
        raise SolveError(f"the closed form does not reproduce its matrix: {wrong}; please report this chain")
    return form


def _wrong(form: ClosedForm) -> str | None:
    # Not through the properties of the form, which run under a limit of their own.
    perron = perron_of(form.chain, form.spectrum)
    matrix, eigenvalues = form.spectrum.matrix, ordered_eigenvalues(form.spectrum, perron)
    if isinstance(matrix, ColourMatrix):
        return colour_mismatch(form.chain, matrix, eigenvalues, perron.value)
    return mismatch(matrix, eigenvalues, perron.value)
