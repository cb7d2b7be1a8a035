"""The list of names, which loads no numpy, says exactly what the sky and the policies have."""

from __future__ import annotations

import subprocess
import sys
from zoneinfo import ZoneInfo

import pytest

from moonwrit.calendars import TABULAR_NAMES
from moonwrit.errors import RequestError
from moonwrit.policy import names
from moonwrit.policy.published import NamedPlace, published
from moonwrit.sky import criteria

ANYWHERE = NamedPlace("Anywhere", 10.0, 20.0, 0.0, ZoneInfo("UTC"))


def test_names_are_the_criteria_of_the_sky() -> None:
    """In the same order, with the same classes."""
    assert list(names.CRITERIA.items()) == [
        (name, tuple(grade.label for grade in test.grades)) for name, test in criteria.CRITERIA.items()
    ]
    assert all(test.name == name for name, test in criteria.CRITERIA.items())


def test_every_published_name_is_a_policy_and_no_two_are_alike() -> None:
    every = names.published_names()
    assert len(set(every)) == len(every)
    for name in every:
        policy = published(name, ANYWHERE)
        assert policy.name == name
        assert policy.source


def test_policies_of_criteria_leave_the_place_open() -> None:
    """All but those that name their own place or need none."""
    fixed = [*names.WHOLE_POLICIES, *TABULAR_NAMES]
    for name in names.published_names():
        if name in fixed:
            assert published(name).name == name
        else:
            with pytest.raises(RequestError, match="leaves the place open"):
                published(name)


def test_policies_of_classes_accept_down_to_theirs() -> None:
    """yallop-a to yallop-e and odeh-a to odeh-c have the limits of the published tables, in order."""
    limits = {"yallop-a": "> 0.216", "yallop-b": "> -0.014", "yallop-c": "> -0.16", "yallop-d": "> -0.232",
              "yallop-e": "> -0.293", "odeh-a": ">= 5.65", "odeh-b": ">= 2", "odeh-c": ">= -0.96"}
    assert [name for name in names.published_names() if name.startswith(("yallop-", "odeh-"))] == list(limits)
    for name, limit in limits.items():
        assert f" {limit}, at Anywhere" in published(name, ANYWHERE).in_words


def test_unverified_criteria_say_so() -> None:
    """Those whose paper could not be read carry the word wherever the policy is shown."""
    doubtful = {name for name, test in criteria.CRITERIA.items() if test.unverified}
    assert doubtful == {"saao-2001-probable", "saao-2001-possible", "ilyas-1988"}
    for name in names.published_names():
        assert ("Unverified" in published(name, ANYWHERE).note) == (name in doubtful)
        if name in doubtful:
            assert "not confirmed" in criteria.criterion(name).source


def test_names_load_no_numpy() -> None:
    code = "import sys, moonwrit.policy.names; sys.exit('numpy' in sys.modules or 'skyfield' in sys.modules)"
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0
