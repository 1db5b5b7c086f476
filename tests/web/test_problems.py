"""The table of problems, and what becomes of faults and errors."""

from __future__ import annotations

import pytest

from pathgate.criteria.errors import OutOfTime
from pathgate.graphs.errors import Fault, InvalidGraph, PathgateError, UnknownNode
from pathgate.web.problems import PROBLEM_TYPES, Problem, problem_of, refusal

ID = "6ba7b810-9dad-41d1-80b4-00c04fd430c8"


def fault(slug: str, *place: str | int) -> Fault:
    return Fault(slug, place, f"{slug} at {place}")


def test_every_type_has_a_title_and_a_page_of_two_to_four_sentences():
    for slug, each in PROBLEM_TYPES.items():
        assert (each.slug, each.reference) == (slug, f"/problems/{slug}")
        assert 400 <= each.status < 600
        assert not each.title.endswith(".")
        assert 2 <= each.text.count(". ") + 1 <= 4, slug
    titles = [each.title for each in PROBLEM_TYPES.values()]
    assert len(set(titles)) == len(titles)


def test_faults_of_one_slug_make_a_problem_of_that_slug_and_of_several_an_invalid_request():
    assert refusal([fault("cycle"), fault("cycle", "graph")]).type.slug == "cycle"
    mixed = refusal([fault("cycle"), fault("unknown-node", "x")])
    assert (mixed.type.slug, mixed.type.status) == ("invalid-request", 422)


def test_the_first_cycle_becomes_a_member():
    faults = [
        fault("unknown-node"),
        Fault("cycle", ("graph",), "round", cycle=("a", "b", "a")),
        fault("cycle"),
    ]
    assert refusal(faults).members(ID, 10)["cycle"] == ["a", "b", "a"]


def test_faults_past_the_number_allowed_are_counted_and_not_listed():
    members = refusal([fault("cycle", place) for place in range(7)]).members(ID, 3)
    assert [each["pointer"] for each in members["errors"]] == ["#/0", "#/1", "#/2"]
    assert members["errors_omitted"] == 4
    assert "errors_omitted" not in refusal([fault("cycle")] * 3).members(ID, 3)


def test_members_come_in_a_fixed_order():
    members = Problem.of("not-json", "cut short", line=1, column=2).members(ID, 3)
    assert list(members) == ["type", "title", "status", "detail", "instance", "retryable", "line", "column"]
    assert members["instance"] == f"urn:uuid:{ID}"


@pytest.mark.parametrize(
    ("error", "slug"),
    [
        (InvalidGraph([fault("cycle", "edges")]), "cycle"),
        (UnknownNode(["wether"], {"wether": "weather"}), "unknown-node"),
        (OutOfTime(10), "too-costly"),
    ],
)
def test_an_error_of_a_lower_layer_becomes_the_problem_of_its_slug(error, slug):
    problem = problem_of(error)
    assert problem is not None
    assert (problem.type.slug, problem.type.status) == (slug, 422)


def test_an_error_with_a_slug_that_the_table_lacks_is_nobodys_fault_but_ours():
    class Unheard(PathgateError):
        slug = "unheard-of"

    assert problem_of(Unheard("what")) is None
