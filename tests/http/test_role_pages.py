"""Every role that a column can have stands on one page, in the order in which they are tried."""

from __future__ import annotations

import re
from html import unescape

from pathgate.review.roles import ROLES
from tests.http.test_pages import Links

ROW = re.compile(r"<tr id=\"([^\"]+)\"><th scope=\"row\"><code>([^<]+)</code></th><td>([^<]+)</td></tr>")


def test_each_role_is_explained_in_the_order_in_which_they_are_tried(service):
    reply = service.get("/docs/roles")
    assert reply.headers["Content-Type"] == "text/html; charset=utf-8"
    rows = [tuple(map(unescape, row)) for row in ROW.findall(reply.text)]
    assert rows == [(role, role, meaning) for role, meaning in ROLES.items()]


def test_every_role_in_an_answer_can_be_looked_up_there(service):
    # depot → late → refund ← order_value → late
    body = {
        "graph": {
            "nodes": ["depot", "late", "order_value", "refund"],
            "edges": [
                {"source": "depot", "target": "late"},
                {"source": "order_value", "target": "late"},
                {"source": "order_value", "target": "refund"},
                {"source": "late", "target": "refund"},
            ],
        },
        "config": {"treatment": "late", "outcome": "refund", "covariates": ["order_value", "depot"]},
    }
    told = {column["role"] for column in service.post("/v1/review", body).json["columns"]}
    assert told == {"treatment", "outcome", "confounder", "cause-of-treatment"}
    assert told <= set(Links(service.get("/docs/roles").text).ids)


def test_the_reference_leads_there_and_the_page_loads_nothing(service):
    assert "/docs/roles" in Links(service.get("/docs").text).links
    reply = service.get("/docs/roles")
    page = Links(reply.text)
    assert page.links == ["/docs"]
    assert page.loads == [("link", {"rel": "icon", "href": "data:,"})]
    assert reply.headers["Content-Security-Policy"].startswith("default-src 'none'; style-src 'sha256-")
    assert len(page.ids) == len(set(page.ids))
