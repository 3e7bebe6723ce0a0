"""``tmsolve solve``."""

import json
import math

import pytest


def values_of(text):
    """Read the table of quantities back: name -> value."""
    lines = text.splitlines()
    start = next(i for i, line in enumerate(lines) if line.startswith("quantity"))
    rows = [line.split() for line in lines[start + 1 :]]
    return {row[0]: float(row[-2]) for row in rows[: rows.index([])]}


def test_the_table_holds_the_textbook_values(tm):
    ended = tm("solve", "ising", "-p", "J=1", "-p", "h=0", "-p", "T=2")
    found = values_of(ended.out)
    assert ended.code == 0 and ended.err == ""
    assert found["free_energy"] == pytest.approx(-2 * math.log(2 * math.cosh(0.5)), rel=1e-9)
    assert found["internal_energy"] == pytest.approx(-math.tanh(0.5), rel=1e-9)
    assert found["specific_heat"] == pytest.approx((0.5 / math.cosh(0.5)) ** 2, rel=1e-9)
    assert found["temperature_susceptibility(m)"] == pytest.approx(math.e, rel=1e-9)
    assert found["correlation_length"] == pytest.approx(-1 / math.log(math.tanh(0.5)), rel=1e-9)
    assert found["mean(m)"] == pytest.approx(0, abs=1e-12)


def test_the_columns_stand_under_their_heads(tm):
    lines = tm("solve", "blume_capel").out.splitlines()
    head = next(line for line in lines if line.startswith("quantity"))
    row = next(line for line in lines if line.startswith("specific_heat"))
    assert row.index("k_B") == head.index("unit")
    assert row[head.index("symbol")] == "c"


def test_it_says_which_values_are_defaults(tm):
    out = tm("solve", "blume_capel", "-p", "D=1/3").out
    assert "  D = 1/3\n" in out
    assert "  J = 1  (default)\n" in out
    assert "  T = 0.4  (default)\n" in out


def test_eigenvalues_come_with_multiplicities_and_matrix(tm):
    out = tm("solve", "potts", "--option", "q=5", "-p", "T=1").out
    assert "transfer matrix 5 x 5, 25 non-zeros; solved in double precision" in out
    last = out.rstrip().splitlines()[-1].split()
    assert float(last[0]) == pytest.approx(math.e - 1, rel=1e-9)
    assert last[-1] == "4"


def test_interior_sites_are_counted(tm):
    assert "2 x 2, 4 non-zeros, 2 sites per cell summed out" in tm("solve", "diamond").out


def test_complex_eigenvalues_show_their_phase(tm):
    out = tm("solve", "ising_nnn", "-p", "J1=1", "-p", "J2=-2", "-p", "h=0", "-p", "T=1").out
    assert "phase / pi" in out
    assert " + " in out and "i  " in out


def test_a_negative_eigenvalue_is_real(tm):
    out = tm("solve", "ising", "-p", "J=-1", "-p", "h=0").out
    cells = out.splitlines()[-1].split()
    assert float(cells[0]) == pytest.approx(-2 * math.sinh(1.25), rel=1e-9)
    assert cells[3:] == ["1", "1"]


def test_digits_are_significant_digits(tm):
    exact = -0.8 * math.log(2 * math.cosh(1.25))
    assert f" {exact:.12g} " in tm("solve", "ising", "--read", "free_energy", "--digits", "12").out
    assert "-1.06 " in tm("solve", "ising", "--read", "free_energy", "--digits", "3").out


def test_read_restricts_and_keeps_commas_inside_brackets(tm):
    ended = tm("solve", "blume_capel", "--read", "entropy,susceptibility(m,q)", "--read", "gap")
    assert list(values_of(ended.out)) == ["entropy", "susceptibility(m,q)", "gap"]
    assert "eigenvalue" not in ended.out


def test_levels_can_be_asked_for_with_read(tm):
    out = tm("solve", "clock", "--read", "entropy", "--levels", "2").out
    assert len(out[out.index("eigenvalue") :].splitlines()) == 3


def test_json_is_one_document_whose_numbers_round_trip(tm):
    from tmsolve import models, solve

    ended = tm("solve", "potts", "--option", "q=5", "-p", "T=0.7", "--json")
    document = json.loads(ended.out)
    model = models.load("potts", q=5)
    r = solve(model.chain.at(**{**model.defaults, "T": "0.7"}))
    assert ended.code == 0 and ended.err == ""
    assert document["results"]["free_energy"] == float(r.free_energy)
    assert document["results"]["susceptibility(m)"] == float(r.susceptibility("m"))
    assert document["options"] == {"q": 5}
    assert document["parameters"] == {"J": 1, "h": 0, "T": 0.7}
    assert document["exact"]["T"] == "7/10"
    assert document["defaults_used"] == ["J", "h"]
    assert document["eigenvalues"][1]["multiplicity"] == 4
    assert document["matrix"] == {"rows": 5, "columns": 5, "nonzeros": 25, "summed_out": 0}
    assert set(document["units"]) == set(document["results"])


def test_inf_is_null_and_listed(tm):
    # Free spins: the second eigenvalue is 0, so the gap is infinite and the correlation length 0.
    document = tm("solve", "ising", "-p", "J=0", "-p", "h=0", "--json").json
    assert document["results"]["gap"] is None
    assert document["nonfinite"]["results.gap"] == "inf"
    assert document["results"]["correlation_length"] == 0


def test_eigenvalues_that_overflow_keep_their_logarithm(tm):
    ended = tm("solve", "ising", "-p", "T=1/1000", "--json")
    assert ended.json["eigenvalues"][0]["value"][0] is None
    assert ended.json["eigenvalues"][0]["log_modulus"] == pytest.approx(1000)
    assert "inf" in tm("solve", "ising", "-p", "T=1/1000").out


def test_out_writes_the_same_document(tm, tmp_path):
    path = tmp_path / "result.json"
    ended = tm("solve", "ising", "--out", path, "--json")
    assert json.loads(path.read_text(encoding="utf-8")) == ended.json
    assert tm("solve", "ising", "--out", path).out.startswith("Ising chain")


def test_parameters_are_exact(tm):
    # With J = 1/3 exactly, exp(-J/T) at T = 1/3 is exp(-1): f = -ln(2 cosh 1)/3 to the last digit.
    document = tm("solve", "ising", "-p", "J=1/3", "-p", "h=0", "-p", "T=1/3", "--json").json
    assert document["exact"]["J"] == "1/3"
    assert document["results"]["free_energy"] == pytest.approx(-math.log(2 * math.cosh(1)) / 3, rel=1e-15)


def test_own_file_options_signature_defaults_and_missing_ones(tm, pair):
    ended = tm("solve", pair, "--option", "length=1/2", "-p", "h=0.1")
    assert ended.code == 2 and "takes a whole number such as 1, got '1/2'" in ended.err
    out = tm("solve", pair, "--option", "label=spare", "-p", "h=0.1").out
    assert out.startswith("invented spare pair chain (pair, length = 1, label = spare)\nE = sum_i")
    assert "  K = 1  (default)\n" in out and "  J = 0.5  (default)\n" in out
    missing = tm("solve", pair)
    assert missing.code == 2
    assert "no value for h, and model pair has no default for it; give -p h=…" in missing.err


def test_a_chain_that_fixes_parameters_itself(tm, write):
    path = write(
        "from tmsolve import Chain, bond, ising, site\n"
        "CHAIN = Chain(ising(), [bond(lambda s, t, J: -J*s*t), site(lambda s, h: -h*s)]).fix(J=2)\n"
        "DEFAULTS = {'J': 1, 'h': 0}\n"
    )
    ended = tm("solve", path, "-p", "T=2")
    assert "  J = 2  (fixed by the model)\n" in ended.out
    assert values_of(ended.out)["free_energy"] == pytest.approx(-2 * math.log(2 * math.cosh(1)))
    assert "the model itself fixes J at 2; leave it out" in tm("solve", path, "-p", "J=1", "-p", "T=2").err


def test_what_fails_is_told_and_the_rest_is_printed(tm, monkeypatch):
    from tmsolve.errors import SolveError
    from tmsolve.observe.solution import Solution

    def fails(self, a=None):
        raise SolveError("the spectrum did not converge")

    monkeypatch.setattr(Solution, "correlation_length", fails)
    ended = tm("solve", "ising")
    assert ended.code == 3
    assert "correlation_length(m) failed: the spectrum did not converge" in ended.err
    assert "free_energy" in ended.out and "correlation_length" not in ended.out
    document = tm("solve", "ising", "--json").json
    assert document["failed"]["correlation_length"] == "the spectrum did not converge"
    alone = tm("solve", "ising", "--read", "correlation_length")
    assert alone.code == 1 and alone.out == ""


def test_many_digits_are_computed_with_longer_numbers(tm):
    """C01's free energy, −ln λ₊ at T = 1, to the digits of the source (Blume and Capel 1966, from memory)."""
    words = ("solve", "blume_capel", "-p", "T=1", "-p", "D=1/2", "--read", "free_energy,correlation_length")
    assert " -0.96334521596866038170478607917775 " in tm(*words, "--digits", "32").out
    document = tm(*words, "--digits", "32", "--json").json
    assert document["decimals"] == {"free_energy": "-0.96334521596866038170478607917775"}
    assert "decimals" not in tm(*words, "--json").json


def test_numbers_print_with_the_digits_they_are_known_to(tm):
    """A field-free chain has no magnetisation: its mean prints as 0, not as what rounding leaves."""
    out = tm("solve", "blume_capel", "-p", "T=1").out
    row = next(line.split() for line in out.splitlines() if line.startswith("mean(m)"))
    assert row[2] == "0"
    document = tm("solve", "blume_capel", "-p", "T=1", "--json").json
    assert abs(document["results"]["mean(m)"]) <= document["errors"]["mean(m)"] < 1e-12
    assert set(document["errors"]) == set(document["results"])


def test_digits_asked_for_are_computed(tm):
    """f = −T ln 2cosh(J/T) with J = 1, T = 0.8: fifteen digits are more than doubles are sure of."""
    import mpmath

    words = ("solve", "ising", "-p", "h=0", "-p", "T=0.8", "--read", "free_energy,mean(m)", "--digits", "15")
    ended = tm(*words)
    with mpmath.workdps(40):
        exact = -mpmath.log(2 * mpmath.cosh(mpmath.mpf(10) / 8)) * 8 / 10
    assert f" {mpmath.nstr(exact, 15)} " in ended.out
    assert "solved in numbers of 128 bits" in ended.out
    assert "double precision" in tm(*words[:-3], "free_energy", "--digits", "8").out


def test_a_matrix_too_large_for_longer_numbers_prints_what_is_known(tm, write, monkeypatch):
    monkeypatch.setattr("tmsolve.answer.classes.flint_module", lambda: None)
    path = write(
        "from tmsolve import Chain, bond, spins\n"
        "CHAIN = Chain(spins(3), [bond(lambda s, t, J: -J*s*t/9), bond(lambda s, t, K: -K*s*t/9, shift=2)])\n"
        "DEFAULTS = {'J': 1, 'K': 0.45, 'T': 1}\n"
    )
    ended = tm("solve", path, "--read", "free_energy", "--digits", "17")
    assert ended.code == 0 and "double precision" in ended.out
    row = next(line.split() for line in ended.out.splitlines() if line.startswith("free_energy"))
    assert 10 <= len(row[2].strip("-0").replace(".", "")) < 17


def test_help_says_how_digits_are_chosen(tm):
    text = " ".join(tm("solve", "--help").out.split())
    assert "digits they are known to" in text and 'bounds on their errors under "errors"' in text
    assert "computed with longer numbers where needed" in text
