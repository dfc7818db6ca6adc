"""Every example of the docstrings runs and says what stands there."""

import doctest
import importlib
import pkgutil

import pytest

import torsionfe

MODULES = ["torsionfe", *(found.name for found in pkgutil.walk_packages(torsionfe.__path__, "torsionfe."))]
#: A worker that speaks over its pipes, and the command: running them is not importing them.
NOT_IMPORTED = {"torsionfe.__main__"}


@pytest.mark.parametrize("name", [name for name in MODULES if name not in NOT_IMPORTED])
def test_examples_of(name, tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    module = importlib.import_module(name)
    failed, _ = doctest.testmod(module, optionflags=doctest.ELLIPSIS | doctest.NORMALIZE_WHITESPACE)
    assert failed == 0


def test_there_are_examples():
    finder = doctest.DocTestFinder(exclude_empty=True)
    modules = [importlib.import_module(name) for name in MODULES if name not in NOT_IMPORTED]
    count = sum(bool(test.examples) for module in modules for test in finder.find(module, module.__name__))
    assert count > 25
