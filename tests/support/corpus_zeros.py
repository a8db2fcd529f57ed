"""Bad logs: lists that are not complete, zeros that are not counted right, integral points."""

from __future__ import annotations

from collections.abc import Callable

from tests.support.corpus_edits import Edit, Log, Traps, add, drop, put, twice


def _forget(n: int, blame: str, m: int = 0) -> Edit:
    """A candidate and its fate are left out; the blame goes to what claimed that there is no other."""

    def edit(log: Log) -> int:
        candidate = log.records[log.find("candidate", n)]
        key = (candidate["prime"], candidate["id"])
        log.records = [r for r in log.records if (r.get("prime"), r.get("id")) != key]
        end = log.records[-1]
        end["records"] = len(log.records) - 1
        end["eliminated"] = [pair for pair in end["eliminated"] if tuple(pair) != key]
        return log.find(blame, m) if blame else len(log.records) - 1

    return edit


def _then(first: Edit, second: Edit) -> Edit:
    """Two edits; the blame of the second."""

    def edit(log: Log) -> int:
        first(log)
        return second(log)

    return edit


def _insert_zeros(pivots: list[int], annihilators: list[list[int]]) -> Edit:
    """A record `zeros` after the record `padic`."""

    def edit(log: Log) -> int:
        i = log.find("padic")
        record = {
            "kind": "zeros",
            "prime": log.records[i]["prime"],
            "pivots": pivots,
            "annihilators": annihilators,
        }
        log.records.insert(i + 1, record)
        log.records[-1]["records"] += 1
        return i + 1

    return edit


def _no_class(log: Log) -> int:
    """The free generator becomes the divisor 0."""
    i = log.find("group")
    (terms,) = log.records[i]["free"]
    log.records[i]["free"] = [[*terms, *[[-m, place] for m, place in terms]]]
    return log.find("zeros")


def _few_digits(log: Log) -> int:
    """One digit less than a candidate has, before the integrals lose some."""
    digits = max(r.get("digits", 0) for r in log.records if r["kind"] == "candidate")
    i = log.find("padic")
    log.records[i]["digits"] = digits - 1
    modulus = log.records[i]["prime"] ** (digits - 1)
    j = log.find("zeros")
    log.records[j]["annihilators"] = [[c % modulus for c in e] for e in log.records[j]["annihilators"]]
    return j


def _one_digit(log: Log) -> int:
    """Logarithms modulo p, while the candidates have more digits."""
    log.records[log.find("padic")]["digits"] = 1
    return log.find("zeros")


def _sole_with_room(log: Log) -> int:
    """The bound for a disc becomes 2, and it holds one point."""
    i = next(i for i, r in enumerate(log.records) if r["kind"] == "premise" and "at_most" in r)
    log.records[i]["at_most"] = 2
    return log.find("fate", id=log.records[i]["candidate"])


def _inexact(log: Log) -> int:
    """The annihilator is changed by a high power of p: no double zero is certain any more."""
    i = log.find("zeros")
    p, digits = log.records[i]["prime"], log.records[log.find("padic")]["digits"]
    (vector,) = log.records[i]["annihilators"]
    log.records[i]["annihilators"] = [[p ** (digits - 1) if c == 0 else c for c in vector]]
    return log.find("fate", points=log.records[log.find("fate", id=_double(log))]["points"])


def _rounded(log: Log) -> int:
    """The annihilator is known modulo p alone: no zero in a disc is counted any more."""
    i = log.find("zeros")
    p = log.records[i]["prime"]
    log.records[i]["annihilators"] = [[c % p for c in e] for e in log.records[i]["annihilators"]]
    return log.find("fate", verdict="rational", sole=True)


def _double(log: Log) -> str:
    """The id of the first candidate of multiplicity 2."""
    return str(log.records[log.find("candidate", multiplicity=2)]["id"])


def _other_column(log: Log) -> int:
    """The column where the logarithm of the one generator is 0 becomes the pivot."""
    i = log.find("zeros")
    (pivot,) = log.records[i]["pivots"]
    log.records[i]["pivots"] = [1 - pivot]
    log.records[i]["annihilators"] = [[int(j == pivot) for j in range(2)]]
    return i


def _deep_without_group(log: Log) -> int:
    """J(F_11) is left out, and the logarithms at 11 do without it."""
    log.records[log.find("padic", prime=11)]["reduction"] = False
    return drop("local", blame="classes", prime=11)(log)


def _conclude_without(premise: str) -> Edit:
    """The premise that bounds the first candidate with a bound is left out."""

    def edit(log: Log) -> int:
        i = next(
            i for i, r in enumerate(log.records) if r["kind"] == "premise" and r["id"].startswith(premise)
        )
        name = log.records[i]["candidate"]
        del log.records[i]
        log.records[-1]["records"] -= 1
        return log.find("fate", id=name)

    return edit


def _at(index: int) -> Callable[[list[list[int]]], list[list[int]]]:
    """The first annihilator with 1 added at an index."""
    return lambda rows: [[c + (j == index) for j, c in enumerate(rows[0])], *rows[1:]]


def traps() -> Traps:
    """All of this file."""
    out = Traps()
    zeros = "zeros"
    out.rejected("annihilator_changed", "annihilator", put(zeros, "annihilators", value=_at(0)), zeros)
    edit = put(zeros, "annihilators", value=_at(1))
    out.rejected("annihilator_not_in_normal_form", "annihilator", edit, zeros)
    out.rejected("zeros_without_logarithms", "no-padic", drop("padic", blame=zeros), zeros)
    out.rejected("zeros_twice", "duplicate", twice(zeros), zeros)
    out.rejected("zeros_at_full_rank", "pivots", _insert_zeros([0, 1], []), "integral_discs")
    out.malformed("zeros_with_no_pivot", "length", put(zeros, "pivots", value=[]), zeros)
    out.malformed("zeros_with_a_pivot_beyond_the_genus", "range", put(zeros, "pivots", value=[2]), zeros)
    out.malformed("one_annihilator_too_few", "length", put(zeros, "annihilators", value=[]), zeros)
    edit = put(zeros, "annihilators", 0, value=lambda e: [*e, 0])
    out.malformed("annihilator_of_another_length", "length", edit, zeros)
    edit = put(zeros, "annihilators", 0, value=lambda e: [-1, *e[1:]])
    out.malformed("negative_annihilator", "range", edit, zeros)
    out.rejected("generator_that_is_zero", "dependent", _no_class, zeros)
    out.rejected("minor_that_is_zero", "dependent", _other_column, "zeros_double")
    out.rejected("candidate_left_out_of_counted_ones", "zeros-open", _forget(0, zeros), zeros)
    out.rejected("candidate_at_infinity_left_out", "zeros-open", _forget(-1, zeros), zeros)
    out.rejected("candidate_left_out_at_rank_zero", "zeros-open", _forget(1, zeros), "zeros_rank_zero")
    out.rejected("more_digits_than_the_logarithms", "terms", _one_digit, "zeros_rank_zero")
    out.rejected("too_few_digits_to_count_zeros", "digits", _few_digits, zeros)
    out.rejected("counted_list_without_the_record", "conclusion", drop(zeros, blame="end"), zeros)
    out.rejected("double_zero_no_longer_certain", "not-sole", _inexact, "zeros_double")
    out.rejected("annihilator_to_one_digit", "not-sole", _rounded, "zeros_in_discs")
    out.rejected("one_disc_left_out", "conclusion", _forget(6, "end"), "integral_discs")
    out.rejected("bound_of_a_disc_left_out", "not-sole", _conclude_without("bound "), "integral_discs")
    out.rejected("disc_with_room_for_two", "not-sole", _sole_with_room, "integral_discs")
    edit = _then(put("group", "integral", value=False), lambda log: log.find("fate", id="d8"))
    out.rejected("integral_points_called_rational", "not-eliminated", edit, "integral_discs")
    edit = drop("padic", blame="classes", prime=5)
    out.rejected("deep_without_logarithms", "no-padic", edit, "deep")
    out.rejected("deep_without_a_group", "no-local", _deep_without_group, "deep")
    edit = put("classes", "uses", 0, 0, value="deep x")
    out.malformed("deep_condition_of_no_prime", "use", edit, "deep")
    edit = put("classes", "uses", 0, 0, value="deep 7")
    out.rejected("deep_condition_of_another_prime", "no-padic", edit, "deep")
    out.rejected("deep_with_one_class_more", "count", put("classes", "count", value=add(1)), "deep")
    return out

