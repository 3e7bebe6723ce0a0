"""Every fact that a shipped model states, checked against the solver."""

import pytest

from tmsolve import models, open_chain, ring, solve
from tmsolve.observe.readings import parse_reading

FACTS = [(name, fact) for name in models.names() for fact in models.load(name).facts]


def computed(name, fact):
    model = models.load(name, **fact.get("options", {}))
    point = model.chain.at(**{**model.defaults, **fact["point"]})
    if fact.get("boundary") == "ring":
        result = ring(point, fact["cells"])
    elif fact.get("boundary") == "open":
        result = open_chain(point, fact["cells"], left=fact.get("left"), right=fact.get("right"))
    else:
        solution = solve(point)
        if "derivative" in fact:
            return solution.derivative(*fact["derivative"], of=fact["quantity"])
        return parse_reading(fact["quantity"], model.chain).evaluate(solution)
    assert fact["quantity"] == "log_Z"
    return result.log_Z


@pytest.mark.parametrize(("name", "fact"), FACTS, ids=[f"{name}-{fact['id']}" for name, fact in FACTS])
def test_fact(name, fact):
    value = float(computed(name, fact))
    assert value == pytest.approx(float(fact["value"]), rel=fact["rtol"], abs=fact.get("atol", 0.0)), (
        f"{fact['statement']} ({fact['source']})"
    )
