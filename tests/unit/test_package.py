"""The public names of the package: all there, loaded on first use, nothing else."""

from __future__ import annotations

import re

import pytest

import crowdsim


@pytest.mark.parametrize("name", crowdsim.__all__)
def test_every_public_name_is_there_and_documented(name: str) -> None:
    found = getattr(crowdsim, name)
    assert found.__name__ == name
    assert found.__doc__


def test_a_name_that_is_not_there_is_an_attribute_error() -> None:
    with pytest.raises(AttributeError, match="has no attribute 'simulat'"):
        crowdsim.simulat  # noqa: B018
    assert not hasattr(crowdsim, "numpy")


def test_the_version_is_a_version() -> None:
    assert re.fullmatch(r"\d+\.\d+\.\d+", crowdsim.__version__)
