"""Every convention on the shelf, and the words in it."""

from __future__ import annotations

import xml.etree.ElementTree as Tree
from importlib.resources import files

import pytest

from gridcarb.fields import REQUIRED_ROLES, ROLES
from gridcarb.sources.conventions import CONVENTIONS, MEASURES, Convention


@pytest.mark.parametrize("key", list(CONVENTIONS))
def test_a_convention_is_sound(key: str) -> None:
    convention = CONVENTIONS[key]
    assert set(convention.words) <= {*ROLES, *MEASURES}
    assert set(convention.words) >= set(REQUIRED_ROLES)
    words = [word for known in convention.words.values() for word in known]
    assert len(words) == len(set(words))
    assert words == [word.lower() for word in words]
    assert convention.title in convention.how() or convention.attribute == "standard_name"


def test_ranks_differ_and_standard_names_come_first() -> None:
    orders = {convention.order: convention.attribute for convention in CONVENTIONS.values()}
    assert len(orders) == len(CONVENTIONS)
    assert orders[min(orders)] == "standard_name"


def test_no_name_stands_for_two_roles_in_two_conventions() -> None:
    owners: dict[str, set[str]] = {}
    for convention in CONVENTIONS.values():
        for role, words in convention.words.items():
            for word in words:
                owners.setdefault(word, set()).add(role)
    assert [word for word, roles in owners.items() if len(roles) > 1] == []


def test_standard_names_stand_in_the_official_table() -> None:
    table = Tree.fromstring((files("compliance_checker") / "data/cf-standard-name-table.xml").read_bytes())
    official = {entry.get("id") for entry in table.iter("entry")}
    used = {word for words in CONVENTIONS["cf"].words.values() for word in words}
    assert used - official == set()


def test_a_role_nobody_knows_is_refused() -> None:
    with pytest.raises(ValueError, match="no field 'salt'"):
        Convention("mine", "mine", 9, "name", {"salt": ("s",)})
