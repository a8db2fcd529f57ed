"""Bad logs: text, shapes, order of records, the statement, limits."""

from __future__ import annotations

from typing import Any

from tests.support.corpus_edits import (
    Edit,
    Log,
    Traps,
    add,
    drop,
    dump,
    move,
    put,
    text,
    twice,
    whole,
)


def _cut(log: Log) -> int:
    log.tail = b""
    return len(log.records) - 1


def _half(log: Log) -> int:
    i = log.find("local")
    del log.records[i + 1 :]
    log.raw[i] = dump(log.records[i])[:100]
    log.tail = b""
    return i


def _nothing(log: Log) -> int:
    log.records.clear()
    return 0


def _no_end(log: Log) -> int:
    log.records.pop()
    return len(log.records)


def _after_the_end(log: Log) -> int:
    log.records.append({"kind": "premise", "id": "index 2", "statement": "a", "source": "b", "ell": 2})
    return len(log.records) - 1


def _large_degree(log: Log) -> int:
    i = log.find("local", prime=113)
    log.records[i]["define"][0][0][0] = 61
    return i


def _premise(**fields: Any) -> Edit:
    def edit(log: Log) -> int:
        i = log.find("premise") + 1
        log.records.insert(i, {"kind": "premise", **fields})
        return i

    return edit


def _candidate(**fields: Any) -> Edit:
    def edit(log: Log) -> int:
        i = log.find("candidate")
        log.records.insert(i, {"kind": "candidate", **fields})
        return i

    return edit


def _append(log: Log, extra: bytes) -> int:
    i = log.find("group")
    log.raw[i] = dump(log.records[i]) + extra
    return i


def _replace(log: Log, kind: str, value: Any) -> int:
    return _replace_text(log, kind, dump(value))


def _replace_text(log: Log, kind: str, value: bytes) -> int:
    i = log.find(kind)
    log.raw[i] = value
    return i


def _key(log: Log, key: str) -> int:
    i = log.find("group")
    log.records[i][key] = True
    return i


def _without_key(log: Log, kind: str, key: str) -> int:
    i = log.find(kind)
    del log.records[i][key]
    return i


def _reorder(log: Log, kind: str) -> int:
    i = log.find(kind)
    record = log.records[i]
    log.records[i] = {"kind": kind, **{k: record[k] for k in reversed(record) if k != "kind"}}
    return i


def _rename_bound(log: Log) -> int:
    i = log.find("premise", id="bound 5 d1")
    log.records[i].update(id="bound 5 d2", candidate="d2")
    return log.find("fate", id="d1")


def _singular_at_infinity(log: Log) -> int:
    """y^2 + y = f with an even coefficient of x^5: smooth modulo 2 except at infinity."""
    log.records[0]["equation"][0] = [0, 1, 0, -4, 5, -2]
    return log.find("candidate")


def _long_series(log: Log) -> int:
    """Terms and digits within their limits, but not both together."""
    i = log.find("padic")
    log.records[i].update(digits=1000, terms=5000)
    return i


def _great_height(log: Log) -> int:
    """u of degree 60 over denominators of 3000 digits."""
    i = log.find("group")
    u = [f"1/{10**3000 + 2 * k + 1}" for k in range(60)] + ["1"]
    log.records[i]["free"][0][1][1] = {"closed": [u, ["0", "1"], [], ["1"]]}
    return i


def _digits(log: Log, count: int) -> int:
    return text("header", b'"genus":2', b'"genus":' + b"9" * count)(log)


def the_text(traps: Traps) -> None:
    malformed = traps.malformed
    malformed("empty_file", "no-end", whole(_nothing))
    malformed("no_end_record", "no-end", whole(_no_end))
    malformed("last_line_without_its_end", "cut", whole(_cut))
    malformed("cut_inside_a_record", "cut", whole(_half))
    malformed("blank_line", "json", text("group", b'{"kind"', b'\n{"kind"'))
    malformed("byte_order_mark", "json", text("header", b"{", b"\xef\xbb\xbf{"))
    malformed("carriage_return", "spelling", lambda log: _append(log, b"\r"))
    malformed("nul_byte", "json", lambda log: _append(log, b"\x00"))
    malformed("invalid_utf_8", "encoding", text("header", b"residue", b"r\xff"))
    malformed("half_utf_8_character", "encoding", text("header", b"residue", b"r\xe2\x82"))
    malformed("not_a_number", "number", text("group", b'"rank":0', b'"rank":NaN'))
    malformed("infinity", "number", text("group", b'"rank":0', b'"rank":-Infinity'))
    malformed("decimal_number", "number", text("group", b'"rank":0', b'"rank":0.0'))
    malformed("power_of_ten", "number", text("header", b'"genus":2', b'"genus":2e0'))
    malformed("minus_zero", "spelling", text("group", b'"rank":0', b'"rank":-0'))
    malformed("leading_zero", "json", text("header", b'"genus":2', b'"genus":02'))
    malformed("space_between", "spelling", text("group", b'"rank":0', b'"rank": 0'))
    malformed("escaped_letter", "spelling", text("header", b'"kind"', b'"\\u006bind"'))
    malformed("key_twice", "duplicate-key", text("group", b'"rank":0', b'"rank":0,"rank":0'))
    malformed("two_records_in_a_line", "json", lambda log: _append(log, b"{}"))
    malformed("half_character", "text", text("header", b'"residue', b'"\\ud800residue'))
    malformed("line_separator_in_text", "text", text("header", b'"residue', b'"\\u2028residue'))
    malformed("terminal_escape_in_source", "text", put("premise", "source", value="\x1b[2J proved"))
    malformed("reversed_text_in_source", "text", put("premise", "source", value="\u202eproved"))
    malformed("empty_source", "text", put("premise", "source", value=""))
    malformed("blank_source", "text", put("premise", "source", value="  "))


def shapes(traps: Traps) -> None:
    malformed = traps.malformed
    malformed("list_as_record", "record", lambda log: _replace(log, "group", []))
    malformed("kind_not_first", "record", lambda log: _replace(log, "group", {"rank": 0, "kind": "group"}))
    malformed("kind_a_number", "record", lambda log: _replace(log, "group", {"kind": 2}))
    malformed(
        "unknown_kind", "kind", lambda log: _replace(log, "group", {"kind": "axiom", "statement": "1 = 2"})
    )
    malformed("unknown_key", "keys", lambda log: _key(log, "trust"))
    malformed("missing_key", "keys", lambda log: _without_key(log, "local", "close"))
    malformed("keys_in_another_order", "keys", lambda log: _reorder(log, "end"))
    malformed("integer_as_true", "type", put("padic", "reduction", value=1))
    malformed(
        "fraction_as_a_decimal",
        "type",
        put("group", "free", 0, 1, 1, "closed", 0, 0, value="0.5"),
        "closed_point",
    )
    malformed(
        "fraction_as_an_integer",
        "type",
        put("group", "free", 0, 1, 1, "closed", 0, 0, value=1),
        "closed_point",
    )
    malformed("true_as_an_integer", "type", put("group", "rank", value=False))
    malformed("integer_as_text", "type", put("header", "genus", value="2"))
    malformed("text_as_integer", "type", put("premise", "source", value=7))
    malformed("list_as_divisor_entry", "type", put("group", "base", 0, value=1))
    malformed("null_for_a_list", "type", put("local", "close", value=None))
    malformed("point_with_two_coordinates", "length", put("group", "base", 0, 1, "point", value=[1, 1]))
    malformed("logarithm_too_long", "length", put("local", "unit", value=lambda u: [*u, 0]))
    malformed("negative_point_number", "range", put("local", "origin", value=-1))
    malformed(
        "section_not_reduced", "range", put("local", "define", 0, 0, 1, 0, value=add(113), prime=113), "demo"
    )
    malformed("candidate_beyond_its_digits", "range", put("candidate", "digits", value=1))
    malformed("order_one", "range", put("group", "torsion", 0, 0, value=1))
    malformed("negative_exponent", "range", put("fate", "uses", 0, 1, "3", value=-1, id="r1"), "forms")
    malformed("exponent_zero", "range", put("fate", "uses", 0, 1, "3", value=0, id="r1"), "forms")
    malformed(
        "place_of_two_kinds", "place", put("group", "base", 0, 1, value={"point": [1, 1, 0], "fibres": 1})
    )
    malformed("unknown_place", "place", put("group", "base", 0, 1, value={"places": [1, 1, 0]}))
    malformed("unknown_form", "form", put("candidate", "form", value="guess"))
    malformed("unknown_premise", "premise", put("premise", "id", value="truth"))
    malformed("unknown_verdict", "verdict", put("fate", "verdict", value="irrational"))
    malformed("unknown_conclusion", "conclusion", put("end", "conclusion", value="all"))
    malformed("unknown_use", "use", put("fate", "uses", 0, 2, value="product", id="r1"), "forms")
    malformed("use_of_a_text", "use", put("fate", "uses", 0, 0, value="v = 53", id="r1"), "forms")
    malformed("exponent_of_a_text", "use", put("fate", "uses", 0, 1, value={"three": 1}, id="r1"), "forms")
    malformed(
        "fraction_not_reduced",
        "spelling",
        put("group", "free", 0, 1, 1, "closed", 0, 0, value="2/6"),
        "closed_point",
    )
    malformed(
        "fraction_over_zero",
        "range",
        put("group", "free", 0, 1, 1, "closed", 0, 0, value="1/0"),
        "closed_point",
    )
    malformed(
        "premise_on_a_list_without_its_prime", "keys", _premise(id="complete 11", statement="a", source="b")
    )
    malformed("place_entry_missing", "length", put("local", "places", value=[]), "closed_point")


def the_order_of_records(traps: Traps) -> None:
    rejected = traps.rejected
    rejected("header_twice", "order", twice("header"))
    rejected("group_missing", "order", drop("group", blame="premise"))
    rejected("group_first", "order", move("group", 0))
    rejected("premise_after_candidates", "order", move("premise", 5, 1, 5), "demo")
    rejected("evidence_after_a_fate", "order", move("saturated", 22, 0, 22))
    rejected("record_after_the_end", "order", whole(_after_the_end))
    rejected("end_twice", "order", twice("end"))
    rejected("classes_twice", "order", twice("classes"), "empty_by_classes")


def the_statement(traps: Traps) -> None:
    rejected = traps.rejected
    rejected("another_genus", "genus", put("header", "genus", value=3))
    rejected("singular_curve", "singular", put("header", "equation", 0, value=[0, 0, -1, 0, 0, 0, -1]))
    rejected("leading_zero_of_f", "trailing-zero", put("header", "equation", 0, value=lambda f: [*f, 0]))
    rejected("h_of_large_degree", "degree", put("header", "equation", 1, value=[0, 0, 0, 0, 1]))
    rejected("scale_zero", "scale", put("header", "y_scale", value="0"))
    rejected("no_digest", "digest", put("header", "case", "sha256", value="none"))
    rejected(
        "another_curve", "point-off-curve", put("header", "equation", 0, 0, value=-2, blame="group"), "demo"
    )
    rejected("base_of_degree_zero", "divisor-degree", put("group", "base", value=[]))
    rejected("base_of_degree_three", "divisor-degree", put("group", "base", 0, 0, value=3))
    rejected("generator_of_degree_one", "divisor-degree", put("group", "free", 0, 0, 0, value=add(1)), "demo")
    rejected("another_rank", "rank", put("group", "rank", value=1))
    rejected("base_off_the_curve", "point-off-curve", put("group", "base", 0, 1, "point", value=[1, 2, 0]))
    rejected("base_not_in_normal_form", "point-form", put("group", "base", 0, 1, "point", value=[-1, 1, 0]))
    rejected(
        "point_with_a_common_factor",
        "point-form",
        put("fate", "points", 0, value=lambda p: [2 * p[0], 8 * p[1], 2 * p[2]], id="z3"),
        "demo",
    )
    rejected(
        "place_not_monic",
        "place-monic",
        put("group", "free", 0, 1, 1, "closed", 0, 2, value="2"),
        "closed_point",
    )
    rejected(
        "place_off_the_curve",
        "place-off-curve",
        put("group", "free", 0, 1, 1, "closed", 2, 0, value="2"),
        "closed_point",
    )
    rejected(
        "place_with_large_w",
        "place-degree",
        put("group", "free", 0, 1, 1, "closed", 2, value=["1", "10/3", "1"]),
        "closed_point",
    )
    rejected("rank_premise_missing", "no-rank", drop("premise", blame="candidate"))
    rejected("rank_premise_twice", "duplicate", twice("premise"))
    rejected(
        "index_premise_of_a_composite", "not-prime", _premise(id="index 6", statement="a", source="b", ell=6)
    )
    # 41 * 61 * 101 passes Fermat's test to every base prime to it (Carmichael 1912)
    rejected(
        "index_premise_of_a_carmichael_number",
        "not-prime",
        _premise(id="index 252601", statement="a", source="b", ell=252601),
    )
    rejected(
        "index_premise_with_another_id",
        "premise-id",
        _premise(id="index 2", statement="a", source="b", ell=3),
    )
    rejected("bound_premise_of_another_candidate", "not-sole", _rename_bound, "forms")
    rejected("candidate_twice", "duplicate", twice("candidate"))
    rejected("candidate_off_the_curve", "point-off-curve", put("candidate", "point", 1, value=add(5), n=1))
    rejected("candidate_at_a_bad_prime", "not-smooth", put("candidate", "prime", value=13))
    rejected(
        "candidate_singular_at_infinity_modulo_two",
        "not-smooth",
        whole(_singular_at_infinity),
        "residue_characteristic_two",
    )
    rejected("candidate_at_a_composite", "not-prime", put("candidate", "prime", value=9))
    rejected("candidate_not_in_normal_form", "point-form", put("candidate", "point", value=[2, 1, 2]))
    rejected(
        "coefficient_beyond_its_digits",
        "not-reduced",
        put("candidate", "coefficients", 0, 0, value=81, id="c2"),
        "forms",
    )
    rejected(
        "torsion_beyond_its_order",
        "not-reduced",
        _candidate(prime=5, id="c", form="coefficients", coefficients=[], torsion=[19], disc=None),
    )


def limits(traps: Traps) -> None:
    declined = traps.declined
    declined(
        "many_digits_of_a_coefficient", put("candidate", "coefficients", 0, 1, value=5000, id="c1"), "forms"
    )
    declined("many_digits_of_a_candidate", put("candidate", "digits", value=5000))
    declined("another_version", put("header", "format", value="sieve-proof/2"))
    declined("another_format", put("header", "format", value="survey/1"))
    declined(
        "deep_nesting", lambda log: _replace_text(log, "group", b'{"kind":' + b"[" * 50 + b"]" * 50 + b"}")
    )
    declined("integer_of_five_thousand_digits", lambda log: _digits(log, 5000))
    declined("genus_thirteen", put("header", "genus", value=13))
    declined("prime_beyond_the_limit", put("local", "prime", value=2**20 + 7))
    declined("precision_meant_to_hang", put("padic", "digits", value=10**9), "demo")
    declined("terms_meant_to_hang", put("padic", "terms", value=10**9), "demo")
    declined("digits_of_a_candidate_meant_to_hang", put("candidate", "digits", value=10**9))
    declined("series_meant_to_hang", whole(_long_series), "demo")
    declined("place_of_great_height", whole(_great_height), "closed_point")
    declined("many_base_points", put("local", "base", value=lambda b: b * 300), "demo")
    declined("section_of_large_degree", whole(_large_degree), "demo")
    declined("field_too_large", put("local", "counts", value=3, prime=103), "genus_three")
    declined(
        "complete_list_at_a_large_prime",
        _premise(id="complete 1048583", statement="a", source="b", prime=1048583),
    )
    declined("ell_beyond_the_limit", put("saturated", "ell", value=2**64 + 13), "demo")


def traps() -> Traps:
    """All of this file."""
    out = Traps()
    for section in (the_text, shapes, the_order_of_records, the_statement, limits):
        section(out)
    return out
