"""Bad logs: groups, torsion and saturation, integrals, closed places."""

from __future__ import annotations

import itertools
from collections.abc import Sequence

from sieve.exact.abelian import quotient_by
from sieve.proof.checker import Proof, decode
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


def _reducible(log: Log) -> int:
    i = log.find("branch")
    first, second = log.records[i]["factors"]
    out = [0] * (len(first) + len(second) - 1)
    for a, c in enumerate(first):
        for b, d in enumerate(second):
            out[a + b] += c * d
    log.records[i]["factors"] = [out]
    return i


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
        "places": [],
        "counts": 0,
    }
    return i


def _another_order(log: Log) -> int:
    """A torsion generator of order 10 is said to have order 5."""
    log.records[log.find("group")]["torsion"][1][0] = 5
    log.records[log.find("saturated")]["primes"] = [3]
    return log.find("saturated")


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
    log.records[0].update(equation=[[-c for c in f], [], [1]], weight=4, genus=3)
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
    log.records[0].update(equation=[[-c for c in f], [], [1]], weight=4, genus=3)
    log.records[1].update(base=[[1, {"point": [1, 0, 0]}]], torsion=[])
    log.records.append({"kind": "branch", "factors": [[4 * c for c in f]], "primes": SEVEN_PRIMES})
    return 3


def _few_points(log: Log) -> int:
    """A curve with few points modulo 3, too few to generate J(F_3)."""
    i = log.find("local")
    log.records[0]["equation"][0] = [-c for c in FEW]
    log.records[i].update(invariants=[2], origin=0, unit=[1])
    return i


def _large_place(log: Log) -> int:
    """All six zeros of y - 2 as one place of degree 6, and the section y - 2 of degree 3 through it."""
    f = [-c for c in log.records[0]["equation"][0]]
    place = {"closed": [[str(c - 4 * (i == 0)) for i, c in enumerate(f)], ["0", "1"], ["2"], ["1"]]}
    log.records[log.find("group")]["free"] = [[[1, place], [-3, {"fibres": 1}]]]
    for record in log.records:
        if record["kind"] == "local":
            record["places"] = [[0, [3, [record["prime"] - 2], [1]], []]]
    i = log.find("padic")
    log.records[i]["places"] = [[0, [3, [-2], [1]]]]
    return i


def _widened(*factor: int) -> Edit:
    """The section through the place times a polynomial in x."""

    def edit(log: Log) -> int:
        i = log.find("padic")
        k, (n, *rows) = log.records[i]["places"][0]
        log.records[i]["places"] = [[k, [n + len(factor) - 1, *(_product(row, factor) for row in rows)]]]
        return i

    return edit


def _product(a: Sequence[int], b: Sequence[int]) -> list[int]:
    out = [0] * (len(a) + len(b) - 1)
    for i, c in enumerate(a):
        for j, d in enumerate(b):
            out[i + j] += c * d
    return out


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
    rows = [tuple(local.relation(*local.section(entry))) for entry in record["close"]]
    ramified = [k for k in range(local.points) if local.reduction.conjugate(k) == k]
    fixed = [tuple(local.relation(1, [k, k])) for k in ramified]
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


EVEN_PRIMES = [2, 3]


SEVEN_PRIMES = [3, 71]


FEW = [0, 1, 0, 0, 0, 2, 2]
"""f with one point modulo 3."""


def groups(traps: Traps) -> None:
    malformed, rejected = traps.malformed, traps.rejected
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
        put("local", "places", 0, 1, 1, 0, value=lambda c: (c + 1) % 5),
        "closed_point",
    )
    rejected("logarithm_of_a_ramified_point", "relation-log", whole(_ramified), "odd_degree_at_three")
    rejected("zero_at_the_other_infinity", "zero", _other_infinity, "demo")
    rejected("zero_at_infinity_too_often", "zero-multiplicity", _at_infinity, "demo")
    rejected("place_with_a_denominator", "place-denominator", put("local", "prime", value=3), "closed_point")
    rejected("too_few_points", "generation", whole(_few_points), "empty_modulo_three")
    malformed("places_twice", "length", put("padic", "places", value=lambda m: m * 2), "closed_point")
    rejected("place_of_another_number", "place-order", put("padic", "places", 0, 0, value=1), "closed_point")
    rejected("place_numbers", "place-order", put("local", "places", 0, 0, value=1), "closed_point")
    rejected(
        "points_where_there_are_none", "empty-record", put("local", "counts", value=2), "empty_modulo_three"
    )
    malformed("no_points_claimed", "type", _claim_no_points)


def torsion_and_saturation(traps: Traps) -> None:
    rejected = traps.rejected
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


def integrals(traps: Traps) -> None:
    malformed, rejected, declined = traps.malformed, traps.rejected, traps.declined
    rejected("place_of_large_degree_for_its_section", "place-collapses", whole(_large_place), "closed_point")
    rejected("place_section_with_irrational_zeros", "section-zeros", _widened(2, 0, 1), "closed_point")
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
        put("padic", "sections", 0, value=[3, [2, 0, 0, 1]]),
        "demo",
    )
    rejected("section_zero", "section-vanishes", put("padic", "sections", 0, value=[3]), "demo")
    rejected(
        "section_zero_modulo_p", "section-vanishes", put("padic", "sections", 0, value=[1, [5, 10]]), "demo"
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
    malformed("no_section_through_a_place", "length", put("padic", "places", value=[]), "closed_point")
    rejected(
        "section_misses_the_place_modulo_p_n",
        "place-section",
        put("padic", "places", 0, 1, 1, 0, value=add(5**5)),
        "closed_point",
    )
    rejected("integrals_without_the_group", "no-local", drop("local", blame="padic"), "demo")


def _nothing_to_see(log: Log) -> int:
    """No point modulo 3, a place of degree 2, and the section 0 through it, which would say that Log is 0."""
    place = {"closed": [["1", "0", "1"], ["0", "1"], ["0", "1"], ["1"]]}
    log.records[log.find("group")].update(rank=1, free=[[[1, place], [-1, {"fibres": 1}]]])
    record = {"kind": "padic", "prime": 3, "digits": 4, "terms": 8, "sections": [], "discs": []}
    i = log.find("local")
    log.records.insert(i, {**record, "places": [[0, [1, [0]]]], "reduction": False})
    return i


def places_that_meet_discs(traps: Traps) -> None:
    rejected = traps.rejected
    # modulo 5^3 the annihilator does not tell points that agree to four digits
    rejected(
        "annihilator_with_few_digits",
        "zeros-open",
        put("zeros", "annihilators", 0, 1, value=add(5**3)),
        "zeros_integral",
    )
    rejected("section_zero_through_a_place", "section-vanishes", whole(_nothing_to_see), "empty_modulo_three")
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
        "place_in_a_disc_without_logarithm", "disc-missing", put("padic", "discs", value=[]), "place_in_discs"
    )
    rejected(
        "place_section_with_a_zero_near_the_place", "section-zeros", _widened(0, 1), "place_partly_in_discs"
    )
    rejected(
        "place_with_a_section_of_many_zeros",
        "terms",
        _widened(1, -6, 15, -20, 15, -6, 1),
        "place_partly_in_discs",
    )


def traps() -> Traps:
    """All of this file."""
    out = Traps()
    for section in (groups, torsion_and_saturation, integrals, places_that_meet_discs):
        section(out)
    return out
