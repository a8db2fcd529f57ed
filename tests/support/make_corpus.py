"""Bad proof logs made from accepted ones, each with the exit code, line and reason code it must get.

Run as `python -m tests.support.make_corpus` to write data/proofs/{rejected,malformed,declined} and
expected.tsv anew; the result depends on the accepted logs alone.  The expectations are written here by hand,
never taken from the checker.
"""

from __future__ import annotations

import itertools
import json
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from sieve.exact.abelian import quotient_by
from sieve.proof.checker import Proof, decode

CORPUS = Path(__file__).resolve().parents[2] / "data" / "proofs"
FOLDERS = ("malformed", "rejected", "declined")
EXIT = {"malformed": 3, "rejected": 3, "declined": 2}


def dump(record: Any) -> bytes:
    """A record as a line without its newline."""
    return json.dumps(record, separators=(",", ":")).encode()


class Log:
    """An accepted log that is being spoilt: parsed records, and lines that replace their text."""

    def __init__(self, name: str) -> None:
        data = (CORPUS / "accepted" / f"{name}.jsonl").read_bytes()
        self.records: list[Any] = [json.loads(line) for line in data.splitlines()]
        self.raw: dict[int, bytes] = {}
        self.tail = b"\n"

    def find(self, kind: str, n: int = 0, **wanted: Any) -> int:
        """The index of the n-th record of a kind with the given fields."""
        found = [
            i
            for i, r in enumerate(self.records)
            if r["kind"] == kind and all(r.get(k) == v for k, v in wanted.items())
        ]
        return found[n]

    def data(self) -> bytes:
        """The bytes of the log."""
        lines = [self.raw.get(i, None) or dump(r) for i, r in enumerate(self.records)]
        lines = [b"" if self.raw.get(i) == b"" else line for i, line in enumerate(lines)]
        return b"\n".join(lines) + self.tail if lines else b""


Edit = Callable[[Log], int]
"""Spoils the log; returns the index of the record that must be blamed."""


@dataclass(frozen=True)
class Trap:
    folder: str
    name: str
    source: str
    edit: Edit
    code: str


def put(kind: str, *path: Any, value: Any, n: int = 0, blame: str = "", **wanted: Any) -> Edit:
    """Replace the value at a path in a record; `value` may be a function of the old value."""

    def edit(log: Log) -> int:
        i = log.find(kind, n, **wanted)
        target = log.records[i]
        for key in path[:-1]:
            target = target[key]
        target[path[-1]] = value(target[path[-1]]) if callable(value) else value
        return log.find(blame) if blame else i

    return edit


def drop(kind: str, n: int = 0, blame: str = "", m: int = 0, **wanted: Any) -> Edit:
    """Leave a record out and correct the number of records; the blame goes to what needs it."""

    def edit(log: Log) -> int:
        i = log.find(kind, n, **wanted)
        del log.records[i]
        log.records[-1]["records"] = len(log.records) - 1
        return log.find(blame, m) if blame else i

    return edit


def text(kind: str, old: bytes, new: bytes, n: int = 0) -> Edit:
    """Replace bytes of a line."""

    def edit(log: Log) -> int:
        i = log.find(kind, n)
        line = log.raw.get(i) or dump(log.records[i])
        assert old in line
        log.raw[i] = line.replace(old, new, 1)
        return i

    return edit


def twice(kind: str, n: int = 0) -> Edit:
    """Repeat a record right after itself."""

    def edit(log: Log) -> int:
        i = log.find(kind, n)
        log.records.insert(i + 1, json.loads(dump(log.records[i])))
        return i + 1

    return edit


def move(kind: str, place: int, n: int = 0, blame: int | None = None) -> Edit:
    """Move a record to an index."""

    def edit(log: Log) -> int:
        i = log.find(kind, n)
        log.records.insert(place, log.records.pop(i))
        return place if blame is None else blame

    return edit


def whole(change: Callable[[Log], int]) -> Edit:
    """Any other edit."""
    return change


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


def _claim_more(log: Log) -> int:
    """One more candidate claimed eliminated than there are fates for."""
    extra = next(
        [r["prime"], r["id"]] for r in log.records if r["kind"] == "fate" and r["verdict"] == "rational"
    )
    log.records[-1]["eliminated"].append(extra)
    return len(log.records) - 1


def _known_point_eliminated(log: Log) -> int:
    """A candidate that is a rational point gets the uses that kill another one."""
    uses = log.records[log.find("fate", verdict="eliminated")]["uses"]
    i = log.find("fate", verdict="rational")
    old = log.records[i]
    log.records[i] = {
        "kind": "fate",
        "prime": old["prime"],
        "id": old["id"],
        "verdict": "eliminated",
        "uses": uses,
    }
    log.records[-1]["eliminated"].insert(0, [old["prime"], old["id"]])
    return i


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


def _double_group(log: Log) -> int:
    """A cyclic group J(F_v) is claimed to be twice as large, all logarithms doubled."""
    i = log.find("local")
    r = log.records[i]
    r["invariants"] = [2 * d for d in r["invariants"]]
    r["unit"] = [2 * a for a in r["unit"]]
    r["base"] = [[p, [2 * a for a in log_]] for p, log_ in r["base"]]
    return i


def _quotient_group(log: Log) -> int:
    """A cyclic group J(F_v) is replaced by its quotient of order 7."""
    i = log.find("local", prime=7)
    r = log.records[i]
    assert r["invariants"][0] % 7 == 0
    r["invariants"], r["unit"] = [7], [r["unit"][0] % 7]
    r["base"] = [[p, [a[0] % 7]] for p, a in r["base"]]
    return i


def _smaller_torsion_bound(log: Log) -> int:
    """A torsion generator is dropped from the group, its bound stays."""
    group = log.records[log.find("group")]
    order, _ = group["torsion"].pop()
    assert order
    return log.find("saturated")


def _reducible(log: Log) -> int:
    i = log.find("branch")
    first, second = log.records[i]["factors"]
    out = [0] * (len(first) + len(second) - 1)
    for a, c in enumerate(first):
        for b, d in enumerate(second):
            out[a + b] += c * d
    log.records[i]["factors"] = [out]
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


def _vectors(value: list[list[int]]) -> Edit:
    """A classes record with the one class of L/L and given vectors."""

    def edit(log: Log) -> int:
        n = len(log.records[log.find("group")]["free"]) + len(log.records[log.find("group")]["torsion"])
        vectors = [(v + [0] * n)[:n] for v in value]
        record = {"kind": "classes", "uses": [], "count": 1, "index": 1, "vectors": vectors}
        log.records.insert(-1, record)
        log.records[-1]["records"] += 1
        return len(log.records) - 2

    return edit


def _classes(count: int, index: int) -> Edit:
    def edit(log: Log) -> int:
        i = _vectors([[0]])(log)
        log.records[i].update(count=count, index=index)
        return i

    return edit


def _long_list(log: Log) -> int:
    i = log.find("local", prime=113)
    log.records[i]["define"][0][0] += [0] * 100
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


def add(number: int) -> Callable[[Any], Any]:
    """Add to a number."""
    return lambda value: value + number


def without(index: int) -> Callable[[Any], Any]:
    """A list without one entry."""
    return lambda value: [x for i, x in enumerate(value) if i != index % len(value)]


def _traps() -> list[Trap]:
    traps: list[Trap] = []

    def malformed(name: str, code: str, edit: Edit, source: str = "torsion") -> None:
        traps.append(Trap("malformed", name, source, edit, code))

    def rejected(name: str, code: str, edit: Edit, source: str = "torsion") -> None:
        traps.append(Trap("rejected", name, source, edit, code))

    def declined(name: str, edit: Edit, source: str = "torsion") -> None:
        traps.append(Trap("declined", name, source, edit, "declined"))

    # the text
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
    # shapes
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
        put("group", "free", 0, 1, 1, "mumford", 0, 0, value="0.5"),
        "closed_point",
    )
    malformed(
        "fraction_as_an_integer",
        "type",
        put("group", "free", 0, 1, 1, "mumford", 0, 0, value=1),
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
        "section_not_reduced", "range", put("local", "define", 0, 0, 0, value=add(113), prime=113), "demo"
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
        put("group", "free", 0, 1, 1, "mumford", 0, 0, value="2/6"),
        "closed_point",
    )
    malformed(
        "fraction_over_zero",
        "range",
        put("group", "free", 0, 1, 1, "mumford", 0, 0, value="1/0"),
        "closed_point",
    )
    malformed(
        "premise_on_a_list_without_its_prime", "keys", _premise(id="complete 11", statement="a", source="b")
    )
    malformed("place_entry_missing", "length", put("local", "mumford", value=[]), "closed_point")
    # the order of records
    rejected("header_twice", "order", twice("header"))
    rejected("group_missing", "order", drop("group", blame="premise"))
    rejected("group_first", "order", move("group", 0))
    rejected("premise_after_candidates", "order", move("premise", 5, 1, 5))
    rejected("evidence_after_a_fate", "order", move("saturated", 22, 0, 22))
    rejected("record_after_the_end", "order", whole(_after_the_end))
    rejected("end_twice", "order", twice("end"))
    rejected("classes_twice", "order", twice("classes"), "empty_by_classes")
    # the statement
    rejected("another_genus", "genus", put("header", "genus", value=3))
    rejected("singular_curve", "singular", put("header", "f", value=[0, 0, 1, 0, 0, 0, 1]))
    rejected("leading_zero_of_f", "trailing-zero", put("header", "f", value=lambda f: [*f, 0]))
    rejected("h_of_large_degree", "degree", put("header", "h", value=[0, 0, 0, 0, 1]))
    rejected("scale_zero", "scale", put("header", "y_scale", value="0"))
    rejected("no_digest", "digest", put("header", "case", "sha256", value="none"))
    rejected("another_curve", "point-off-curve", put("header", "f", 0, value=2, blame="group"), "demo")
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
        put("group", "free", 0, 1, 1, "mumford", 0, 2, value="2"),
        "closed_point",
    )
    rejected(
        "place_off_the_curve",
        "place-off-curve",
        put("group", "free", 0, 1, 1, "mumford", 1, 0, value="2"),
        "closed_point",
    )
    rejected(
        "place_with_large_w",
        "place-degree",
        put("group", "free", 0, 1, 1, "mumford", 1, value=["1", "10/3", "1"]),
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
    # groups
    rejected("local_at_a_composite", "not-prime", put("local", "prime", value=9))
    rejected("local_at_a_bad_prime", "not-smooth", put("local", "prime", value=13))
    rejected("local_twice", "duplicate", twice("local"))
    rejected(
        "invariants_not_dividing",
        "invariants",
        put("local", "invariants", value=lambda d: d[::-1], prime=113),
        "demo",
    )
    rejected("too_many_invariants", "invariants", put("local", "invariants", value=[19] * 5))
    rejected("group_twice_as_large", "not-onto", whole(_double_group), "demo")
    rejected("quotient_of_the_group", "index", whole(_quotient_group), "demo")
    rejected(
        "logarithm_of_a_base_point",
        "relation-log",
        put("local", "base", 0, 1, 0, value=lambda a: (a + 1) % 91, prime=7),
        "demo",
    )
    rejected(
        "logarithm_of_the_fibre",
        "relation-log",
        put("local", "unit", 0, value=lambda a: (a + 1) % 91, prime=7),
        "demo",
    )
    rejected("logarithm_not_reduced", "not-reduced", put("local", "unit", 0, value=add(91), prime=7), "demo")
    rejected("base_point_twice", "base", put("local", "base", value=lambda b: [*b, b[0]]))
    rejected(
        "point_without_a_class",
        "undefined-point",
        put("local", "define", value=without(-1), prime=113),
        "demo",
    )
    rejected(
        "definition_with_two_unknowns", "define", put("local", "define", value=without(0), prime=113), "demo"
    )
    rejected(
        "definition_of_a_known_point",
        "define",
        put("local", "define", value=lambda d: [*d, d[0]], prime=113),
        "demo",
    )
    rejected(
        "zeros_not_sorted",
        "zeros-order",
        put("local", "define", 0, 1, value=lambda z: z[::-1], prime=113),
        "demo",
    )
    rejected(
        "zero_left_out", "zeros-count", put("local", "define", 0, 1, value=without(0), prime=113), "demo"
    )
    rejected("zero_with_another_multiplicity", "zero-multiplicity", _shift_multiplicity, "demo")
    rejected("zero_of_another_section", "zero", _other_zero, "demo")
    rejected(
        "zero_without_a_point",
        "zero-number",
        put("local", "define", 0, 1, -1, value=10**6, prime=113),
        "demo",
    )
    rejected("relations_left_out", "index", put("local", "close", value=[], prime=7), "demo")
    rejected(
        "most_relations_left_out", "index", put("local", "close", value=lambda c: c[:3], prime=113), "demo"
    )
    rejected("counts_out_of_place", "counts", put("local", "counts", value=1))
    rejected("bound_not_sharp", "bound", put("local", "counts", value=0, prime=3), "stated_index")
    rejected(
        "section_misses_the_place",
        "place-section",
        put("local", "mumford", 0, 1, 0, value=lambda c: (c + 1) % 5),
        "closed_point",
    )
    rejected("logarithm_of_a_ramified_point", "relation-log", whole(_ramified), "odd_degree_at_three")
    rejected("zero_at_the_other_infinity", "zero", _other_infinity, "demo")
    rejected("zero_at_infinity_too_often", "zeros-infinity", _at_infinity, "demo")
    rejected("place_with_a_denominator", "place-denominator", put("local", "prime", value=3), "closed_point")
    rejected("too_few_points", "generation", whole(_few_points), "empty_modulo_three")
    rejected("places_twice", "place-order", put("padic", "mumford", value=lambda m: m * 2), "closed_point")
    rejected("place_numbers", "place-order", put("local", "mumford", 0, 0, value=1), "closed_point")
    rejected(
        "points_where_there_are_none", "empty-record", put("local", "counts", value=2), "empty_modulo_three"
    )
    malformed("no_points_claimed", "type", _claim_no_points)
    # torsion and saturation
    rejected(
        "torsion_dimension_too_small", "dimension", put("torsion", "dimension", value=add(-1)), "genus_three"
    )
    rejected("torsion_at_a_composite", "not-prime", put("torsion", "ell", value=6), "demo")
    rejected("torsion_by_a_missing_prime", "no-local", put("torsion", "by", value=11), "demo")
    rejected("torsion_by_missing_factors", "no-branch", drop("branch", blame="torsion"), "genus_three")
    rejected("torsion_twice", "duplicate", twice("torsion"), "demo")
    rejected("two_torsion_modulo_two", "torsion-two", _two_by_two, "residue_characteristic_two")
    rejected("more_torsion_than_given", "torsion", _bound_of_dimension_one, "demo")
    rejected("saturation_without_torsion_bound", "no-torsion", drop("torsion", blame="saturated"), "demo")
    rejected("saturation_with_no_primes", "not-injective", put("saturated", "primes", value=[]), "demo")
    rejected("saturation_at_a_missing_prime", "no-local", put("saturated", "primes", value=[11]), "demo")
    rejected("saturation_twice", "duplicate", twice("saturated"), "demo")
    rejected("saturation_prime_twice", "duplicate", put("saturated", "primes", value=[5, 5]), "demo")
    rejected("torsion_generator_of_another_order", "torsion-order", _another_order, "odd_degree_at_three")
    rejected("factor_changed", "factor", put("branch", "factors", 0, 0, value=add(1)), "genus_three")
    rejected(
        "trivial_factors", "factor", put("branch", "factors", value=lambda f: [[1]] * 40 + f), "genus_three"
    )
    rejected("factors_of_even_degree_in_odd_genus", "branch", whole(_even_degrees))
    rejected("factor_missing", "factor", put("branch", "factors", value=without(0)), "genus_three")
    rejected("factors_multiplied", "irreducible", whole(_reducible), "genus_three")
    rejected("factors_multiplied_at_chosen_primes", "irreducible", whole(_cubic_times_quartic))
    rejected("no_primes_for_the_factors", "irreducible", put("branch", "primes", value=[]), "genus_three")
    rejected("branch_twice", "duplicate", twice("branch"), "genus_three")
    # integrals
    rejected("place_of_large_degree_for_its_section", "place-section", whole(_large_place), "closed_point")
    rejected("place_section_with_irrational_zeros", "section-zeros", whole(_irrational), "closed_point")
    rejected("place_in_a_ramified_disc", "place-ramified", whole(_ramified_place), "closed_point")
    rejected("coefficients_not_determined", "not-determined", whole(_not_determined), "sole_by_coefficients")
    rejected("multiple_of_the_group_by_the_bound", "bound", whole(_multiple_by_bound), "demo")
    rejected("multiple_of_the_group_by_counts", "order", whole(_multiple), "demo")
    malformed("case_with_another_key", "keys", put("header", "case", value=lambda c: c | {"trust": "x"}))
    declined("many_generators", whole(_many_generators))
    declined("many_vectors", _vectors([[0]] * 1001))
    rejected("padic_twice", "duplicate", twice("padic"), "demo")
    rejected(
        "section_with_irrational_zeros",
        "section-zeros",
        put("padic", "sections", 0, value=[[2, 0, 0, 1], []]),
        "demo",
    )
    rejected("section_zero", "section", put("padic", "sections", 0, value=[[], []]), "demo")
    rejected(
        "section_zero_modulo_p", "section-vanishes", put("padic", "sections", 0, value=[[5, 10], []]), "demo"
    )
    rejected("multiple_changed", "combination", put("padic", "discs", 0, 1, value=add(1)), "demo")
    rejected("multiple_zero", "disc", put("padic", "discs", 0, 1, value=0), "demo")
    rejected("combination_changed", "combination", put("padic", "discs", 0, 2, 0, 1, value=add(1)), "demo")
    rejected(
        "combination_with_a_missing_section", "disc", put("padic", "discs", 0, 2, 0, 0, value=999), "demo"
    )
    rejected("disc_treated_twice", "disc", put("padic", "discs", value=lambda d: [*d, d[0]]), "demo")
    rejected("disc_left_out", "disc-missing", _disc_left_out, "demo")
    rejected("too_few_terms", "terms", put("padic", "terms", value=5), "demo")
    rejected("too_few_digits", "not-eliminated", _few_digits, "closed_point")
    rejected("no_section_through_a_place", "place-missing", put("padic", "mumford", value=[]), "closed_point")
    rejected(
        "section_misses_the_place_modulo_p_n",
        "place-section",
        put("padic", "mumford", 0, 1, 0, value=add(5**6)),
        "closed_point",
    )
    rejected("integrals_without_the_group", "no-local", drop("local", blame="padic"), "demo")
    # fates
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
    # the end
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
    rejected("empty_with_points", "conclusion", _empty_with_points)
    rejected("number_of_classes", "count", _classes(2, 1), "demo")
    rejected("index_of_classes", "index", _classes(1, 2), "demo")
    rejected("class_twice", "vector", _vectors([[0], [1]]), "demo")
    rejected("emptiness_without_classes", "conclusion", drop("classes", blame="end"), "empty_by_classes")
    rejected("too_few_terms_for_a_point", "terms", whole(_no_sections), "odd_degree_at_three")
    # classes that remain
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
    # coefficients with torsion coordinates and discs
    rejected("another_torsion_coordinate", "not-eliminated", _candidate_of("a2", torsion=[0]), *TORSION)
    rejected("torsion_coordinate_left_out", "not-eliminated", _candidate_of("a2", torsion=None), *TORSION)
    rejected("disc_of_coefficients_left_out", "not-eliminated", _candidate_of("a3", disc=None), *TORSION)
    rejected("another_disc_of_coefficients", "point-elsewhere", _candidate_of("a4", disc=[1, 0, 1]), *TORSION)
    rejected(
        "point_with_another_torsion_coordinate", "point-elsewhere", _candidate_of("a5", torsion=[2]), *TORSION
    )
    rejected("contradictory_disc_left_out", "not-eliminated", _candidate_of("a7", disc=None), *TORSION)
    malformed("torsion_coordinates_too_many", "length", _torsion_coordinates, *TORSION)
    # places that meet discs
    rejected(
        "point_eliminated_by_a_place_in_discs", "not-eliminated", _known_point_eliminated, "place_in_discs"
    )
    rejected(
        "point_eliminated_by_a_place_partly_in_discs",
        "not-eliminated",
        _known_point_eliminated,
        "place_partly_in_discs",
    )
    rejected(
        "place_in_a_disc_without_logarithm", "disc-missing", whole(_place_without_a_disc), "place_in_discs"
    )
    rejected(
        "place_partly_in_discs_without_a_section",
        "place-missing",
        put("padic", "mumford", value=[]),
        "place_partly_in_discs",
    )
    rejected("place_with_a_section_of_many_zeros", "terms", whole(_many_zeros), "place_partly_in_discs")
    # limits
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
    declined("section_of_large_degree", whole(_long_list), "demo")
    declined("field_too_large", put("local", "counts", value=3, prime=103), "genus_three")
    declined("ell_beyond_the_limit", put("saturated", "ell", value=2**64 + 13), "demo")
    return traps


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


def _shift_multiplicity(log: Log) -> int:
    """A double zero takes the place of two simple ones."""
    i = log.find("local", prime=113)
    zeros = log.records[i]["define"][0][1]
    simple = [z for z in zeros if zeros.count(z) == 1]
    zeros[zeros.index(simple[1])] = simple[0]
    return i


def _other_zero(log: Log) -> int:
    i = log.find("local", prime=113)
    define = log.records[i]["define"]
    define[0][1] = define[1][1]
    return i


def _two_by_two(log: Log) -> int:
    i = log.find("torsion")
    local = log.records[log.find("local", prime=2)]
    dimension = sum(d % 2 == 0 for d in local["invariants"])
    log.records.insert(i, {"kind": "torsion", "ell": 2, "dimension": dimension, "by": 2})
    return i


def _bound_of_dimension_one(log: Log) -> int:
    """5-torsion is bounded by a group that has some."""
    i = log.find("torsion", ell=5)
    log.records[i].update(by=113, dimension=2)
    return log.find("saturated", ell=5)


def _disc_left_out(log: Log) -> int:
    """The first fate whose candidate lies in the disc has no logarithm."""
    log.records[log.find("padic")]["discs"] = []
    return log.find("fate", verdict="eliminated")


def _few_digits(log: Log) -> int:
    """With one digit the integrals say nothing, and the first candidate survives."""
    record = log.records[log.find("padic")]
    record["digits"] = 1
    return log.find("fate", verdict="eliminated")


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


def _claim_no_points(log: Log) -> int:
    i = log.find("local")
    v = log.records[i]["prime"]
    log.records[i] = {
        "kind": "local",
        "prime": v,
        "invariants": [],
        "origin": None,
        "unit": [],
        "base": [],
        "define": [],
        "close": [],
        "mumford": [],
        "counts": 0,
    }
    return i


def _another_order(log: Log) -> int:
    """A torsion generator of order 10 is said to have order 5."""
    log.records[log.find("group")]["torsion"][1][0] = 5
    log.records[log.find("saturated")]["primes"] = [3]
    return log.find("saturated")


def _empty_with_points(log: Log) -> int:
    """A complete list without candidates shows that there are no points, and the log lists one."""
    log.records = [r for r in log.records if r["kind"] in ("header", "group", "premise", "end")]
    log.records[-1].update(records=4, eliminated=[], conclusion="empty", points=[[1, 1, 0]])
    return len(log.records) - 1


def _at_infinity(log: Log) -> int:
    """A zero at infinity is listed once more instead of a simple affine one."""
    for i, record in enumerate(log.records):
        if record["kind"] != "local":
            continue
        last = max(z for entry in record["define"] + record["close"] for z in entry[1])
        for entry in record["close"]:
            infinite = [z for z in entry[1] if z >= last - 1]
            affine = [z for z in entry[1] if z < last - 1]
            if infinite and affine:
                entry[1] = sorted([*affine[1:], *infinite, infinite[0]])
                return i
    raise AssertionError("no section with zeros at infinity")


def _other_infinity(log: Log) -> int:
    """The other point at infinity is listed as a zero."""
    for i, record in enumerate(log.records):
        for entry in record["close"] if record["kind"] == "local" else []:
            last = max(z for e in record["define"] + record["close"] for z in e[1])
            if last in entry[1] and last - 1 not in entry[1]:
                entry[1] = [last - 1 if z == last else z for z in entry[1]]
                return i
    raise AssertionError("no section with a zero at infinity")


def _ramified(log: Log) -> int:
    """2 P ~ U does not hold for the logarithm of a ramified base point, and no other relation says so."""
    i = log.find("local")
    record = log.records[i]
    k = next(k for k, (_, value) in enumerate(record["base"]) if value == [1, 0])
    record["base"][k][1] = [0, 1]
    record["close"] = []
    return i


def _even_degrees(log: Log) -> int:
    """Genus 3 and an irreducible polynomial of degree 8 (x^n - x - 1 is irreducible, Selmer 1956)."""
    f = [-1, -1, 0, 0, 0, 0, 0, 0, 1]
    log.records = log.records[:3]
    log.records[0].update(f=f, genus=3)
    log.records[1].update(base=[[1, {"point": [1, 1, 0]}]], torsion=[])
    log.records.append({"kind": "branch", "factors": [[4 * c for c in f]], "primes": EVEN_PRIMES})
    return 3


def _cubic_times_quartic(log: Log) -> int:
    """x^3 - x - 1 times x^4 - x - 1 as one factor, at primes where its degrees are 3, 4 and 2, 2, 3."""
    f = [0] * 8
    for i, c in enumerate([-1, -1, 0, 1]):
        for j, d in enumerate([-1, -1, 0, 0, 1]):
            f[i + j] += c * d
    log.records = log.records[:3]
    log.records[0].update(f=f, genus=3)
    log.records[1].update(base=[[1, {"point": [1, 0, 0]}]], torsion=[])
    log.records.append({"kind": "branch", "factors": [[4 * c for c in f]], "primes": SEVEN_PRIMES})
    return 3


def _singular_at_infinity(log: Log) -> int:
    """y^2 + y = f with an even coefficient of x^5: smooth modulo 2 except at infinity."""
    log.records[0]["f"] = [0, -1, 0, 4, -5, 2]
    return log.find("candidate")


def _few_points(log: Log) -> int:
    """A curve with few points modulo 3, too few to generate J(F_3)."""
    i = log.find("local")
    log.records[0]["f"] = FEW
    log.records[i].update(invariants=[2], origin=0, unit=[1])
    return i


def _long_series(log: Log) -> int:
    """Terms and digits within their limits, but not both together."""
    i = log.find("padic")
    log.records[i].update(digits=1000, terms=5000)
    return i


def _great_height(log: Log) -> int:
    """u of degree 60 over denominators of 3000 digits."""
    i = log.find("group")
    u = [f"1/{10**3000 + 2 * k + 1}" for k in range(60)] + ["1"]
    log.records[i]["free"][0][1][1] = {"mumford": [u, []]}
    return i


def _large_place(log: Log) -> int:
    """All six zeros of y - 2 as one place of degree 6, and the section y - 2 of degree 3 through it."""
    f = log.records[0]["f"]
    u = [str(c - 4 * (i == 0)) for i, c in enumerate(f)]
    log.records[log.find("group")]["free"] = [[[1, {"mumford": [u, ["2"]]}], [-3, {"fibres": 1}]]]
    for record in log.records:
        if record["kind"] == "local":
            record["mumford"] = [[0, [2], []]]
    i = log.find("padic")
    log.records[i]["mumford"] = [[0, [-2], [1]]]
    return i


def _ramified_place(log: Log) -> int:
    """The six Weierstrass points as one place; the section (x - 1)^2 y has more zeros in one disc."""
    u = [str(c) for c in log.records[0]["f"]]
    log.records[log.find("group")]["free"] = [[[1, {"mumford": [u, []]}], [-3, {"fibres": 1}]]]
    for record in log.records:
        if record["kind"] == "local":
            record["mumford"] = [[0, [], []]]
    i = log.find("padic")
    log.records[i]["mumford"] = [[0, [], [1, -2, 1]]]
    log.records[i]["terms"] = 60
    return i


def _irrational(log: Log) -> int:
    """The section through the place times x^2 + 2, which has no zero modulo 5."""
    i = log.find("padic")
    k, *section = log.records[i]["mumford"][0]
    widened = []
    for c in section:
        product = [0] * (len(c) + 2)
        for j, a in enumerate(c):
            product[j] += 2 * a
            product[j + 2] += a
        widened.append(product)
    log.records[i]["mumford"] = [[k, *widened]]
    return i


def _not_determined(log: Log) -> int:
    """More digits than the groups see."""
    record = log.records[log.find("candidate", id="c4")]
    record["coefficients"] = [[0, 9], [0, 9]]
    return log.find("fate", id="c4")


def _multiple(log: Log) -> int:
    """Some of the relations at 7 only, and the group that they define: J(F_7) is a proper quotient of it."""
    i = log.find("local", prime=7)
    record = log.records[i]
    proof = Proof()
    for line in log.data().splitlines()[: i + 1]:
        proof.read(decode(line))
    local = proof.locals[7]
    rows = [tuple(local.relation(c, zeros)) for c, zeros in record["close"]]
    ramified = [k for k in range(local.points) if local.reduction.conjugate(k) == k]
    fixed = [tuple(2 * a - (j == 0) for j, a in enumerate(local.vector(k))) for k in ramified]
    for chosen in itertools.combinations(range(len(rows)), local.width - len(fixed)):
        group = quotient_by(local.width, [*fixed, *(rows[k] for k in chosen)])
        if group is None or group.order <= 91 or len(group.invariants) > 4:
            continue
        coordinates = [[int(a) for a in row] for row in group.coordinates]
        record["invariants"] = list(group.invariants)
        record["unit"] = coordinates[0]
        record["base"] = [[k, row] for (k, _), row in zip(record["base"], coordinates[1:], strict=True)]
        record["close"] = [record["close"][k] for k in chosen]
        record["counts"] = 2
        return i
    raise AssertionError("no multiple of the group")


def _multiple_by_bound(log: Log) -> int:
    i = _multiple(log)
    log.records[i]["counts"] = 0
    return i


def _many_generators(log: Log) -> int:
    i = log.find("group")
    log.records[i].update(rank=61, free=[[]] * 61)
    return i


def _no_sections(log: Log) -> int:
    """Fewer terms than digits, and no section that would need more."""
    record = log.records[log.find("padic")]
    record.update(digits=8, terms=5, sections=[], discs=[])
    return log.find("fate", verdict="eliminated")


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


def _place_without_a_disc(log: Log) -> int:
    """No logarithm in the disc of (6, 4) modulo 11, which holds two points of the place."""
    i = log.find("padic")
    discs = log.records[i]["discs"]
    log.records[i]["discs"] = [entry for entry in discs if entry[0] != DOUBLE_DISC]
    return i


def _many_zeros(log: Log) -> int:
    """The section through the place times x^2 vanishes too often in one disc for the number of terms."""
    i = log.find("padic")
    k, even, odd = log.records[i]["mumford"][0]
    log.records[i]["mumford"] = [[k, [0, 0, *even], [0, 0, *odd]]]
    return i


TORSION = ("torsion_coordinates",)

DOUBLE_DISC = 8

EVEN_PRIMES = [2, 3]

SEVEN_PRIMES = [3, 71]

FEW = [0, 1, 0, 0, 0, 2, 2]
"""f with one point modulo 3."""


def _digits(log: Log, count: int) -> int:
    return text("header", b'"genus":2', b'"genus":' + b"9" * count)(log)


def corpus() -> tuple[dict[str, bytes], list[tuple[str, int, int, str]]]:
    """All bad logs by path below data/proofs, and rows (path, exit code, line, reason code)."""
    files: dict[str, bytes] = {}
    rows: list[tuple[str, int, int, str]] = []
    for trap in _traps():
        log = Log(trap.source)
        line = trap.edit(log) + 1
        path = f"{trap.folder}/{trap.name}.jsonl"
        files[path] = log.data()
        rows.append((path, EXIT[trap.folder], line, trap.code))
    return files, sorted(rows)


def main() -> None:
    """Write the corpus."""
    files, rows = corpus()
    for folder in FOLDERS:
        (CORPUS / folder).mkdir(parents=True, exist_ok=True)
        for old in (CORPUS / folder).glob("*.jsonl"):
            old.unlink()
    for path, data in files.items():
        (CORPUS / path).write_bytes(data)
    lines = ["file\texit\tline\tcode", *("\t".join(map(str, row)) for row in rows)]
    (CORPUS / "expected.tsv").write_text("\n".join(lines) + "\n", encoding="utf-8")
    print(len(rows), "bad logs", sum(map(len, files.values())), "bytes")


if __name__ == "__main__":
    main()
