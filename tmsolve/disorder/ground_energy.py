"""Disordered chains at T = 0: min-plus products, exact where the message takes finitely many values.

At T = 0 a message holds the least energy of everything to the left for every state of the cut, up to a constant. One
cell later it is min_i (m_i + E_ij). For discrete disorder with commensurate energies it takes finitely many values; the
least energy per cell is then an average over a finite Markov chain, in rational arithmetic. Together with numbers of
ways it says what the ground states look like.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from fractions import Fraction
from typing import Any

import numpy as np

from ..declare import Chain
from ..errors import NotApplicable, ParameterError
from .averages import Average, average
from .cold_algebra import COUNTS, least_logs
from .cold_averages import GroundAverages, Number, written
from .cold_chain import exact_energy, message_chain
from .cold_domains import GroundDomains
from .cold_exact import exact_moves
from .cold_quantities import Classes
from .cold_sample import longest_walk, settle
from .cold_steps import ColdSteps, Counted, cold_start
from .laws import Realisation
from .problem import Problem, positive, read_problem, row_length, seed_of

__all__ = ["DisorderedGround", "disordered_ground_state"]

_CELLS, _REPLICAS = 1000, 64


@dataclass(frozen=True)
class DisorderedGround:
    """The ground state of a disordered chain, averaged over the disorder, per cell.

    Attributes
    ----------
    energy : Fraction or Average
        Least energy: exact where the message takes finitely many values, else with an error bar.
    messages : int or None
        How many values the message takes, where the energy is exact.
    residual_entropy : Average
        Logarithm of the number of ground states; the error is 0 where the message takes finitely
        many values together with the numbers of ways to them.
    cells, replicas, seed : int
        Of what was sampled.
    notes : tuple of str
        What to know before the numbers are used.
    """

    energy: Fraction | Average
    messages: int | None
    residual_entropy: Average
    cells: int
    replicas: int
    seed: int
    notes: tuple[str, ...]
    _averages: GroundAverages = field(repr=False, compare=False)
    _known: dict[Any, Any] = field(default_factory=dict, repr=False, compare=False)

    @property
    def observables(self) -> tuple[str, ...]:
        """Observables that can be read: those that take no random parameter."""
        return self._averages.problem.observables

    def mean(self, name: str) -> Number:
        """Mean of an observable per cell: over all ground states alike, then over the disorder.

        Far from both ends, or along the whole of one given realisation. A Fraction where the
        message takes finitely many values together with the numbers of ways to them, or all ground
        states agree on the mean; else an average with an error bar.

        Raises
        ------
        ParameterError
            No such observable, or it takes random parameters.

        Examples
        --------
        Magnetisation of an Ising chain in random fields, in a uniform field that turns some of its domains:

        >>> from tmsolve import Chain, bond, ising, site
        >>> energy = [bond(lambda s, t, J: -J*s*t), site(lambda s, h, H: -(h + H)*s)]
        >>> chain = Chain(ising(), energy, observables={"m": lambda s: s})
        >>> [str(disordered_ground_state(chain.fix(J=1, H=H), {"h": {-3: "1/2", 3: "1/2"}}, rng=1).mean("m"))
        ...  for H in ("0.5", "1.5", "5.5")]
        ['0', '1/4', '1']
        """
        if ("mean", name) not in self._known:
            self._known["mean", name] = self._averages.mean(name)
        found: Number = self._known["mean", name]
        return found

    def overlap(self, name: str) -> Number:
        """Edwards-Anderson order parameter: the squared mean of an observable of one site, averaged over the disorder.

        The mean is that over all ground states alike. It is the mean square of the observable where the ground state
        of every realisation is single; free spins and domains that may turn take away from it.

        Raises
        ------
        NotApplicable
            The observable is not a function of one site.
        ParameterError
            No such observable, or it takes random parameters.

        Notes
        -----
        S. F. Edwards and P. W. Anderson, J. Phys. F 5, 965 (1975); from memory.

        Examples
        --------
        A spin between bonds J = 1 of which a quarter is missing is free, and so is every chain of spins:

        >>> from tmsolve import Chain, bond, ising, site
        >>> chain = Chain(ising(), [bond(lambda s, t, J: -J*s*t), site(lambda s, h: -h*s)], {"m": lambda s: s})
        >>> disordered_ground_state(chain.fix(h=0), {"J": {0: "1/4", 1: "3/4"}}, cells=50, rng=1).overlap("m")
        Fraction(0, 1)
        """
        if ("overlap", name) not in self._known:
            self._known["overlap", name] = self._averages.overlap(name)
        found: Number = self._known["overlap", name]
        return found

    def domains(self, observable: str) -> GroundDomains:
        """Statistics of the domains of an observable in the ground states.

        Parameters
        ----------
        observable : str
            A function of a single site per cell that takes no random parameter; cells with the same
            value are alike.

        Raises
        ------
        NotApplicable
            The observable is not a function of one site.
        ParameterError
            No such observable, or it takes random parameters.

        Examples
        --------
        Weak random fields break an Ising chain into domains in which the field adds up to 2J:

        >>> from tmsolve import Chain, bond, ising, site
        >>> chain = Chain(ising(), [bond(lambda s, t, J: -J*s*t), site(lambda s, h: -h*s)], {"m": lambda s: s})
        >>> found = disordered_ground_state(chain.fix(J=1), {"h": {"-0.3": "1/2", "0.3": "1/2"}}, cells=100, rng=1)
        >>> found.domains("m").walls, found.domains("m").mean_length()
        (Fraction(1, 56), Fraction(56, 1))
        """
        problem = self._averages.problem
        self._averages.check(observable)
        if ("domains", observable) not in self._known:
            classes = Classes.read(problem, observable)
            self._known["domains", observable] = GroundDomains(observable, classes.values, self._averages, classes)
        found: GroundDomains = self._known["domains", observable]
        return found

    def __str__(self) -> str:
        how = "sampled" if self.messages is None else f"exact, over {self.messages} messages"
        lines = ["disordered chain at T = 0", f"  energy            {written(self.energy)}  ({how})"]
        lines.append(f"  residual_entropy  {self.residual_entropy}")
        lines += [f"  {f'mean({name})':17} {written(self.mean(name))}" for name in self.observables]
        for name in self.observables:
            parts = self._averages.problem.chain.observable(name)
            if len(parts) == len(parts[0].sites) == 1:
                lines.append(f"  {f'walls of {name}':17} {written(self.domains(name).walls)}")
        return "\n".join([*lines, *self.notes])


def disordered_ground_state(
    chain: Chain,
    random: Mapping[str, Any],
    *,
    cells: int | None = None,
    replicas: int | None = None,
    rng: int | np.random.Generator | None = None,
    most_messages: int = 400,
) -> DisorderedGround:
    """Find the average ground state of a disordered chain: energy, residual entropy, means and domains at T = 0.

    Parameters
    ----------
    chain : Chain
        Every parameter that is neither random nor defaulted fixed; T is left out or 0.
    random : mapping of str to law
        As in `quenched`. A list of values is one realisation, on a chain with free ends.
    cells, replicas, rng
        Of the samples from which everything is taken that is not exact.
    most_messages : int
        Up to how many values of the message are followed exactly.

    Returns
    -------
    DisorderedGround

    Raises
    ------
    ParameterError, DeclarationError
        Unusable names, laws, counts or seeds.
    NotApplicable
        An energy or a weight takes T.

    Notes
    -----
    B. Derrida, J. Vannimenus and Y. Pomeau, J. Phys. C 11, 4749 (1978) for the random-field chain; from memory.

    Examples
    --------
    >>> from tmsolve import Chain, bond, ising, site
    >>> chain = Chain(ising(), [bond(lambda s, t, J: -J*s*t), site(lambda s, h: -h*s)])
    >>> disordered_ground_state(chain.fix(J=1), {"h": {"-0.8": "1/2", "0.8": "1/2"}}, cells=100, rng=1).energy
    Fraction(-37, 30)
    """
    most = positive(most_messages, "most_messages=")
    problem = _problem(chain, random)
    cells = row_length(problem, cells, _CELLS)
    count = _replicas(problem, replicas)
    steps = ColdSteps(problem)
    seed = seed_of(rng)
    exact = exact_energy(steps, most)
    counted = None if exact is None else message_chain(exact_moves(steps, COUNTS), most)
    averages = GroundAverages(problem, cells, count, seed, 0 if exact is None else most, counted is not None)
    message, notes = _begun(steps, seed, cells, count)
    if exact is not None and counted is not None:
        return DisorderedGround(*exact, Average(counted.entropy, 0.0), cells, count, seed, notes, averages)
    energy, entropy = _walked(steps, message, seed, cells, count)
    found: tuple[Number, int | None] = (energy, None) if exact is None else exact
    return DisorderedGround(*found, entropy, cells, count, seed, notes, averages)


def _problem(chain: Chain, random: Mapping[str, Any]) -> Problem:
    if isinstance(chain, Chain) and chain.fixed.get("T"):
        raise ParameterError(f"the ground state is that of T = 0, got a chain with T = {float(chain.fixed['T']):g}")
    problem = read_problem(chain, random, cold=True)
    for term in chain.terms:
        if term.takes_temperature:
            raise NotApplicable(
                f"{term.label} takes T, so that T = 0 does not say which of its states are least; write an energy "
                "without T, or use quenched at a small T > 0"
            )
    return problem


def _replicas(problem: Problem, replicas: Any) -> int:
    single = all(isinstance(law, Realisation) for law in problem.laws.values())
    if replicas is None:
        return 1 if single else _REPLICAS
    count = positive(replicas, "replicas=", 1 if single else 2)
    if single and count > 1:
        raise ParameterError(f"lists are one realisation, got replicas={count}; leave replicas out")
    return count


def _begun(steps: ColdSteps, seed: int, cells: int, replicas: int) -> tuple[Counted, tuple[str, ...]]:
    """Return the messages before the first cells that count, and what to tell about them."""
    if steps.problem.listed:
        return cold_start(steps.states, replicas), ()
    longest = longest_walk(cells)
    settled = settle(steps, np.random.default_rng([seed, 2, 1]), replicas, longest)
    if settled.forgotten:
        return settled.message, ()
    return settled.message, (
        f"messages from different ends still differ after {longest} cells: averages may depend on the ends, which are "
        "free; take more cells to see whether they do",
    )


def _walked(steps: ColdSteps, message: Counted, seed: int, cells: int, replicas: int) -> tuple[Average, Average]:
    """Walk over the cells that count; return energy and entropy per cell."""
    # These cells have a stream of their own: they are the same however long the walk before them is.
    rng = np.random.default_rng([seed, 2])
    energy, entropy = np.zeros(replicas), np.zeros(replicas)
    for begin in range(0, cells, 64):
        count = min(64, cells - begin)
        table, counts = steps.drawn(rng, begin, count, replicas)
        for i in range(count):
            message, gained, more = message.advance(table[:, :, i], counts[:, :, i])
            energy += gained
            entropy += more
    if steps.problem.listed:
        entropy += least_logs(message.energy, message.ways, 0)[1]
    return average(energy / cells), average(entropy / cells)
