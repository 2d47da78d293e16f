"""A report as SARIF 2.1.0 (OASIS Standard, 27 March 2020), for tools that gather findings."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import PurePath
from typing import Any
from urllib.parse import quote

import msgspec

from reactance.analysis.design import Design, Place
from reactance.analysis.report import Check, Report
from reactance.daemon.text import bounds, figure

_SCHEMA = "https://docs.oasis-open.org/sarif/sarif/v2.1.0/errata01/os/schemas/sarif-schema-2.1.0.json"
# SARIF 3.27.10: `error` is serious, `warning` less so, `note` minor.
_LEVELS = {"fail": "error", "marginal": "warning", "unknown": "note"}
_PROBLEM_LEVELS = {"error": "error", "caution": "warning", "note": "note"}
_PROBLEM_RULE = "problem"


def sarif(report: Report, design: Design, version: str) -> bytes:
    """The checks that fail, are marginal or could not be computed, and the problems found, as one SARIF log."""
    findings = [check for check in report.checks if check.status in _LEVELS]
    rules = sorted({check.measure for check in findings} | ({_PROBLEM_RULE} if report.problems else set()))
    results = [*_checks(findings, design), *_problems(report, design)]
    log = {
        "$schema": _SCHEMA,
        "version": "2.1.0",
        "runs": [
            {
                "tool": {
                    "driver": {
                        "name": "reactance",
                        "version": version,
                        "rules": [{"id": rule} for rule in rules],
                    }
                },
                "artifacts": [{"location": {"uri": _uri(design.file)}, "hashes": {"sha-256": report.design.sha256}}],
                "columnKind": "unicodeCodePoints",
                "results": [{**result, "ruleIndex": rules.index(result["ruleId"])} for result in results],
            }
        ],
    }
    return msgspec.json.format(msgspec.json.encode(log), indent=2) + b"\n"


def _checks(findings: list[Check], design: Design) -> Iterator[dict[str, Any]]:
    for check in findings:
        yield {
            "ruleId": check.measure,
            "level": _LEVELS[check.status],
            "message": {"text": _sentence(check)},
            "locations": [_location(design, check.id)],
            "partialFingerprints": {"check/v1": check.id},
        }


def _sentence(check: Check) -> str:
    words = f"{check.id} is {figure(check.nominal, check.unit)}"
    if check.limit is not None:
        words += f", limit {bounds(check.limit, check.unit)}"
    return f"{words}. {check.explain}" if check.explain else f"{words}."


def _problems(report: Report, design: Design) -> Iterator[dict[str, Any]]:
    for problem in report.problems:
        where = f"{problem.where}: " if problem.where else ""
        yield {
            "ruleId": _PROBLEM_RULE,
            "level": _PROBLEM_LEVELS[problem.severity],
            "message": {"text": f"{where}{problem.message}"},
            "locations": [_location(design, f"part:{problem.where}:")],
        }


def _location(design: Design, check_id: str) -> dict[str, Any]:
    """Where the part or net that a check is about stands in the export."""
    place = _place(design, check_id)
    physical: dict[str, Any] = {"artifactLocation": {"uri": _uri(place.file if place else design.file)}}
    if place is not None and place.line is not None:
        physical["region"] = {"startLine": place.line}
        if place.column is not None:
            physical["region"]["startColumn"] = place.column
    return {"physicalLocation": physical}


def _place(design: Design, check_id: str) -> Place | None:
    scope, _, rest = check_id.partition(":")
    name = rest.rpartition(":")[0]
    if scope == "part":
        part = design.part(name)
        return part.place if part else None
    if scope in ("net", "rail"):
        net = design.net(name)
        return net.place if net else None
    return None


def _uri(file: str) -> str:
    path = PurePath(file)
    return path.as_uri() if path.is_absolute() else quote(path.as_posix())
