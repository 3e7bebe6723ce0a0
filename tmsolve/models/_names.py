"""Which models ship, and where their files lie."""

from __future__ import annotations

from pathlib import Path


def folders() -> list[Path]:
    """List the folders that hold model files: this one in a wheel, also the top-level one in a checkout."""
    here = Path(__file__).resolve().parent
    checkout = here.parents[1]
    if (checkout / "models").is_dir() and (checkout / "pyproject.toml").is_file():
        return [here, checkout / "models"]
    return [here]


def shipped() -> dict[str, Path]:
    """Map the name of every shipped model to its file, in alphabetical order."""
    files = {file.stem: file for folder in folders() for file in folder.glob("*.py")}
    return {name: files[name] for name in sorted(files) if not name.startswith("_")}


def names() -> tuple[str, ...]:
    """List the names of the shipped models, in alphabetical order.

    Examples
    --------
    >>> names()[:3]
    ('blume_capel', 'blume_emery_griffiths', 'clock')
    """
    return tuple(shipped())
