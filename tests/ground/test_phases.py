"""Phase diagrams: exact polygons against known diagrams and against ground states at random points."""

from __future__ import annotations

import csv
import math
import random
from fractions import Fraction

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tests.laws.zoo import BY_NAME
from tests.refusal import refused
from tmsolve import Chain, NotApplicable, ParameterError, bond, ground_state, ising, models, phase_diagram, site, spins
from tmsolve.ground.polytopes import box_polytope, in_order, value_at

SPIN1_NNN = models.load("spin1_nnn").chain.fix(h=0)
BEG = models.load("blume_emery_griffiths").chain.fix(K3=0)
NNN = models.load("ising_nnn").chain
F = Fraction


def corners(*points):
    return {tuple(map(Fraction, point)) for point in points}


def check(diagram, rng, tries=25):
    """Phases tile the box, agree with ground states at random points, and touch at equal energies."""
    sizes = [area(phase.corners) for phase in diagram.phases]
    assert sum(sizes) == math.prod(high - low for low, high in diagram.box)
    for _ in range(tries):
        point = [low + (high - low) * Fraction(rng.randint(0, 1000), 1000) for low, high in diagram.box]
        named = dict(zip(diagram.axes, point, strict=True))
        found = ground_state(diagram.chain.at(T=0, **named)).energy
        assert found == value_at(diagram.phase_at(**named).plane, point)
    for line in diagram.boundaries:
        for end in line.ends:
            assert len({value_at(diagram.phases[i].plane, end) for i in line.phases}) == 1
    for vertex in diagram.vertices:
        assert len({value_at(diagram.phases[i].plane, vertex.point) for i in vertex.phases}) == 1


def area(region):
    if len(region[0]) == 1:
        return region[1][0] - region[0][0]
    pairs = zip(region, [*region[1:], region[0]], strict=True)
    return sum((a[0] * b[1] - a[1] * b[0] for a, b in pairs), start=Fraction(0)) / 2


def test_the_next_nearest_spin_1_plane():
    """J1 = 1: four phases, one of period 6 that fills the triangle (-1,1), (-1/2,0), (-1/3,2/3); derived."""
    diagram = phase_diagram(SPIN1_NNN.fix(J1=1), ("J2", "D"))
    assert diagram.exact and len(diagram.phases) == 4
    (six,) = [phase for phase in diagram.phases if phase.period == 6]
    assert six.name == "(1, 1, 0, -1, -1, 0)" and six.entropy == 0
    assert set(six.corners) == corners((-1, 1), ("-1/2", 0), ("-1/3", "2/3"))
    assert {phase.name for phase in diagram.phases} == {
        "(1, 1, 0, -1, -1, 0)", "(1, 1, -1, -1)", "(0)", "(-1) | (1)",
    }  # fmt: skip
    assert {vertex.point for vertex in diagram.vertices} == set(six.corners)
    # The default box shows all of it.
    assert all(low < x < high for corner in six.corners for x, (low, high) in zip(corner, diagram.box, strict=True))
    check(diagram, random.Random(1))


def test_the_antiferromagnetic_next_nearest_spin_1_plane():
    """J1 = -1: the same triangle holds (1, -1, 0) and its mirror image, period 3; derived."""
    diagram = phase_diagram(SPIN1_NNN.fix(J1=-1), ("J2", "D"), {"J2": (-2, 1), "D": ("-0.5", 2)})
    (three,) = [phase for phase in diagram.phases if phase.period == 3]
    assert three.name == "(1, -1, 0) | (1, 0, -1)"
    assert set(three.corners) == corners((-1, 1), ("-1/2", 0), ("-1/3", "2/3"))


def test_a_phase_with_an_entropy_and_its_triple_point():
    """BEG, J = 1: the staggered phase has s = ln2/2 inside; at (K, D) = (-1, 0) ln(1+sqrt 2); derived."""
    diagram = phase_diagram(BEG.fix(J=1, h=0), ("K", "D"), {"K": (-5, 1), "D": (-2, 2)})
    assert len(diagram.phases) == 3
    staggered = diagram.phase_at(K=-4, D=-1)
    assert staggered.state.entropy_text == "ln(2)/2" and staggered.entropy == pytest.approx(math.log(2) / 2)
    (vertex,) = diagram.vertices
    assert vertex.point == (-1, 0) and vertex.state.entropy_text == "ln(1+sqrt(2))"
    number = diagram.phases.index(staggered)
    empty = next(i for i, phase in enumerate(diagram.phases) if phase.name == "(0)")
    (line,) = [b for b in diagram.boundaries if set(b.phases) == {number, empty}]
    assert line.state.entropy_text == "ln(2)"
    check(diagram, random.Random(2))


def test_the_antiferromagnetic_beg_plane():
    """J = -1, (D, h): six phases, triple points (0, ±2) with ln 2 and (1, ±1) with x^3 - x^2 - 2x + 1; derived."""
    diagram = phase_diagram(BEG.fix(J=-1, K=0), ("D", "h"))
    assert len(diagram.phases) == 6
    found = {vertex.point: vertex.state for vertex in diagram.vertices}
    assert found.keys() == corners((0, 2), (0, -2), (1, 1), (1, -1))
    assert found[F(0), F(2)].entropy_text == "ln(2)"
    assert [int(c) for c in found[F(1), F(1)].entropy_polynomial.all_coeffs()] == [1, -1, -2, 1]
    assert found[F(1), F(1)].entropy == pytest.approx(0.588862605762, abs=1e-12)
    check(diagram, random.Random(3))


def test_the_next_nearest_antiferromagnet_in_a_field():
    """Spin 1/2, J1 = -1, (J2, h): six phases, plateaux of period 3 between up-down and saturation; derived.

    Boundaries: entropies ln of the roots of x^3 - x^2 - 1 (hard rods), x^3 - x - 1 and x^4 - x - 1.
    """
    diagram = phase_diagram(NNN.fix(J1=-1), ("J2", "h"))
    assert sorted(phase.period for phase in diagram.phases) == [1, 1, 2, 3, 3, 4]
    assert {v.point for v in diagram.vertices} == corners(("-1/2", 0), (0, 2), (0, -2))
    polynomials = {str(line.state.entropy_polynomial.as_expr()) for line in diagram.boundaries if line.entropy}
    assert polynomials == {"x**3 - x**2 - 1", "x**3 - x - 1", "x**4 - x - 1"}
    check(diagram, random.Random(4))


def test_one_axis():
    """The Ising antiferromagnet in a field: saturation at ±2|J| with entropy ln golden ratio (A13)."""
    diagram = phase_diagram(models.load("ising").chain.fix(J=-1), "h")
    assert [phase.name for phase in diagram.phases] == ["(-1)", "(1, -1)", "(1)"]
    assert [line.ends for line in diagram.boundaries] == [((F(-2),),), ((F(2),),)]
    assert {line.state.entropy_text for line in diagram.boundaries} == {"ln((1+sqrt(5))/2)"}
    check(diagram, random.Random(5))


@pytest.mark.parametrize(
    "name, axes", [("diamond", ("J2", "h")), ("sawtooth", ("K", "h")), ("ladder", ("R", "h")), ("mixed", ("D", "h"))]
)
def test_decorated_cells(name, axes):
    animal = BY_NAME[name]
    fixed = {n: v for n, v in animal.values.items() if n not in (*axes, "T")}
    check(phase_diagram(animal.chain.fix(**fixed), axes), random.Random(6), tries=15)


@settings(max_examples=15, deadline=None)
@given(st.lists(st.tuples(*[st.integers(-4, 4)] * 3), min_size=9, max_size=9), st.integers(0, 9))
def test_random_planes(entries, seed):
    """Three states with random bond energies a + b x + c y."""

    def energy(s, t, x, y):
        a, b, c = entries[3 * s + t + 4]
        return a + b * x + c * y

    chain = Chain(spins(1), [bond(energy)])
    check(phase_diagram(chain, ("x", "y"), {"x": (-3, 3), "y": ("-1/3", 2)}), random.Random(seed), tries=10)


def test_narrow_phases_are_not_missed():
    """A sliver of width 1e-9 between two phases."""
    chain = Chain(spins(1), [site(lambda s, x: x if s == 1 else (-x if s == -1 else F(-1, 10**9)))])
    diagram = phase_diagram(chain, "x", {"x": (-1, 1)})
    assert [phase.name for phase in diagram.phases] == ["(1)", "(0)", "(-1)"]
    assert diagram.phases[1].corners == ((F(-1, 10**9),), (F(1, 10**9),))


def test_energies_that_are_not_affine_are_bisected():
    """J^2 - 1/2 against 0, and the anisotropy as a product of two parameters."""
    chain = Chain(spins(1), [bond(lambda s, t, J, g=1: (J * J - F(1, 2)) * g * s * s * t * t)])
    diagram = phase_diagram(chain, "J", {"J": (0, 2)}, precision="1e-6")
    assert len(diagram.phases) == 2 and not diagram.exact
    ((edge,),) = diagram.boundaries[0].ends
    assert abs(float(edge) - math.sqrt(0.5)) <= 1e-6 and diagram.precision == F("1e-6")
    assert "bisected to 1e-06" in str(diagram) and "entropy unknown" in str(diagram)
    assert diagram.boundaries[0].entropy is None and diagram.phase_at(J=1) is diagram.phases[1]
    refused(NotApplicable, lambda: phase_diagram(chain, ("J", "g")), "is not affine in J and g", "one axis at a time")
    refused(NotApplicable, lambda: phase_diagram(chain, "J"), "not affine in J", "give box=")
    # In g alone it is affine.
    assert phase_diagram(chain.fix(J=1), "g").exact


def test_table_text_and_csv(tmp_path):
    diagram = phase_diagram(BEG.fix(J=1, h=0), ("K", "D"), {"K": (-2, 0), "D": (-1, 1)})
    rows = diagram.table()
    assert [row["kind"] for row in rows] == ["phase"] * 3 + ["boundary"] * 3 + ["point"]
    assert rows[0]["energy"] == "0.5*D" and rows[0]["entropy_text"] == "ln(2)/2" and rows[0]["period"] == 2
    text = str(diagram)
    assert "3 phases, cells as (s):" in text and "over K from -2 to 0, D from -1 to 1" in text
    assert "1 | 2 | 3  at (-1, 0), entropy ln(1+sqrt(2)) = 0.88137358702" in text
    path = diagram.to_csv(tmp_path / "phases.csv")
    with path.open(encoding="utf-8") as stream:
        written = list(csv.DictReader(stream))
    assert len(written) == 7 and written[-1]["corners"] == "(-1, 0)"
    assert float(written[0]["entropy"]) == rows[0]["entropy"]
    assert repr(diagram) == "<PhaseDiagram of 'Blume-Emery-Griffiths chain' over K, D: 3 phases>"


def test_inexact_energies_are_flagged():
    chain = Chain(ising(), [bond(lambda s, t, J: -J * math.sqrt(2) * s * t), site(lambda s, h: -h * s)])
    diagram = phase_diagram(chain.fix(J=-1), "h")
    assert not diagram.exact and any("inexact" in note for note in diagram.notes)
    assert float(diagram.boundaries[1].ends[0][0]) == pytest.approx(2 * math.sqrt(2), rel=1e-15)


def test_bad_axes_and_boxes():
    chain = NNN.fix(J1=1)
    refused(ParameterError, lambda: phase_diagram(chain, ("J2", "H")), "no parameter 'H'", "Did you mean 'h'?")
    refused(ParameterError, lambda: phase_diagram(chain, ("J1", "h")), "axis 'J1' is fixed at 1", "leave it free")
    refused(ParameterError, lambda: phase_diagram(chain, ("h", "h")), "axis 'h' is given twice")
    refused(ParameterError, lambda: phase_diagram(chain, ("T", "h")), "T is no axis", "scan")
    refused(ParameterError, lambda: phase_diagram(chain, ()), "needs one to five axes")
    refused(ParameterError, lambda: phase_diagram(chain, "h"), "no value for J2", "chain.fix(J2=…)")
    refused(ParameterError, lambda: phase_diagram(chain, ("J2", "h"), {"J2": (0, 1)}), "no range for axis 'h'")
    refused(ParameterError, lambda: phase_diagram(chain, ("J2", "h"), {"J2": (1, 0), "h": (0, 1)}), "low < high")
    refused(ParameterError, lambda: phase_diagram(chain, ("J2", "h"), {"J2": 3, "h": (0, 1)}), "a pair (low, high)")
    refused(ParameterError, lambda: phase_diagram(chain, ("J2", "h"), {"D": (0, 1)}), "box= has 'D'", "J2, h")
    many = Chain(ising(), [site(lambda s, a, b, c, d, e, f: (a + b + c + d + e + f) * s)])
    refused(NotApplicable, lambda: phase_diagram(many, tuple("abcdef")), "one to five axes, got 6", "chain.fix(…)")
    diagram = phase_diagram(chain, ("J2", "h"))
    refused(ParameterError, lambda: diagram.phase_at(J2=0, D=1), "'D' is no axis", "J2, h")
    refused(ParameterError, lambda: diagram.phase_at(J2=0), "no value for axis h")
    refused(ParameterError, lambda: diagram.phase_at(J2=0, h=10**6), "(0, 1000000) lies outside")


def test_bent_energies_that_tie_at_a_fraction_are_exact():
    """J^2 = 1/9 at J = 1/3, where all three states tie and s = ln 3; also with a point of the search at the tie."""
    chain = Chain(spins(1), [site(lambda s, J: (J * J - F(1, 9)) * s * s)])
    diagram = phase_diagram(chain, "J", {"J": (0, 1)})
    assert diagram.exact and [phase.name for phase in diagram.phases] == ["(-1) | (1) …", "(0)"]
    (line,) = diagram.boundaries
    assert line.ends == ((F(1, 3),),) and line.state.entropy_text == "ln(3)"
    diagram = phase_diagram(chain, "J", {"J": (F(1, 12), F(13, 12))})  # the grid has the point 1/3
    assert diagram.exact and [line.ends for line in diagram.boundaries] == [((F(1, 3),),)]


def test_a_kink_is_not_taken_for_a_straight_line():
    """|x - 3/2| is affine on either side; wherever the kink is in the box, it is seen."""
    chain = Chain(spins(1), [site(lambda s, x: abs(x - F(3, 2)) * s + (s == 0) * F(-1, 3))])
    for box in ((0, 2), (-10, 10), (-1, F(161, 100))):
        found = phase_diagram(chain, "x", {"x": box})
        names = ["(-1)", "(0)", "(-1)"] if box[1] > F(11, 6) else ["(-1)", "(0)"]
        assert found.phases[0].plane is None and [phase.name for phase in found.phases] == names
        assert [line.ends[0][0] for line in found.boundaries] == [F(7, 6), F(11, 6)][: len(names) - 1]
    plane = Chain(spins(1), [site(lambda s, x, y: abs(x - F(3, 2)) * s + y * s)])
    refused(
        NotApplicable, lambda: phase_diagram(plane, ("x", "y"), {"x": (0, 2), "y": (0, 1)}), "not affine in x and y"
    )


def test_functions_that_are_not_defined_everywhere():
    chain = Chain(ising(), [site(lambda s, x: -math.sqrt(x) * s), site(lambda s, h: -h * s)])
    diagram = phase_diagram(chain.fix(h=-2), "x", {"x": (1, 10)})
    assert [phase.name for phase in diagram.phases] == ["(-1)", "(1)"]
    assert float(diagram.boundaries[0].ends[0][0]) == pytest.approx(4, abs=1e-9)


@pytest.mark.parametrize(
    "model, fixed, axes, phases",
    [
        ("blume_emery_griffiths", {"K3": 0}, ("J", "K", "D", "h"), 6),
        ("spin1_nnn", {}, ("J1", "J2", "D", "h"), 27),
    ],
)
def test_fans(model, fixed, axes, phases):
    """All couplings at once: the cones of the fan that numerics counted as 6 and 27, derived.

    By symmetry of h -> -h phases come alone or in pairs; energies are homogeneous.
    """
    diagram = phase_diagram(models.load(model).chain.fix(**fixed), axes)
    assert len(diagram.phases) == phases and diagram.box == ((-1, 1),) * 4
    assert all(phase.plane[0] == 0 and (0,) * 4 in phase.corners for phase in diagram.phases)
    assert sum(volume(phase.corners) for phase in diagram.phases) == pytest.approx(16)
    rng = random.Random(7)
    for _ in range(20):
        point = {axis: Fraction(rng.randint(-99, 99), 100) for axis in axes}
        found = ground_state(diagram.chain.at(T=0, **point)).energy
        assert found == value_at(diagram.phase_at(**point).plane, tuple(point.values()))
    assert any(vertex.point == (0,) * 4 for vertex in diagram.vertices)


def test_three_axes_cut_to_two():
    """A cut through the diagram of three parameters is the diagram of two."""
    whole = phase_diagram(NNN, ("J1", "J2", "h"), {"J1": (-1, 1), "J2": (-1, 1), "h": (-2, 2)})
    plane = phase_diagram(NNN.fix(J1=-1), ("J2", "h"), {"J2": (-1, 1), "h": (-2, 2)})
    cut = {phase.plane for phase in whole.phases if any(corner[0] == -1 for corner in phase.corners)}
    for phase in plane.phases:
        assert any((p[0] - p[1], *p[2:]) == phase.plane for p in cut)
    assert "period" in str(whole)


def volume(corners):
    from scipy.spatial import ConvexHull

    return ConvexHull([[float(x) for x in corner] for corner in corners]).volume


def test_clipping():
    square = box_polytope([(F(0), F(1)), (F(0), F(1))])
    assert square.clip((F(1), F(1), F(0))) is None and square.clip((F(0), F(1), F(0))) is None
    assert set(square.clip((F(-2), F(1), F(0))).corners) == set(square.corners)
    triangle = square.clip((F(-1), F(1), F(1)))
    assert set(triangle.corners) == {(F(0), F(0)), (F(1), F(0)), (F(0), F(1))}
    assert in_order(triangle.corners) == ((0, 0), (1, 0), (0, 1))
    assert box_polytope([(F(0), F(2))]).clip((F(-1), F(1))).corners == ((F(0),), (F(1),))
    # A cube cut through its main diagonal plane x + y + z = 3/2 is halved along a hexagon.
    cube = box_polytope([(F(0), F(1))] * 3)
    half = cube.clip((F(-3, 2), F(1), F(1), F(1)))
    assert volume(half.corners) == pytest.approx(0.5)
    assert sum(sum(corner) == F(3, 2) for corner in half.corners) == 6
    # Degenerate: a plane through an edge of the cube.
    wedge = cube.clip((F(-1), F(1), F(1), F(0)))
    assert len(wedge.corners) == 6 and volume(wedge.corners) == pytest.approx(0.5)


@settings(max_examples=30, deadline=None)
@given(st.lists(st.tuples(*[st.integers(-3, 3)] * 4), min_size=1, max_size=8))
def test_clipped_polytopes_have_the_corners_of_their_hull(cuts):
    polytope = box_polytope([(F(-1), F(1))] * 3)
    for cut in cuts:
        clipped = polytope.clip(tuple(map(F, cut)))
        polytope = clipped if clipped is not None else polytope
    from scipy.spatial import ConvexHull

    hull = ConvexHull([[float(x) for x in corner] for corner in polytope.corners])
    assert len(hull.vertices) == len(polytope.corners)
