"""Settings: one declaration, from which names, checks and the table come."""

from __future__ import annotations

from dataclasses import FrozenInstanceError, fields

import pytest

from pathgate.web.settings import InvalidSettings, Settings, environment_name, settings_table


def test_an_empty_environment_gives_the_defaults():
    settings = Settings.from_environment({})
    assert settings == Settings()
    assert (settings.max_nodes, settings.max_edges, settings.max_statements) == (20_000, 100_000, 5_000)
    assert settings.max_body_bytes == 8_000_000


@pytest.mark.parametrize("setting", fields(Settings), ids=lambda each: each.name)
def test_each_setting_is_read_from_its_variable_and_kept_within_its_bounds(setting):
    name = environment_name(setting.name)
    assert name == f"PATHGATE_{setting.name.upper()}"
    for value in (setting.metadata["least"], setting.metadata["most"]):
        assert getattr(Settings.from_environment({name: str(value)}), setting.name) == value
    for value in (setting.metadata["least"] - 1, setting.metadata["most"] + 1):
        with pytest.raises(InvalidSettings, match=name):
            Settings.from_environment({name: str(value)})


@pytest.mark.parametrize("written", ["", "many", "0x10", "1.5.0", "nan", "inf", "-inf", "1e400"])
def test_what_is_no_number_or_no_finite_one_is_refused(written):
    for name in ("PATHGATE_MAX_NODES", "PATHGATE_TIME_BUDGET_SECONDS"):
        with pytest.raises(InvalidSettings, match=name):
            Settings.from_environment({name: written})


def test_a_count_is_a_whole_number_and_a_time_need_not_be():
    with pytest.raises(InvalidSettings, match=r"'2\.5' is not a whole number"):
        Settings.from_environment({"PATHGATE_MAX_NODES": "2.5"})
    assert Settings.from_environment({"PATHGATE_TIME_BUDGET_SECONDS": "2.5"}).time_budget_seconds == 2.5


def test_all_that_is_wrong_is_said_at_once():
    environment = {
        "PATHGATE_MAX_NODES": "many",
        "PATHGATE_MAX_EDGES": "0",
        "PATHGATE_MAX_STATMENTS": "10",
        "PATHGATE_MAX_PAGE": "50",
    }
    with pytest.raises(InvalidSettings) as refused:
        Settings.from_environment(environment)
    assert refused.value.faults == (
        "PATHGATE_MAX_STATMENTS: no such setting (did you mean PATHGATE_MAX_STATEMENTS?)",
        "PATHGATE_MAX_NODES: 'many' is not a whole number",
        "PATHGATE_MAX_EDGES: 0 is not between 1 and 5,000,000",
    )


def test_variables_that_a_cluster_adds_for_a_service_of_our_name_are_let_be():
    environment = {"PATHGATE_PORT": "tcp://10.0.0.1:80", "PATHGATE_SERVICE_HOST": "10.0.0.1", "OTHER": "x"}
    assert Settings.from_environment(environment) == Settings()


def test_settings_made_in_code_are_checked_as_well():
    with pytest.raises(InvalidSettings, match="PATHGATE_MAX_DEPTH"):
        Settings(max_depth=0)


def test_settings_cannot_be_changed():
    with pytest.raises(FrozenInstanceError):
        Settings().max_nodes = 1  # type: ignore[misc]


def test_the_table_has_a_row_for_each_setting_with_default_bounds_and_text():
    rows = settings_table().splitlines()[2:]
    assert len(rows) == len(fields(Settings))
    for row, setting in zip(rows, fields(Settings), strict=True):
        for shown in (environment_name(setting.name), f"{setting.default:,}", setting.metadata["text"]):
            assert shown in row
