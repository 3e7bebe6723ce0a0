"""Help texts."""

import pytest

from tmsolve.cli.overview import COMMANDS


def test_the_overview_names_commands_and_exit_codes(tm):
    out = tm("--help").out
    for command, purpose in COMMANDS.items():
        assert command in out and purpose in out
    assert "3 some points failed" in out and "k_B = 1" in out
    assert out == tm("-h").out


@pytest.mark.parametrize("command", COMMANDS)
def test_every_command_explains_its_options_with_examples(tm, command, monkeypatch):
    monkeypatch.setenv("COLUMNS", "80")
    ended = tm(command, "--help")
    assert ended.code == 0 and ended.err == ""
    assert ended.out.startswith(f"usage: tmsolve {command} ")
    head, _, examples = ended.out.partition("examples:\n")
    assert all(line.startswith("  tmsolve " + command) for line in examples.splitlines())
    assert len(examples.splitlines()) >= 2
    assert max(map(len, ended.out.splitlines())) <= 110
    for line in head.splitlines():
        # An option without a word on what it means would be a line that ends with its placeholder.
        if line.startswith("  -") and len(line) < 28:
            following = head.splitlines()[head.splitlines().index(line) + 1]
            assert following.startswith(" " * 28), line


@pytest.mark.parametrize("words", [["--version"], ["solve", "--version"], ["scan", "--version"]])
def test_version(tm, words):
    import tmsolve

    ended = tm(*words)
    assert ended.code == 0 and ended.out == f"tmsolve {tmsolve.__version__}\n"


@pytest.mark.parametrize("command", COMMANDS)
def test_the_examples_are_commands_that_parse(command):
    import importlib
    import shlex

    from tmsolve.cli.parser import Parser

    module = importlib.import_module(f"tmsolve.cli.{command}")
    for line in module.EXAMPLES.splitlines():
        words = shlex.split(line)
        parser = Parser(command, module.OPERANDS, module.DESCRIPTION, module.EXAMPLES)
        module.configure(parser)
        assert words[:2] == ["tmsolve", command]
        parser.read(words[2:])
