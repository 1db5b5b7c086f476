"""Every rule that a review can find broken has a page, as HTML and as JSON, and an index leads to it."""

from __future__ import annotations

import json
from dataclasses import asdict
from html import unescape

import pytest

from pathgate.review.rules import RULES, SEVERITIES, Rule
from pathgate.web.app import create_app
from pathgate.web.reference import Pages
from pathgate.web.settings import Settings
from tests.http.test_pages import Links


def words(page: str) -> str:
    return unescape(page.replace("<code>", "`").replace("</code>", "`"))


@pytest.mark.parametrize("name", RULES)
def test_a_rule_has_a_page_that_says_all_that_is_known_of_it(service, name):
    rule = RULES[name]
    reply = service.get(rule.page)
    assert reply.headers["Content-Type"] == "text/html; charset=utf-8"
    text = words(reply.text)
    for said in (rule.meaning, rule.why_it_matters, rule.example, rule.what_to_do, SEVERITIES[rule.severity]):
        assert said in text
    assert ("cannot be waived" in text) != rule.may_be_waived


@pytest.mark.parametrize("name", RULES)
def test_a_program_gets_the_same_as_json(service, name):
    reply = service.get(f"/docs/rules/{name}", headers={"Accept": "application/json"})
    assert reply.json == asdict(RULES[name])


def test_the_index_leads_to_every_rule_and_the_reference_leads_to_the_index(service):
    links = Links(service.get("/docs/rules").text).links
    assert [link for link in links if link != "/docs"] == sorted(
        (rule.page for rule in RULES.values()),
        key=lambda page: list(SEVERITIES).index(RULES[page.rpartition("/")[2]].severity),
    )
    assert "/docs/rules" in Links(service.get("/docs").text).links


@pytest.mark.parametrize(
    "path", ["/docs/rules", "/docs/rules/filter-on-collider", "/docs/rules/waiver-unused"]
)
def test_a_page_loads_nothing_and_its_links_lead_somewhere(service, path):
    reply = service.get(path)
    page = Links(reply.text)
    assert page.loads == [("link", {"rel": "icon", "href": "data:,"})]
    assert reply.headers["Content-Security-Policy"].startswith("default-src 'none'; style-src 'sha256-")
    assert len(page.ids) == len(set(page.ids))
    for link in page.links:
        assert service.get(link).status_code == 200


@pytest.mark.parametrize("path", ["/docs/rules/none", "/docs/rules/", "/docs/rules/Filter-On-Collider"])
def test_an_unknown_rule_is_not_found(service, path):
    reply = service.get(path)
    assert (reply.status_code, json.loads(reply.data)["type"]) == (404, "/problems/not-found")


def test_words_of_rules_are_escaped():
    hostile = "<script>alert(1)</script> & `<b>`"
    app = create_app(Settings())
    pages = Pages(app.jinja_env, {})
    text = pages.rule(Rule("<i>", "error", hostile, hostile, hostile, hostile))
    assert "<script>" not in text
    assert "<b>" not in text
    assert "<i>" not in text
    assert text.count("<code>&lt;b&gt;</code>") == 4
