# SPDX-License-Identifier: GPL-3.0-or-later
"""/metrics read by prometheus-client's own strict parser; every value the report's; the alert rules name what is there."""

import os
import pathlib
import re

import pytest
import sample_reports
import yaml
from page_server import FULL, serving
from page_client import get
from prometheus_client import REGISTRY
from prometheus_client.openmetrics.parser import text_string_to_metric_families

from gnuradio.halfplane.page.metrics import LOCK_STATES, Collector

MONITORING = pathlib.Path(os.environ["HALFPLANE_SOURCE_DIR"]) / "examples" / "monitoring"


def families(text):
    return {family.name: family for family in text_string_to_metric_families(text)}


def values(text):
    """{(sample, label values…): value}."""
    return {(sample.name, *sample.labels.values()): sample.value for family in families(text).values() for sample in family.samples}


def text_of(report, reports=1):
    return Collector(lambda: (report, reports)).text().decode()


def test_the_answer_is_openmetrics():
    with serving() as server:
        server.publish(FULL)
        status, headers, body = get(server, "/metrics")
    assert status == 200 and headers["Content-Type"].startswith("application/openmetrics-text; version=")
    assert body.endswith(b"# EOF\n")
    found = families(body.decode())
    assert all(name.startswith("halfplane_") for name in found)
    assert not [name for name in found if REGISTRY._names_to_collectors.get(name)]  # a registry of its own


def test_every_value_is_the_reports():
    found, total = values(text_of(FULL)), FULL["total"]
    for name, key in (("symbols_in", "in"), ("symbols_judged", "judged"), ("symbols_nonfinite", "nonfinite"), ("symbol_errors", "symbol_errors"),
                      ("bits", "bits"), ("bit_errors", "bit_errors"), ("slips", "slips")):  # fmt: skip
        assert found[f"halfplane_{name}_total",] == total[key]
    for cause, number in total["excluded"].items():
        assert found["halfplane_symbols_excluded_total", cause] == number
    assert found["halfplane_symbols_pending",] == total["pending"]
    for kind in ("ser", "ber"):
        for end in ("", "_low", "_high"):
            assert found[f"halfplane_error_rate{end}_ratio", kind, "run"] == total[kind + end]
        for rung, rates in total["predicted"].items():
            assert found["halfplane_predicted_error_rate_ratio", kind, "run", rung] == rates[kind]
    assert found["halfplane_es_n0_decibels", "run"] == total["es_n0_db"]
    assert found["halfplane_input_es_n0_decibels",] == FULL["input"]["es_n0_db"]
    for place, fall in FULL["shortfall"].items():
        for end in ("", "_low", "_high"):
            assert found[f"halfplane_shortfall{end}_decibels", place] == fall["db" + end]
    for each in FULL["losses"]:
        assert found["halfplane_loss_decibels", each["cause"]] == each["cost_db"]
    for state in LOCK_STATES:
        assert found["halfplane_lock", state] == (state == FULL["lock"]["state"])
    assert found["halfplane_verdict", "undecided"] == 1 and found["halfplane_verdict", "pass"] == 0
    assert found["halfplane_symbols_to_go",] == FULL["verdict"]["symbols_to_go"]
    assert found["halfplane_premise_fails", "white"] == 1 and found["halfplane_premise_fails", "circular"] == 0
    assert found["halfplane_errored_seconds_total",] == FULL["seconds"]["errored"]


def test_types_and_units():
    found = families(text_of(FULL))
    for name, family in found.items():
        counts = name in ("halfplane_reports", "halfplane_bits", "halfplane_slips") or name.endswith(
            ("_in", "_judged", "_nonfinite", "_excluded", "_errors", "errored_seconds", "unavailable_seconds")
        )
        assert (family.type == "counter") == counts, name
        if family.unit:
            assert name.endswith("_" + family.unit) and family.unit in ("decibels", "ratio", "seconds")
        assert family.documentation
    assert found["halfplane_lock"].type == "stateset" and found["halfplane_link"].type == "info"


@pytest.mark.parametrize("report", [{}, sample_reports.silent(), sample_reports.searching(), {"set": 'a"b\\c\nd', "total": {"in": 2**63}}])
def test_what_is_not_known_has_no_sample(report):
    found = values(text_of(report))
    if "shortfall" not in report:
        assert not [name for name, *_ in found if "shortfall" in name]
    if "ser_low" not in report.get("total", {}):
        assert not [name for name, *_ in found if name == "halfplane_error_rate_low_ratio"]
    assert all(value == value and abs(value) != float("inf") for value in found.values())


def test_age_counts_from_the_latest_report(monkeypatch):
    from gnuradio.halfplane.page import metrics

    now = [100.0]
    monkeypatch.setattr(metrics.time, "monotonic", lambda: now[0])
    collector = Collector(lambda: (FULL, 1))
    collector.reported(1)
    now[0] = 142.5
    assert values(collector.text().decode())["halfplane_report_age_seconds",] == 42.5


def test_the_rules_name_metrics_that_are_there():
    """Names in every expression against the samples of a full report; `up` is Prometheus' own."""
    samples = {sample.name for family in families(text_of(FULL)).values() for sample in family.samples}
    labels = {key for family in families(text_of(FULL)).values() for sample in family.samples for key in sample.labels}
    rules = [rule for group in yaml.safe_load((MONITORING / "link_alerts.yml").read_text())["groups"] for rule in group["rules"]]
    assert {"LinkFallsShort", "LinkLockLost"} <= {rule["alert"] for rule in rules}
    for rule in rules:
        expression = re.sub(r'"[^"]*"', '""', rule["expr"])
        for selector in re.findall(r"\{([^}]*)\}", expression):
            assert {part.split("=")[0].rstrip("!~").strip() for part in selector.split(",")} <= labels | {"job"}, rule["alert"]
        names = set(re.findall(r"\b(?:halfplane_[a-z0-9_]+)\b", re.sub(r"\{[^}]*\}", "", expression)))
        assert names and names <= samples, rule["alert"]
        for value in re.findall(r'halfplane_(?:lock|verdict)=~?"([^"]*)"', rule["expr"]):
            assert set(value.split("|")) <= {*LOCK_STATES, "pass", "fail", "undecided"}
        assert rule["annotations"]["summary"] and rule["labels"]["severity"] in ("warning", "critical")
    falls = next(rule for rule in rules if rule["alert"] == "LinkFallsShort")
    assert falls["for"] == "5m" and falls["expr"].endswith("> 1")


def test_the_scrape_example_reads_the_page_as_it_is_by_default():
    from inspect import signature

    from gnuradio.halfplane.page.server import Server

    example = yaml.safe_load((MONITORING / "prometheus.yml").read_text())
    assert all((MONITORING / name).exists() for name in example["rule_files"])
    (job,) = example["scrape_configs"]
    defaults = signature(Server).parameters
    assert job["metrics_path"] == "/metrics"
    assert job["static_configs"][0]["targets"] == [f"{defaults['address'].default}:{defaults['port'].default}"]


def test_symbols_that_nobody_can_judge():
    report = sample_reports.partly()
    found, total = values(text_of(report)), report["total"]
    assert found["halfplane_symbols_live_total",] == total["live"]
    assert found["halfplane_symbols_decoded_total",] == total["decoded"]
    assert found["halfplane_es_n0_decibels", "live"] == total["live_part"]["es_n0_db"]
    assert found["halfplane_predicted_error_rate_ratio", "ser", "live", "exact"] == total["live_part"]["predicted"]["exact"]["ser"]
    assert found["halfplane_error_rate_ratio", "ser", "decoded"] == total["decoded_part"]["ser"]
    assert ("halfplane_error_rate_ratio", "ser", "live") not in found
