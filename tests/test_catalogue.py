"""The catalogue is derived from the functions, and what hosts need of it holds."""

from __future__ import annotations

import inspect
import keyword
import re

import pytest

from beamfuncs import functions
from beamfuncs.catalogue import RETURNS, catalogue
from beamfuncs.documentation import PARAMETERS, sections

NAMES = list(catalogue())


def test_every_public_function_of_the_module_is_in_the_catalogue() -> None:
    """A function that is written is a function that every host has."""
    written = {
        name
        for name, value in vars(functions).items()
        if getattr(value, "__worksheet__", False) and not name.startswith("_")
    }
    assert written == set(NAMES)


def test_no_function_is_left_unmarked() -> None:
    """Every public function that the module itself defines is a worksheet function, and so is one that it takes in."""
    defined = {
        name
        for name, value in vars(functions).items()
        if inspect.isfunction(value) and value.__module__ == functions.__name__ and not name.startswith("_")
    }
    assert defined <= set(NAMES)
    assert "combinations" in NAMES
    assert "combinations" not in defined


@pytest.mark.parametrize("name", NAMES)
def test_docstrings_are_contracts(name: str) -> None:
    """One line that says what is returned; every argument; returns, errors, an example that runs."""
    entry = catalogue()[name]
    told = sections(entry.documentation)
    assert entry.summary.startswith("Return ")
    assert entry.summary.endswith(".")
    assert {"Parameters", "Returns", "Raises", "Examples"} <= set(told)
    assert re.search(rf">>> .*{name}\(", told["Examples"])
    assert entry.returns in RETURNS.values()
    if {"beam", "loads", "stiffness"} <= {a.name for a in entry.arguments}:
        assert "direct stiffness method" in told["Notes"]


@pytest.mark.parametrize("name", NAMES)
def test_hosts_can_show_every_function(name: str) -> None:
    """Help fits the 255 characters of a host; names are plain and no keyword; optional arguments come last."""
    entry = catalogue()[name]
    assert len(entry.summary) <= 255
    for argument in entry.arguments:
        assert 0 < len(argument.help) <= 255
        assert argument.name.isidentifier()
        assert argument.name.islower()
        assert not keyword.iskeyword(argument.name)
    optional = [argument.optional for argument in entry.arguments]
    assert optional == sorted(optional)


def test_shared_arguments_are_described_once() -> None:
    """No function writes again what the shared descriptions say."""
    for entry in catalogue().values():
        for argument in entry.arguments:
            if argument.name in PARAMETERS:
                assert argument.help == PARAMETERS[argument.name]


def test_arguments_stand_in_one_order_everywhere() -> None:
    """Beam, loads, what is asked, combinations, points, stiffness, combination, and which extreme."""
    order = [
        "beam",
        "beams",
        "loads",
        "support",
        "phrase",
        "phrases",
        "values",
        "x",
        "span",
        "combinations",
        "points",
        "stiffness",
        "combination",
    ]
    order.append("side")
    of_its_own = {
        "part",
        "from_unit",
        "to_unit",
        "standard",
        "actions",
        "leading",
        "factors",
        "target",
        "low",
        "high",
        "which",
    }
    for entry in catalogue().values():
        names = [a.name for a in entry.arguments]
        assert set(names) <= {*order, *of_its_own}
        known = [name for name in names if name in order]
        assert known == sorted(known, key=order.index)
        if {"loads", "stiffness", "combination"} & set(names):
            assert known[0] in ("beam", "beams")


@pytest.mark.parametrize("name", ["highest", "lowest", "governing"])
def test_extremes_take_their_arguments_alike(name: str) -> None:
    """One call can be turned into the other by its name alone."""
    names = [a.name for a in catalogue()[name].arguments]
    assert names[:5] == ["beam", "loads", "phrase", "combinations", "stiffness"]
