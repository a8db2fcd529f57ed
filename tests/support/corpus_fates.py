"""Bad logs: fates, classes, conclusions."""

from __future__ import annotations

from typing import Any

from tests.support.corpus_edits import (
    Edit,
    Log,
    Traps,
    _known_point_eliminated,
    _vectors,
    add,
    drop,
    put,
    twice,
    whole,
    without,
)


def _claim_more(log: Log) -> int:
    """One more candidate claimed eliminated than there are fates for."""
    extra = next(
        [r["prime"], r["id"]] for r in log.records if r["kind"] == "fate" and r["verdict"] == "rational"
    )
    log.records[-1]["eliminated"].append(extra)
    return len(log.records) - 1


def _spurious_is_rational(log: Log) -> int:
    """A spurious candidate is called a known rational point."""
    point = log.records[log.find("fate", verdict="rational")]["points"]
    i = log.find("fate", verdict="eliminated")
    old = log.records[i]
    log.records[i] = {
        "kind": "fate",
        "prime": old["prime"],
        "id": old["id"],
        "verdict": "rational",
        "points": point,
        "given": True,
        "sole": True,
    }
    return i


def _swap_fates(log: Log) -> int:
    i = log.find("fate")
    log.records[i], log.records[i + 1] = log.records[i + 1], log.records[i]
    return i


def _use_before_saturation(log: Log) -> int:
    """The saturation at 3 is removed; the first fate with a use at 3 has nothing to stand on."""
    for kind in ("saturated", "torsion"):
        del log.records[log.find(kind, ell=3)]
    log.records[-1]["records"] = len(log.records) - 1
    fates = [
        i
        for i, r in enumerate(log.records)
        if r["kind"] == "fate" and any("3" in use[1] for use in r.get("uses", []))
    ]
    return fates[0]


def _sole_by_coefficients(log: Log) -> int:
    """Form coefficients without a bound is called the only rational point."""
    i = log.find("fate", id="c1")
    log.records[i] = {
        "kind": "fate",
        "prime": 3,
        "id": "c1",
        "verdict": "rational",
        "points": [[0, 1, 1]],
        "given": True,
        "sole": True,
    }
    return i


def _wrong_point_for_coefficients(log: Log) -> int:
    i = _sole_by_coefficients(log)
    log.records[i]["sole"] = False
    return i


def _classes(count: int, index: int) -> Edit:
    def edit(log: Log) -> int:
        i = _vectors([[0]])(log)
        log.records[i].update(count=count, index=index)
        return i

    return edit


def _use_of_an_empty_list(log: Log) -> int:
    i = log.find("premise") + 1
    log.records.insert(
        i, {"kind": "premise", "id": "complete 11", "statement": "a", "source": "b", "prime": 11}
    )
    i = log.find("fate", id="r1")
    log.records[i]["uses"][0][0] = "p = 11"
    return i


def _remove_local(log: Log) -> int:
    """The group at 127, needed by a fate alone."""
    del log.records[log.find("local", prime=127)]
    return log.find("fate", id="r1")


def _double_zero(log: Log) -> int:
    log.records[log.find("candidate", id="z3")]["multiplicity"] = 2
    return log.find("fate", id="z3")


def _unused_left_out(log: Log) -> int:
    """A record that is not missed, but counted."""
    i = log.find("premise", 1)
    log.records.insert(i, {"kind": "premise", "id": "index 2", "statement": "a", "source": "b", "ell": 2})
    return len(log.records) - 1


def _conclude_from_open(log: Log) -> int:
    points = [
        r["points"][0] for r in log.records if r["kind"] == "fate" and r.get("points") and r["prime"] == 7
    ]
    log.records[-1].update(conclusion="points", points=points)
    return len(log.records) - 1


def _claim_empty(log: Log) -> int:
    log.records[-1].update(conclusion="empty", points=[])
    return len(log.records) - 1


def _empty_with_points(log: Log) -> int:
    """A complete list without candidates shows that there are no points, and the log lists one."""
    log.records = [r for r in log.records if r["kind"] in ("header", "group", "premise", "end")]
    log.records[-1].update(
        records=len(log.records) - 1, eliminated=[], conclusion="empty", points=[[1, 1, 0]]
    )
    return len(log.records) - 1


def _no_sections(log: Log) -> int:
    """Fewer terms than digits, and no section that would need more."""
    record = log.records[log.find("padic")]
    record.update(digits=8, terms=5, sections=[], discs=[])
    return log.find("padic")


def _same_class(log: Log) -> int:
    """The first vector again, moved by a vector of the subgroup."""
    i = log.find("classes")
    record = log.records[i]
    record["vectors"][1] = [record["vectors"][0][0] + 3 * record["index"], record["vectors"][0][1]]
    return i


def _candidate_of(name: str, **fields: Any) -> Edit:
    """Change a candidate; the blame goes to its fate."""

    def edit(log: Log) -> int:
        log.records[log.find("candidate", id=name)].update(fields)
        return log.find("fate", id=name)

    return edit


def _torsion_coordinates(log: Log) -> int:
    i = log.find("candidate", id="a2")
    log.records[i]["torsion"] = [1, 1]
    return i


TORSION = ("torsion_coordinates",)


def fates(traps: Traps) -> None:
    rejected = traps.rejected
    rejected("uses_left_out", "not-eliminated", put("fate", "uses", value=[], id="r1"), "forms")
    rejected("last_use_left_out", "not-eliminated", put("fate", "uses", value=without(-1), id="r1"), "forms")
    rejected(
        "semijoin_for_a_join", "not-eliminated", put("fate", "uses", 0, 2, value="semijoin", id="r1"), "forms"
    )
    rejected("coarser_use", "not-eliminated", put("fate", "uses", 0, 1, value={"3": 1}, id="r1"), "forms")
    rejected("exponent_too_large", "exponent", put("fate", "uses", 0, 1, "3", value=3, id="r1"), "forms")
    rejected(
        "exponent_meant_to_hang", "exponent", put("fate", "uses", 0, 1, "3", value=10**9, id="r1"), "forms"
    )
    rejected(
        "part_that_is_not_allowed", "not-allowed", put("fate", "uses", 0, 1, value={"2": 1}, id="r1"), "forms"
    )
    rejected(
        "primes_of_a_use_out_of_order",
        "use-order",
        put("fate", "uses", 0, 1, value={"7": 1, "3": 2}, id="r1"),
        "forms",
    )
    rejected("use_at_a_missing_prime", "no-local", put("fate", "uses", 0, 0, value=59, id="r1"), "forms")
    rejected(
        "use_of_an_incomplete_list", "no-complete", put("fate", "uses", 0, 0, value="p = 5", id="r1"), "forms"
    )
    rejected("use_of_an_empty_list", "mixed-list", _use_of_an_empty_list, "forms")
    rejected("saturation_removed", "not-allowed", whole(_use_before_saturation), "demo")
    rejected("local_record_removed", "no-local", _remove_local, "forms")
    rejected("known_point_eliminated", "not-eliminated", whole(_known_point_eliminated), "demo")
    rejected("spurious_called_rational", "point-elsewhere", whole(_spurious_is_rational), "demo")
    rejected("fates_exchanged", "fate-order", whole(_swap_fates), "demo")
    rejected("fate_twice", "fate-order", twice("fate"), "demo")
    rejected("fate_left_out", "fate-missing", drop("fate", -1, blame="end"), "demo")
    rejected("rational_without_points", "points", put("fate", "points", value=[], id="z3"), "demo")
    rejected("rational_point_twice", "points", put("fate", "points", value=lambda p: p * 2, id="z3"), "demo")
    rejected(
        "rational_point_off_the_curve",
        "point-off-curve",
        put("fate", "points", 0, 1, value=add(1), id="z3"),
        "demo",
    )
    rejected(
        "rational_point_of_another_candidate",
        "point-elsewhere",
        put("fate", "points", 0, 1, value=lambda y: -y, id="z3"),
        "demo",
    )
    rejected("double_zero_called_sole", "not-sole", _double_zero, "demo")
    rejected("disc_called_sole", "not-sole", put("fate", "sole", value=True, id="d2"), "forms")
    rejected("coefficients_called_sole", "not-sole", whole(_sole_by_coefficients), "forms")
    rejected(
        "point_without_the_coefficients", "point-elsewhere", whole(_wrong_point_for_coefficients), "forms"
    )


def the_end(traps: Traps) -> None:
    rejected = traps.rejected
    rejected("one_more_eliminated", "claim", whole(_claim_more), "demo")
    rejected("one_less_eliminated", "claim", put("end", "eliminated", value=without(0)), "demo")
    rejected(
        "eliminated_in_another_order", "claim", put("end", "eliminated", value=lambda e: e[::-1]), "demo"
    )
    rejected("records_miscounted", "records", put("end", "records", value=add(1)), "demo")
    rejected("record_left_out", "records", _unused_left_out, "demo")
    rejected("rational_point_left_out", "conclusion", put("end", "points", value=without(0)), "demo")
    rejected("end_point_twice", "points", put("end", "points", value=lambda p: p + p[:1]), "demo")
    rejected("points_without_a_complete_list", "conclusion", drop("premise", 1, blame="end"), "demo")
    rejected("points_of_a_list_with_an_open_candidate", "conclusion", _conclude_from_open, "forms")
    rejected("points_and_no_conclusion", "conclusion", put("end", "conclusion", value="none"), "demo")
    rejected("empty_although_there_are_points", "conclusion", _claim_empty, "demo")
    rejected("empty_with_points", "conclusion", _empty_with_points, "stated_index")
    rejected("number_of_classes", "count", _classes(2, 1), "demo")
    rejected("index_of_classes", "index", _classes(1, 2), "demo")
    rejected("class_twice", "vector", _vectors([[0], [1]]), "demo")
    rejected("emptiness_without_classes", "conclusion", drop("classes", blame="end"), "empty_by_classes")
    rejected("fewer_terms_than_digits", "terms", whole(_no_sections), "odd_degree_at_three")


def classes_that_remain(traps: Traps) -> None:
    malformed, rejected = traps.malformed, traps.rejected
    rejected(
        "vector_of_another_class", "vector", put("classes", "vectors", 1, 0, value=add(7)), "classes_left"
    )
    rejected("vector_of_a_class_twice", "vector", whole(_same_class), "classes_left")
    rejected("class_left_out", "count", put("classes", "count", value=add(-1)), "classes_left")
    rejected(
        "larger_index_of_classes", "index", put("classes", "index", value=lambda n: 2 * n), "classes_left"
    )
    rejected("classes_not_refined", "count", put("classes", "uses", 1, 2, value="semijoin"), "classes_left")
    malformed(
        "vector_too_short", "length", put("classes", "vectors", 1, value=lambda v: v[:1]), "classes_left"
    )


def coefficients_with_torsion_coordinates_and_discs(traps: Traps) -> None:
    malformed, rejected = traps.malformed, traps.rejected
    rejected("another_torsion_coordinate", "not-eliminated", _candidate_of("a2", torsion=[0]), *TORSION)
    rejected("torsion_coordinate_left_out", "not-eliminated", _candidate_of("a2", torsion=None), *TORSION)
    rejected("disc_of_coefficients_left_out", "not-eliminated", _candidate_of("a3", disc=None), *TORSION)
    rejected("another_disc_of_coefficients", "point-elsewhere", _candidate_of("a4", disc=[1, 0, 1]), *TORSION)
    rejected(
        "point_with_another_torsion_coordinate", "point-elsewhere", _candidate_of("a5", torsion=[2]), *TORSION
    )
    rejected("contradictory_disc_left_out", "not-eliminated", _candidate_of("a7", disc=None), *TORSION)
    malformed("torsion_coordinates_too_many", "length", _torsion_coordinates, *TORSION)


def traps() -> Traps:
    """All of this file."""
    out = Traps()
    for section in (fates, the_end, classes_that_remain, coefficients_with_torsion_coordinates_and_discs):
        section(out)
    return out
