"""Loading model files of one's own: what works, and what each mistake is answered with."""

import os
import sys
from fractions import Fraction

import pytest

from tmsolve import DeclarationError, colours, models

GOOD = """
from tmsolve import Chain, bond, site, spins

def chain(S="1", long=False, cut=2.5, share=__import__("fractions").Fraction(1, 3), reach=1):
    terms = [bond(lambda s, t, J: -J*s*t)]
    if long:
        terms.append(bond(lambda s, t, J2: -J2*s*t, shift=reach))
    return Chain(spins(S), terms)

DEFAULTS = {"J": 1, "T": "0.5"}
"""


@pytest.fixture
def write(tmp_path):
    def write(text, name="mine.py"):
        path = tmp_path / name
        path.write_text(text, encoding="utf-8")
        return path

    return write


def failure(path, **options):
    with pytest.raises(DeclarationError) as caught:
        models.load(path, **options)
    return str(caught.value)


# --- what works


def test_a_file_gives_a_chain_with_its_defaults(write):
    path = write('"""A chain of mine."""\n' + GOOD)
    model = models.load(path)
    assert (model.name, model.doc, model.source) == ("mine", "A chain of mine.", path)
    assert model.defaults == {"J": 1, "T": "0.5"}
    assert model.facts == ()
    assert model.options == {"S": "1", "long": False, "cut": 2.5, "share": Fraction(1, 3), "reach": 1}
    assert model.chain.parameters == ("J",)


def test_options_are_converted_by_the_type_of_their_default(write):
    model = models.load(str(write(GOOD)), S="3/2", long="yes", cut="1e3", share="2/7", reach="2")
    assert model.options == {"S": "3/2", "long": True, "cut": 1000.0, "share": Fraction(2, 7), "reach": 2}
    assert model.chain.parameters == ("J", "J2")


def test_a_relative_path_and_the_home_folder_are_understood(write, monkeypatch):
    path = write(GOOD)
    monkeypatch.chdir(path.parent)
    monkeypatch.setenv("HOME", str(path.parent))
    for text in ("mine.py", os.path.join(".", "mine.py"), "~/mine.py"):
        assert models.load(text).source == path


def test_dataclasses_and_postponed_annotations_work(write):
    path = write(
        "from __future__ import annotations\n"
        "from dataclasses import dataclass\n"
        "from tmsolve import Chain, StateSet, bond\n"
        "@dataclass(frozen=True)\n"
        "class Coupling:\n"
        "    strength: float = 2.0\n"
        "COUPLING = Coupling()\n"
        "CHAIN = Chain(StateSet([0, 1]), [bond(lambda s, t, J: -J*COUPLING.strength*s*t)])\n"
    )
    assert models.load(path).chain.parameters == ("J",)


def test_an_edit_is_seen_by_the_next_load(write):
    text = (
        "from tmsolve import Chain, bond, ising\nCHAIN = Chain(ising(), [bond(lambda s, t, {0}: -{0}*s*t)])\n"
    )
    path = write(text.format("J"))
    first = models.load(path)
    stamp = path.stat()
    write(text.format("K"))
    # Same size and same time stamp, as after a quick edit.
    os.utime(path, ns=(stamp.st_atime_ns, stamp.st_mtime_ns))
    assert models.load(path).chain.parameters == ("K",)
    assert first.chain.parameters == ("J",)
    assert first.chain.terms[0].function(1, 1, J=2) == -2


def test_loading_leaves_no_files_and_no_public_module_behind(write):
    path = write(GOOD)
    models.load(path)
    assert [entry.name for entry in path.parent.iterdir()] == ["mine.py"]
    assert "mine" not in sys.modules


def test_a_file_under_the_name_of_a_shipped_model_is_the_file(write):
    assert models.load(write(GOOD, "ising.py")).chain.parameters == ("J",)
    assert models.load("ising").chain.parameters == ("J", "h")


def test_a_loaded_model_is_frozen():
    with pytest.raises(AttributeError):
        models.load("ising").name = "other"


# --- which model


def test_a_misspelt_name_is_answered_with_the_nearest():
    assert "no shipped model 'pots'" in failure("pots")
    assert "Did you mean 'potts'?" in failure("pots")
    assert "blume_capel, blume_emery_griffiths" in failure("pots")


def test_a_name_without_its_ending_is_found_beside(write, monkeypatch):
    monkeypatch.chdir(write(GOOD).parent)
    assert "The file mine.py is here: write mine.py" in failure("mine")


def test_a_file_that_is_not_there(tmp_path):
    assert failure(tmp_path / "gone.py") == f"there is no file {tmp_path / 'gone.py'}"


def test_a_folder(tmp_path):
    (tmp_path / "folder.py").mkdir()
    assert "is a folder; a model is one Python file" in failure(tmp_path / "folder.py")


# --- a file that does not run


def test_a_line_that_raises_is_shown(write):
    path = write("from tmsolve import Chain\nvalue = 1\nratio = value / 0\n")
    message = failure(path)
    assert f"{path}, line 3: ratio = value / 0" in message
    assert "ZeroDivisionError: division by zero" in message


def test_a_syntax_error_is_shown(write):
    message = failure(write("from tmsolve import Chain\nCHAIN = Chain(\n"))
    assert "line 2: CHAIN = Chain(" in message
    assert "SyntaxError: '(' was never closed" in message


def test_a_misdeclared_chain_is_shown_with_its_line_and_reason(write):
    message = failure(write("from tmsolve import Chain, spins\nCHAIN = Chain(spins(1), 5)\n"))
    assert "line 2: CHAIN = Chain(spins(1), 5)" in message
    assert "DeclarationError" not in message


def test_an_error_inside_the_chain_function_is_shown(write):
    message = failure(write("def chain(q=3):\n    colours = undefined\n"), q=4)
    assert "line 2: colours = undefined" in message
    assert "NameError: name 'undefined' is not defined" in message


def test_a_file_that_exits_is_an_error(write):
    assert "line 2: sys.exit(3)" in failure(write("import sys\nsys.exit(3)\n"))


def test_an_import_of_a_neighbouring_file_is_explained(write):
    write("X = 1\n", "helper.py")
    message = failure(write("from helper import X\n"))
    assert "No module named 'helper'" in message
    assert "helper.py lies beside the model, but a model is one file" in message


def test_bytes_that_are_no_text(tmp_path):
    (tmp_path / "bad.py").write_bytes(b"x = '\xff\xfe'\n")
    assert "bad.py" in failure(tmp_path / "bad.py")


def test_a_failed_load_keeps_the_former_module(write):
    path = write(GOOD)
    before = models.load(path).chain
    name = before.terms[0].function.__module__
    kept = sys.modules[name]
    write("1/0\n")
    failure(path)
    assert sys.modules[name] is kept


# --- a file without a chain


def test_no_chain_at_all(write):
    assert "defines no chain: write CHAIN = Chain(...) or def chain(): ..." in failure(write("x = 1\n"))


def test_a_chain_under_the_lower_case_name(write):
    text = "from tmsolve import Chain, ising, bond\nchain = Chain(ising(), [bond(lambda s, t, J: -J*s*t)])\n"
    assert "it defines 'chain' as a value; call that CHAIN" in failure(write(text))


def test_both_forms(write):
    assert "defines both CHAIN and chain(); keep one" in failure(write("CHAIN = 1\ndef chain(): pass\n"))


def test_something_that_is_no_chain(write):
    assert "is 7, which is no Chain" in failure(write("CHAIN = 7\n"))
    assert "returned None, which is no Chain" in failure(write("def chain(q=3): pass\n"))


# --- options, defaults, facts


def test_an_option_for_a_model_that_takes_none():
    assert failure("ising", q=3) == "model ising takes no options, got q"


def test_an_unknown_option():
    message = failure("potts", Q=3)
    assert "model potts has no option 'Q'; it has q." in message
    assert "Did you mean 'q'?" in message


NO_WHOLE_NUMBERS = ["3.5", "", True, None, 2.5, [3], "1/0", float("inf"), float("nan")]


@pytest.mark.parametrize("value", [*NO_WHOLE_NUMBERS, "three"])
def test_a_value_of_the_wrong_type_for_a_whole_number(value):
    assert failure("clock", q=value) == f"option 'q' of model clock takes a whole number such as 6, got {value!r}"


@pytest.mark.parametrize("value", NO_WHOLE_NUMBERS)
def test_a_value_that_is_neither_a_whole_number_nor_a_name(value):
    assert (
        failure("potts", q=value)
        == f"option 'q' of model potts takes a whole number such as 3, or a name for it such as 'q', got {value!r}"
    )


@pytest.mark.parametrize("name", ["q", " q ", "colours"])
def test_a_name_for_a_whole_number(name):
    loaded = models.load("potts", q=name)
    assert loaded.options == {"q": name.strip()}
    assert loaded.chain.cell["s"] == colours(name.strip(), special=(0,))


@pytest.mark.parametrize("value", [5, "5", " 5 ", 5.0, Fraction(10, 2)])
def test_whole_numbers_in_any_writing(value):
    assert models.load("potts", q=value).options == {"q": 5}


def test_values_of_the_wrong_type_for_the_other_kinds(write):
    path = write(GOOD)
    assert "option 'long' of model mine takes yes or no such as False, got 'perhaps'" in failure(
        path, long="perhaps"
    )
    assert "option 'cut' of model mine takes a number such as 2.5, got 'far'" in failure(path, cut="far")
    assert "option 'share' of model mine takes a number such as Fraction(1, 3)" in failure(path, share="x")


def test_a_value_that_the_model_itself_refuses(write):
    assert "takes a whole number q >= 1, got 0" in failure("potts", q=0)


def test_a_missing_option(write):
    assert failure(write("def chain(q): pass\n")) == "model mine needs a value for its option 'q'"


def test_defaults_for_a_parameter_that_is_not_there(write):
    message = failure(write(GOOD.replace('{"J": 1', '{"j": 1')))
    assert "DEFAULTS of" in message and "gives 'j', but the chain has J, T. Did you mean 'J'?" in message


def test_defaults_and_facts_of_the_wrong_form(write):
    assert "give a mapping of names to values" in failure(write(GOOD + "DEFAULTS = 3\n"))
    assert "must be a tuple of mappings" in failure(write(GOOD + "FACTS = 3\n"))
