"""Movements: which checks got worse, better or moved, as the definition of each says; and their sentences."""

from __future__ import annotations

from typing import Any

import msgspec
import pytest
from hypothesis import given
from hypothesis import strategies as st

from reactance.analysis.design import Design, Net, Part, Pin
from reactance.analysis.difference import compare, movements, sentence
from reactance.analysis.report import (
    FORMAT_CHECK,
    Cause,
    Check,
    DesignSummary,
    Duty,
    Edit,
    Limit,
    Movement,
    NetEntry,
    PartEntry,
    Report,
    Status,
)

STATUSES: tuple[Status, ...] = ("pass", "marginal", "fail", "watched", "unknown")


def check(
    check_id: str, nominal: float | None, status: Status = "watched", margin: float | None = None, **more: Any
) -> Check:
    limit = more.pop("limit", None if status == "watched" else Limit(max=1.0))
    measure = more.pop("measure", check_id.rpartition(":")[2].partition("@")[0])
    return Check(check_id, measure, nominal, nominal, nominal, more.pop("unit", "V"), limit, margin, status, "")


def report(*checks: Check, **more: Any) -> Report:
    empty: dict[str, Any] = dict.fromkeys(("nets", "parts", "capacitors", "duties", "assumptions", "problems"), ())
    return Report(FORMAT_CHECK, DesignSummary("b", "b.edn", "", 0, 0), checks=checks, **(empty | more))


def verdicts(older: Report, newer: Report, share: float = 0.05, **more: Any) -> dict[str, str]:
    return {move.check: move.verdict for move in movements(older, newer, share, **more)}


def one(old: Check, new: Check, share: float = 0.05) -> str | None:
    return verdicts(report(old), report(new), share).get(new.id)


D = "rail:+3V3:droop"


@pytest.mark.parametrize(
    ("before", "after", "verdict"),
    [
        ("pass", "marginal", "worse"),
        ("pass", "fail", "worse"),
        ("marginal", "fail", "worse"),
        ("marginal", "pass", "better"),
        ("fail", "marginal", "better"),
        ("fail", "pass", "better"),
        ("pass", "pass", None),
        ("fail", "fail", None),
        ("pass", "unknown", "worse"),
        ("fail", "unknown", "worse"),
        ("unknown", "fail", "worse"),
        ("unknown", "pass", "better"),
        ("unknown", "unknown", None),
        ("watched", "fail", "worse"),
        ("watched", "pass", None),
    ],
)
def test_status_decides_first(before: Status, after: Status, verdict: str | None) -> None:
    margins: dict[Status, float | None] = {"watched": None, "unknown": None}
    old, new = check(D, 1.0, before, margins.get(before, 0.3)), check(D, 1.0, after, margins.get(after, 0.3))
    assert one(old, new) == verdict


@pytest.mark.parametrize(
    ("before", "after", "verdict"),
    [(0.50, 0.44, "worse"), (0.50, 0.46, None), (0.50, 0.45, None), (0.50, 0.56, "better"), (-0.2, -0.3, "worse")],
)
def test_a_margin_that_drops_by_more_than_the_share(before: float, after: float, verdict: str | None) -> None:
    status: Status = "pass" if before > 0 else "fail"
    assert one(check(D, 1.0, status, before), check(D, 1.0, status, after)) == verdict


def test_against_a_limit_of_zero_the_share_is_taken_of_the_distance() -> None:
    def at(volts: float) -> Check:
        return check("part:C1:polarity", volts, "pass", volts, limit=Limit(min=0.0))

    assert one(at(3.30), at(3.20)) is None
    assert one(at(3.30), at(3.10)) == "worse"


@pytest.mark.parametrize(
    ("before", "after", "verdict"),
    [
        (100.0, 104.9, None),
        (100.0, 105.1, "moved"),
        (100.0, 94.9, "moved"),
        (-100.0, -106.0, "moved"),
        (0.0, 1e-9, "moved"),
        (0.0, 0.0, None),
        (None, None, None),
        (1.0, None, "moved"),
        (None, 1.0, "moved"),
    ],
)
def test_an_unjudged_check_moves_by_its_nominal(before: float | None, after: float | None, verdict: str | None) -> None:
    assert one(check("coupling:A:gain", before), check("coupling:A:gain", after)) == verdict


def test_a_limit_taken_away_is_judged_by_the_figure_alone() -> None:
    assert one(check(D, 1.0, "fail", -0.2), check(D, 1.0)) is None
    assert one(check(D, 1.0, "pass", 0.2), check(D, 1.2)) == "moved"


BRIEF = b'[[rail]]\nnet = "+3V3"\nstep = { current = "1 A", rise = "1 ns" }\n'
FILTER = b'[[filter]]\nname = "f"\nfrom = "A"\nto = "B"\nattenuation = [{ at = "100 kHz", least = "35 dB" }]\n'


def test_a_check_that_vanished_is_worse_while_its_duty_is_in_the_brief() -> None:
    older = report(
        check(D, 1.0, "pass", 0.5), check("part:C3:stress", 0.5, "pass", 0.3), check("filter:f:corner_high", 1e3)
    )
    found = movements(older, report(), 0.05, briefs=(BRIEF + FILTER, BRIEF + FILTER))
    assert {(m.check, m.verdict, m.after.status) for m in found} == {
        (D, "worse", None),
        ("filter:f:corner_high", "worse", None),
    }


@pytest.mark.parametrize("newer", [b"", None, b'[[rail]]\nnet = "+3V3"\n', b'[[rail]]\nnet = "+5V"\n', b"no toml ["])
def test_a_check_that_nobody_asks_for_any_more_is_no_movement(newer: bytes | None) -> None:
    assert verdicts(report(check(D, 1.0, "pass", 0.5)), report(), briefs=(BRIEF, newer)) == {}


def test_an_attenuation_at_a_frequency_no_longer_asked_for() -> None:
    older = report(check("filter:f:attenuation@100kHz", 40.0, "pass", 0.1))
    assert verdicts(older, report(), briefs=(FILTER, FILTER)) == {"filter:f:attenuation@100kHz": "worse"}
    assert verdicts(older, report(), briefs=(FILTER, FILTER.replace(b"100 kHz", b"200 kHz"))) == {}


def test_new_checks_are_no_movements_unless_the_older_brief_asked_for_them() -> None:
    newer = report(check(D, 1.0, "pass", 0.5), check("part:C3:stress", 0.5, "pass", 0.3))
    assert verdicts(report(), newer, briefs=(b"", BRIEF)) == {}
    assert verdicts(report(), newer, briefs=(BRIEF, BRIEF)) == {D: "better"}


def test_an_antiresonance_that_went_is_neither_worse_nor_better() -> None:
    older = report(check("rail:+3V3:antiresonance", 1.0))
    assert verdicts(older, report(), briefs=(BRIEF, BRIEF)) == {"rail:+3V3:antiresonance": "moved"}


def test_renumbered_parts_are_followed_also_where_they_change_places() -> None:
    older = report(*(check(f"part:C{n}:stress", n / 10, "pass", 1 - n / 10) for n in (1, 2)))
    newer = report(check("part:C2:stress", 0.1, "pass", 0.9), check("part:C1:stress", 0.9, "marginal", 0.1))
    found = movements(older, newer, 0.05, parts={"C1": "C2", "C2": "C1"})
    assert [(m.check, m.verdict, m.before.nominal) for m in found] == [("part:C1:stress", "worse", 0.2)]


def test_renamed_nets_are_followed() -> None:
    older = report(check("coupling:N1>N2:gain", 1.0), check("net:N1:return", 1.0, "pass", 0.0))
    newer = report(check("coupling:M1>N2:gain", 2.0), check("net:M1:return", 0.0, "fail", -1.0))
    assert verdicts(older, newer, nets={"N1": "M1"}) == {"coupling:M1>N2:gain": "moved", "net:M1:return": "worse"}


CHECKS = st.builds(
    check,
    st.sampled_from([f"part:C{n}:stress" for n in range(5)]),
    st.one_of(st.none(), st.floats(-10, 10)),
    st.sampled_from(STATUSES),
    st.one_of(st.none(), st.floats(-2, 1)),
)
REPORTS = st.lists(CHECKS, max_size=5, unique_by=lambda item: item.id).map(lambda items: report(*items))


@given(REPORTS, st.floats(0, 1))
def test_nothing_moves_against_itself(same: Report, share: float) -> None:
    assert movements(same, same, share) == ()


@given(REPORTS, REPORTS)
def test_worse_and_better_exchange_with_the_revisions_where_both_are_judged(older: Report, newer: Report) -> None:
    def judged(found: Report) -> Report:
        kept = tuple(c for c in found.checks if c.status in ("pass", "marginal", "fail") and c.margin is not None)
        return msgspec.structs.replace(found, checks=kept)

    forth, back = verdicts(judged(older), judged(newer)), verdicts(judged(newer), judged(older))
    swap = {"worse": "better", "better": "worse", "moved": "moved"}
    assert {name: swap[verdict] for name, verdict in forth.items()} == back


# -- sentences

RAIL = Duty("rail:+3V3", "decoupling", ("C14", "C15"), ("+3V3", "GND"), "from rail +3V3 to ground GND")
PARTS = tuple(PartEntry(f"C{n}", "capacitor", 1e-7, None, None, True, "100n") for n in (14, 20))
NETS = (NetEntry("GND", "ground", 0.0), NetEntry("+3V3", "rail", 3.3), NetEntry("A", "signal", None))
C14 = Edit("C14.VALUE", "attribute changed", "C14", "VALUE", "100n", "10n")
C20 = Edit("C20.VALUE", "attribute changed", "C20", "VALUE", "1u", "2u2")


def droop(nominal: float, status: Status = "pass") -> Check:
    return check(D, nominal, status, 1 - nominal / 0.165, limit=Limit(max=0.165))


def told(older: Report, newer: Report, *edits: Edit) -> str:
    (move,) = movements(older, newer, 0.05, briefs=(BRIEF, BRIEF))
    return sentence(move, edits, older, newer)


def rail_reports(before: float, after: float) -> tuple[Report, Report]:
    more = {"duties": (RAIL,), "parts": PARTS, "nets": NETS}
    return report(droop(before), **more), report(droop(after), **more)


def test_the_sentence_of_a_droop() -> None:
    line = told(*rail_reports(0.081, 0.164), C20, C14)
    assert line == "+3V3 droop 81 → 164 mV of 165 mV: C14 100 nF → 10 nF"


def test_the_only_edit_is_behind_it_whatever_it_touches() -> None:
    other = Edit("R9.VALUE", "attribute changed", "R9", "VALUE", "1k", "2k")
    line = told(*rail_reports(0.081, 0.164), other, Edit("C1→C2", "part renumbered", "C2", None, "C1", "C2"))
    assert line.endswith(": R9 1k → 2k")


def test_no_edit_is_invented_where_none_touches_the_check() -> None:
    line = told(*rail_reports(0.081, 0.164), C20, Edit("+C40", "part added", "C40", None, None, "1u"))
    assert line == "+3V3 droop 81 → 164 mV of 165 mV"


def test_known_causes_come_first_by_their_share() -> None:
    older, newer = rail_reports(0.081, 0.164)
    (move,) = movements(older, newer, 0.05)
    caused = Movement(
        move.check, move.verdict, move.before, move.after, (Cause("C14.VALUE", 0.2), Cause("C20.VALUE", 0.8))
    )
    assert sentence(caused, [C14, C20], older, newer).endswith(": C20 1 µF → 2.2 µF, C14 100 nF → 10 nF")


def test_removed_parts_and_moved_pins_and_the_brief_are_named() -> None:
    gone = Edit("-C15", "part removed", "C15", None, "10u", None)
    moved = Edit("R4.1@+3V3", "pin moved", "R4", "pin 1", "A", "+3V3")
    asked = Edit("b", "brief changed", None, "rail +3V3: allowed", "5 %", "4 %")
    line = told(*rail_reports(0.081, 0.164), gone, moved, asked, C20)
    assert line.endswith("C15 removed (10u), R4 pin 1: A → +3V3, brief, rail +3V3: allowed, 5 % → 4 %")


def test_an_order_number_that_goes_along_is_not_named() -> None:
    number = Edit("C14.Part Number", "attribute changed", "C14", "Part Number", "X-100N", "X-10N")
    assert told(*rail_reports(0.081, 0.164), number, C14, C20).endswith("of 165 mV: C14 100 nF → 10 nF")
    assert told(*rail_reports(0.081, 0.164), number).endswith("of 165 mV: C14 Part Number X-100N → X-10N")


def test_resistors_named_in_the_reason_are_behind_a_coupling_and_the_stress_in_it() -> None:
    because = "in series in the coupling 'mic' of the brief, from A to B, with R11 and R12"
    more = {"duties": (Duty("coupling:mic", "coupling", ("C40",), ("A", "B"), because),)}
    bias = Edit("R11.VALUE", "attribute changed", "R11", "VALUE", "100k", "10k")
    for check_id in ("coupling:mic:corner", "part:C40:stress"):
        older, newer = report(check(check_id, 1.0), **more), report(check(check_id, 2.0), **more)
        assert told(older, newer, bias, C20).endswith(": R11 100k → 10k")


def test_units_that_differ_stand_twice() -> None:
    older, newer = (
        report(check("filter:A>B:corner_high", 950.0, unit="Hz")),
        report(check("filter:A>B:corner_high", 1590.0, unit="Hz")),
    )
    assert told(older, newer) == "A → B upper corner 950 Hz → 1.59 kHz"


def test_shares_read_as_percentages_and_paths_as_words() -> None:
    older = report(check("part:C1:stress", 0.5, "pass", 0.375, unit="1", limit=Limit(max=0.8)))
    newer = report(check("part:C1:stress", 0.9, "fail", -0.125, unit="1", limit=Limit(max=0.8)))
    assert told(older, newer) == "C1 voltage stress 50 → 90 % of 80 %"
    older = report(check("net:A:return", 1.0, "pass", 0.0, unit="1", limit=Limit(min=1.0)))
    newer = report(check("net:A:return", 0.0, "fail", -1.0, unit="1", limit=Limit(min=1.0)))
    assert told(older, newer) == "A DC path present → missing"


def test_a_vanished_and_an_uncomputable_check_say_so() -> None:
    assert told(report(droop(0.081)), report()) == "+3V3 droop 81 mV → no longer there"
    unknown = check(D, None, "unknown", None, limit=Limit(max=0.165))
    assert told(report(droop(0.081)), report(unknown)) == "+3V3 droop 81 mV → unknown of 165 mV"


def test_a_status_that_fell_while_the_nominal_stands() -> None:
    assert told(report(droop(0.1)), report(droop(0.1, "marginal"))) == "+3V3 droop 100 mV of 165 mV, pass → marginal"


# -- both together


def test_compare_follows_what_was_renumbered_and_takes_the_share_from_the_newer_brief() -> None:
    def side(refdes: str, stress: float, brief: bytes) -> tuple[Design, Report, bytes | None]:
        part = Part(refdes, (Pin("1", net="+3V3"), Pin("2", net="GND")), {"VALUE": "1u"}, "C")
        nets = tuple(Net(pin.net or "", ((refdes, pin.number),)) for pin in part.pins)
        checks = report(check(f"part:{refdes}:stress", stress, "pass", 1 - stress))
        return Design("b", "b.edn", "edif", (part,), nets), checks, brief

    loose, tight = b'[board]\nmovement = "20 %"\n', b'[board]\nmovement = "1 %"\n'
    found = compare(side("C3", 0.50, loose), side("C7", 0.52, tight))
    assert [edit.kind for edit in found.edits] == ["part renumbered", "brief changed"]
    assert [(m.check, m.verdict, m.causes) for m in found.movements] == [("part:C7:stress", "worse", ())]
    assert compare(side("C3", 0.50, tight), side("C7", 0.52, loose)).movements == ()
