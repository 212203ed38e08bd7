# SPDX-License-Identifier: GPL-3.0-or-later
"""
The acceptance report as one HTML file that loads nothing: to read on a screen, to print, or to turn into PDF. The same
document gives the same bytes; no time of writing stands in it.
"""

from __future__ import annotations

from html import escape

from .. import views
from ..views import basis, svg, themes, words
from . import style
from .document import SAME_POINT_DB, es_n0_db

_MOST_POINTS_LISTED = 256
_WIDE = (720.0, 260.0)


def html(document: dict, trace: views.Trace, theme: str = "light", for_print: bool = False) -> str:
    """
    document: of document.of_logs. trace: of the same logs. theme: "light", "dark" or "system" (as the reader's system has
    it). for_print: colours written out and no navigation, for a converter to PDF.
    """
    made = _Page(document, trace, "light" if for_print else "page")
    sections = [*made.summary(), *made.measured(), *made.over_time(), *made.each_point(), *made.constellation(), *made.evidence()]
    title = escape(document.get("job") or "Acceptance report")
    links = "" if for_print else "".join(f'<a href="#{key}">{escape(head)}</a>' for key, head, _ in sections)
    body = "".join(f'<section id="{key}"{" class=point" if key.startswith("point") and key != "points" else ""}><h2>{escape(head)}</h2>\n{content}</section>\n' for key, head, content in sections)
    colours = themes.stylesheet() if not for_print else f":root{{{themes.properties('light')}}}\n"
    return (
        f'<!DOCTYPE html>\n<html lang="en" data-theme="{theme}">\n<head>\n<meta charset="utf-8">\n'
        "<meta http-equiv=\"Content-Security-Policy\" content=\"default-src 'none'; style-src 'unsafe-inline'\">\n"
        '<meta name="viewport" content="width=device-width, initial-scale=1">\n<meta name="generator" content="halfplane">\n'
        f"<title>{title}</title>\n<style>\n{colours}{style.CSS if not for_print else style.resolved()}</style>\n</head>\n<body>\n"
        f"<header><h1>{title}</h1>\n{made.banner()}</header>\n" + (f'<nav aria-label="Sections">{links}</nav>\n' if links else "") + f"<main>\n{body}</main>\n</body>\n</html>\n"
    )


class _Page:
    def __init__(self, document: dict, trace: views.Trace, theme: str):
        self.document, self.trace, self.theme = document, trace, theme
        self.figures = 0
        self.settings = document.get("settings")
        self.points = document["points"]
        self.reports = [point["report"] for point in self.points]
        self.against = document.get("against", {}).get("points")

    def figure(self, drawing, caption: str = "") -> str:
        text = f"<figcaption>{escape(caption)}</figcaption>" if caption else ""
        self.figures += 1
        return f"<figure>{svg.render(drawing, self.theme, str(self.figures))}{text}</figure>\n"

    def banner(self) -> str:
        state = self.document.get("verdict")
        role, said = {
            "pass": ("good", "Passed"), "fail": ("bad", "Failed"), "undecided": ("open", "Undecided"),
        }.get(state, ("quiet", "Measured; no target was given"))  # fmt: skip
        several = f", {len(self.points)} points in all" if len(self.points) > 1 else ""
        return f'<p class="banner {role}">{said}{several}</p>\n'

    def summary(self):
        last = self.reports[-1]
        content = ""
        if len(self.points) == 1:
            content += self.figure(views.heading(last))
        settings = self.settings or {}
        facts = [
            ("Set", last.get("set")),
            ("Points", len(settings["points"]) if "points" in settings else None),
            ("Pattern", last.get("pattern")),
            ("Channel law of the prediction", last.get("law")),
            ("Detector", {"map": "maximum a posteriori", "ml": "nearest point"}.get(last.get("detector"), last.get("detector"))),
            ("Decisions", {"own": "made here from the samples", "receiver": "the receiver's own"}.get(last.get("decisions"))),
            ("Confidence of intervals", f"{100 * last['confidence']:g} %" if "confidence" in last else None),
            ("Symbol rate", f"{words.count(settings['symbol_rate'])} symbols/s" if "symbol_rate" in settings else None),
            ("Window", f"{words.count(settings['window'])} symbols" if "window" in settings else None),
            ("Target", _target(settings.get("target"))),
            ("Measured", _span(self.points[0].get("first_time"), last.get("time"))),
            ("Software that measured", f"halfplane {last['version']}" if "version" in last else None),
            ("Software that wrote this", f"halfplane {self.document['version']}"),
        ]
        rows = "".join(f"<tr><th scope=row>{escape(name)}</th><td>{escape(str(value))}</td></tr>" for name, value in facts if value)
        known = {"set", "points", "labels", "priors", "pattern", "law", "detector", "decisions", "confidence", "symbol_rate", "window", "target"}
        for key in sorted(set(settings) - known):
            rows += f"<tr><th scope=row>{escape(words.name(key).capitalize())}</th><td>{escape(_plain(settings[key]))}</td></tr>"
        yield "summary", "What was measured", content + f'<table class="facts"><tbody>{rows}</tbody></table>\n'

    def measured(self):
        content = "".join(_rates_table(self.reports, kind, self.against) for kind in ("ser", "ber"))
        content += _shortfall_table(self.reports, self.against) + _apart_table(self.reports)
        if self.against is not None:
            stored = self.document["against"]
            job = f" ({stored['job']})" if "job" in stored else ""
            content += f"<p class=note>Baseline: {escape(stored['file'] + job)}, a stored run; its point within {SAME_POINT_DB} dB of the same Es/N0 stands beside each.</p>\n"
        if self.settings:
            content += '<div class="pair">' + "".join(self.figure(views.curve(self.reports, self.settings, (520, 430), kind)) for kind in ("ser", "ber")) + "</div>\n"
        yield "points", "Measured points", content

    def over_time(self):
        yield "history", "History", self.figure(views.history(self.trace, self.settings, (720, 280)))

    def each_point(self):
        for k, report in enumerate(self.reports):
            at, place = es_n0_db(report)
            where = {"input": "at the input", "decision": "as gauged"}[place]
            head = f"Es/N0 {words.db(at)} dB {where}" if at is not None else "Es/N0 " + words.UNKNOWN
            number = f"Point {k + 1} of {len(self.points)}: " if len(self.points) > 1 else ""
            content = self.figure(views.heading(report)) if len(self.points) > 1 else ""
            content += self.figure(views.ladder(report, self.settings, _WIDE), "Measured rates with their intervals among the predicted ones")
            content += '<div class="pair">'
            if self.settings:
                content += self.figure(views.decision_map(report, self.settings, (400, 440)), "Errors cell by cell against expectation")
            narrow = (400.0, 0.0)
            content += "<div>" + self.figure(views.losses(report, self.settings, narrow), "Where the decibels go")
            content += self.figure(views.account(report, self.settings, narrow), "Account, premises, verdict") + "</div></div>"
            yield f"point{k + 1}", number + head, content

    def constellation(self):
        link = basis.of(self.settings)
        if link is None:
            return
        content = self.figure(views.decision_map({}, self.settings, (520, 570) if link.set.size <= 64 else (720, 770), labels=True), "The set with its labels and decision cells")
        s = link.set
        if s.size <= _MOST_POINTS_LISTED:
            head = "<tr><th scope=col>index</th><th scope=col>label</th><th scope=col>in phase</th><th scope=col>quadrature</th><th scope=col>prior</th></tr>"
            rows = "".join(
                f"<tr><td>{i}</td><td><code>{label}</code></td><td>{p.real:.6g}</td><td>{p.imag:.6g}</td><td>{prior:.6g}</td></tr>"
                for i, (label, p, prior) in enumerate(zip(s.label_strings, s.points, s.priors))
            )
            content += f'<table class="numbers points"><thead>{head}</thead><tbody>{rows}</tbody></table>\n'
        content += f"<p class=note>Es {s.es:.6g}, entropy {s.entropy_bits:.6g} bits a symbol, {s.label_bits} label bits, smallest distance {s.d_min:.6g}.</p>\n"
        yield "set", "The constellation", content

    def evidence(self):
        rows = "".join(
            f"<tr><td>{escape(log['file'])}</td><td>{words.count(log['reports'])}</td><td>{words.count(log['bytes'])}</td><td class=hash><code>{log['sha256']}</code></td></tr>"
            for log in self.document["logs"]
        )
        head = "<tr><th scope=col>log</th><th scope=col>reports</th><th scope=col>bytes</th><th scope=col>SHA-256</th></tr>"
        content = f'<table class="evidence"><thead>{head}</thead><tbody>{rows}</tbody></table>\n'
        for log in self.document["logs"]:
            if "torn_lines" in log:
                lines = ", ".join(map(str, log["torn_lines"]))
                content += f"<p class=note>{escape(log['file'])}: not whole and left out: line {lines}.</p>\n"
        digests = sorted({report["settings_sha256"] for report in self.reports if "settings_sha256" in report})
        content += "".join(f"<p class=note>SHA-256 of the settings: <code>{escape(digest)}</code></p>\n" for digest in digests)
        if "against" in self.document:
            content += f"<p class=note>SHA-256 of the baseline: <code>{self.document['against']['sha256']}</code></p>\n"
        content += "<p class=note>Points: " + "; ".join(
            f"{k + 1} is {escape(self.document['logs'][point['log']]['file'])}, lines {point['lines'][0]} to {point['lines'][1]}" for k, point in enumerate(self.points)
        ) + ".</p>\n"  # fmt: skip
        yield "evidence", "Evidence", content


def _target(text: str | None) -> str | None:
    """'SER below 0.02' of 'ser:2e-2'."""
    kind, _, value = (text or "").partition(":")
    try:
        return words.target({kind: float(value)}) if value else None
    except ValueError:
        return text


def _span(first: str | None, last: str | None) -> str | None:
    return first if first == last or not last else f"{first} to {last}" if first else last


def _plain(value) -> str:
    if isinstance(value, dict):
        return ", ".join(f"{words.name(key)} {_plain(each)}" for key, each in value.items())
    if isinstance(value, float):
        return f"{value:g}"
    return str(value)


def _cells(values) -> str:
    return "".join(f"<td>{escape(value)}</td>" for value in values)


def _head(columns) -> str:
    return "<tr>" + "".join(f"<th scope=col>{escape(column)}</th>" for column in columns) + "</tr>"


def _rates_table(reports, kind: str, against) -> str:
    rungs = [words.rung(rung, kind) for rung in words.RUNGS]
    columns = ["Es/N0 at the input, dB", "as gauged, dB", "errors", kind.upper(), "interval", *rungs, *(["baseline"] if against is not None else [])]
    rows = ""
    for k, report in enumerate(reports):
        total = report.get("total", {})
        predicted = total.get("predicted", {})
        gauged = words.db(total.get("es_n0_db")) + (f" ± {total['es_n0_db_se']:.2g}" if "es_n0_db_se" in total else "")
        values = [
            words.db(report.get("input", {}).get("es_n0_db")), gauged,
            words.count(total.get({"ser": "symbol_errors", "ber": "bit_errors"}[kind], 0)), words.rate(total.get(kind)),
            words.interval(total.get(kind + "_low"), total.get(kind + "_high")),
            *(words.rate(predicted.get(rung, {}).get(kind)) for rung in words.RUNGS),
        ]  # fmt: skip
        if against is not None:
            values.append(words.rate(against[k][kind]) if kind in against[k] else "none")
        rows += f"<tr>{_cells(values)}</tr>"
    caption = words.KINDS[kind].capitalize()
    return f'<table class="numbers"><caption>{caption}</caption><thead>{_head(columns)}</thead><tbody>{rows}</tbody></table>\n'


def _apart_table(reports) -> str:
    """Live traffic and what is known only by decoding: neither is among the symbols judged. "" where there is none of either."""
    rows = ""
    for k, report in enumerate(reports):
        total = report.get("total", {})
        live, decoded = total.get("live_part", {}), total.get("decoded_part", {})
        for what, part, errors in (
            ("live, gauged blindly", live, "cannot be counted"),
            ("known by decoding alone", decoded, words.count(decoded.get("symbol_errors", 0)) + "; frames that failed are missing"),
        ):  # fmt: skip
            if part.get("symbols"):
                predicted = part.get("predicted", {}).get("exact", {})
                values = [str(k + 1), what, words.count(part["symbols"]), words.gauged(part), words.rate(predicted.get("ser")), words.rate(predicted.get("ber")), errors]
                rows += f"<tr>{_cells(values)}</tr>"
    if not rows:
        return ""
    columns = ["point", "symbols not judged", "number", "Es/N0", "SER predicted", "BER predicted", "symbol errors"]
    return f'<table class="numbers"><caption>Live traffic, and what is known by decoding alone</caption><thead>{_head(columns)}</thead><tbody>{rows}</tbody></table>\n'


def _shortfall_table(reports, against) -> str:
    columns = ["Es/N0 at the input, dB", "judged", "left out", "shortfall at the decision", "at the input", "verdict"]
    columns += ["change at the decision", "change at the input"] if against is not None else []
    rows = ""
    for k, report in enumerate(reports):
        total, short = report.get("total", {}), report.get("shortfall", {})
        values = [
            words.db(report.get("input", {}).get("es_n0_db")), words.count(total.get("judged", 0)),
            words.count(sum(total.get("excluded", {}).values())), words.shortfall(short.get("decision", {})), words.shortfall(short.get("input", {})),
            words.verdict(report["verdict"]) if "verdict" in report else "no target",
        ]  # fmt: skip
        if against is not None:
            changes = against[k].get("shortfall_change_db", {})
            values += [words.shortfall(changes[place]) if place in changes else "none" for place in ("decision", "input")]
        rows += f"<tr>{_cells(values)}</tr>"
    title = "Shortfall against what the constellation permits" + (", and its change since the baseline" if against is not None else "")
    return f'<table class="numbers"><caption>{title}</caption><thead>{_head(columns)}</thead><tbody>{rows}</tbody></table>\n'
