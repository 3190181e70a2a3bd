"""The collinearity step: pairs are examined one at a time, by three fits, never by VIF alone.

Pairs come first by correlation, then by variance inflation, and last, while the model is
significant as a whole and no predictor is, by the strongest correlation left (the joint signal).
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

from beforehand.plan import Plan
from beforehand.steps.bench import Bench, Fitted
from beforehand.steps.keeping import Keeping, order_of
from beforehand.steps.rulings import Ruling, Rulings
from beforehand.steps.state import Model, State, Term

STEP = "collinearity"

# Two evidences that agree to so many significant digits are a tie, and the plan's order decides.
TIE_DIGITS = 12

# A value further than this share of a limit from it is on its side whatever its last digits are.
FAR = 1e-9


@dataclass(frozen=True, slots=True)
class Pair:
    """Two predictors to be examined, and what called them up."""

    first: str
    second: str
    reason: str
    value: float
    limit: float | None

    @property
    def key(self) -> frozenset[str]:
        """The pair without its order."""
        return frozenset((self.first, self.second))


def collinearity(state: State, plan: Plan, bench: Bench) -> tuple[State, tuple[Ruling, ...]]:
    """Examine pairs until none is left to examine."""
    rulings = Rulings(STEP, state.rulings_made)
    keeping, order = Keeping(plan), order_of(plan)
    started = state
    bench.keep_check("collinearity", lambda: bench.design(started))
    judged: set[frozenset[str]] = set()
    while len(state.working) > 1:
        model = bench.design(state)
        pair = _next_pair(model, plan, bench, judged, order, keeping)
        if pair is None:
            pair = _joint_signal(model, plan, bench, judged, order, keeping, rulings)
        if pair is None:
            break
        before = state.working
        state = _judge(pair, state, plan, bench, keeping, rulings)
        judged = {*judged, pair.key} if state.working == before else set()
    return replace(state, rulings_made=rulings.count), tuple(rulings.made)


def reaches(value: float, limit: float) -> bool:
    """Whether a value, to the digits at which a tie is a tie, is at or over a limit."""
    # Far from the limit its last digits do not matter, and taking them costs.
    if abs(value - limit) > FAR * abs(limit):
        return value > limit
    return rounded(value) >= limit


def rounded(value: float) -> float:
    """A number to the digits at which a tie is a tie."""
    return float(f"{value:.{TIE_DIGITS - 1}e}")


def _by_strength(
    pairs: Sequence[tuple[str, str, float]], order: dict[str, int]
) -> list[tuple[str, str, float]]:
    """Pairs with the largest |r| first; ties in plan order."""
    return sorted(pairs, key=lambda pair: (-rounded(abs(pair[2])), order[pair[0]], order[pair[1]]))


def _related(first: str, second: str, keeping: Keeping) -> bool:
    """A product and its own part: correlated by construction, and the part could not leave first."""
    return first in keeping.parts(second) or second in keeping.parts(first)


def _next_pair(
    model: Model,
    plan: Plan,
    bench: Bench,
    judged: set[frozenset[str]],
    order: dict[str, int],
    keeping: Keeping,
) -> Pair | None:
    """The next pair that reaches a declared limit and is not yet judged."""
    limits = plan.collinearity.examine_when
    if limits.correlation_above is not None:
        reaching = [
            pair for pair in bench.correlations(model) if reaches(abs(pair[2]), limits.correlation_above)
        ]
        for first, second, r in _by_strength(reaching, order):
            if frozenset((first, second)) not in judged and not _related(first, second, keeping):
                return Pair(first, second, "correlation", r, limits.correlation_above)
    if limits.vif_above is not None:
        inflated = [item for item in bench.inflation(model) if reaches(item[1], limits.vif_above)]
        for name, vif in sorted(inflated, key=lambda item: (-rounded(item[1]), order[item[0]])):
            partner = _partner(name, vif, model, bench, order, keeping)
            if partner is not None and frozenset((name, partner)) not in judged:
                first, second = sorted((name, partner), key=order.__getitem__)
                return Pair(first, second, "vif", vif, limits.vif_above)
    return None


def _partner(
    name: str, vif: float, model: Model, bench: Bench, order: dict[str, int], keeping: Keeping
) -> str | None:
    """The predictor whose removal lowers the VIF of ``name`` most."""
    best: tuple[float, int, str] | None = None
    for other, left in bench.inflation_without(model, name).items():
        if _related(name, other, keeping):
            continue
        candidate = (rounded(left), order[other], other)
        if left < vif and (best is None or candidate < best):
            best = candidate
    return None if best is None else best[2]


def _joint_signal(
    model: Model,
    plan: Plan,
    bench: Bench,
    judged: set[frozenset[str]],
    order: dict[str, int],
    keeping: Keeping,
    rulings: Rulings,
) -> Pair | None:
    """A significant model without a significant predictor: the strongest pair not yet judged."""
    fitted = bench.fit(model, "working model")
    f_p = fitted.fit.f_p
    if f_p is None or f_p > plan.alpha:
        return None
    if any(fitted.significant(name, plan.alpha) for name in model.names):
        return None
    for first, second, r in _by_strength(bench.correlations(model), order):
        if frozenset((first, second)) not in judged and not _related(first, second, keeping):
            rulings.add(
                "collinearity", f"{first}, {second}", "joint_signal", fits=(fitted.id,),
                evidence={"p_model": f_p, "r": r}, value=f_p, limit=plan.alpha,
            )  # fmt: skip
            return Pair(first, second, "joint_signal", r, None)
    return None


def _judge(pair: Pair, state: State, plan: Plan, bench: Bench, keeping: Keeping, rulings: Rulings) -> State:
    """Three fits of one pair: both, without the first, without the second."""
    model = bench.design(state)
    both = bench.fit(model, "working model")
    alone_second = bench.fit(model.without(pair.first, *_hanging(pair.first, model)), f"without {pair.first}")
    alone_first = bench.fit(
        model.without(pair.second, *_hanging(pair.second, model)), f"without {pair.second}"
    )
    examined = Examined(pair, both, alone_first, alone_second)
    significant = [name for name in (pair.first, pair.second) if both.significant(name, plan.alpha)]
    if not significant:
        return _neither(examined, state, plan, bench, keeping, rulings)
    if len(significant) == 1:
        other = pair.second if significant[0] == pair.first else pair.first
        rule = plan.collinearity.when_one_significant
        if rule == "leave_to_selection":
            _rule(rulings, examined, "collinearity.when_one_significant", other, "left_to_selection", plan)
            return state
        return _remove(
            other,
            examined,
            "collinearity.when_one_significant",
            "weaker_leaves",
            state,
            plan,
            keeping,
            rulings,
        )
    return _both(examined, state, plan, keeping, rulings)


@dataclass(frozen=True, slots=True)
class Examined:
    """A pair with its three fits; ``alone_first`` is the fit in which the first stands without the second."""

    pair: Pair
    both: Fitted
    alone_first: Fitted
    alone_second: Fitted

    def alone_p(self, name: str) -> float:
        """P of one of the pair in the fit without the other; 0 in an exact fit."""
        fitted = self.alone_first if name == self.pair.first else self.alone_second
        p = fitted.p_of(name) if name in fitted.fit.tests else 1.0
        return 0.0 if p is None else p

    @property
    def weaker(self) -> str:
        """The one with the smaller |t| in the fit with both; a tie goes to the later in the plan.

        Blocks are compared by their p, since an F of several columns is no |t|.
        """
        first, second = self.pair.first, self.pair.second
        if self.both.model.term(first).single and self.both.model.term(second).single:
            strong = rounded(self.both.statistic_of(first)) > rounded(self.both.statistic_of(second))
            equal = rounded(self.both.statistic_of(first)) == rounded(self.both.statistic_of(second))
        else:
            p_first, p_second = (self.both.p_of(name) or 0.0 for name in (first, second))
            strong, equal = rounded(p_first) < rounded(p_second), rounded(p_first) == rounded(p_second)
        return second if strong or equal else first

    @property
    def ids(self) -> tuple[str, ...]:
        """The three fits."""
        return (self.both.id, self.alone_second.id, self.alone_first.id)


def _hanging(name: str, model: Model) -> tuple[str, ...]:
    """Products that cannot stay without ``name``."""
    return tuple(term.name for term in model.terms if name in term.parts)


def _neither(
    examined: Examined, state: State, plan: Plan, bench: Bench, keeping: Keeping, rulings: Rulings
) -> State:
    """Neither is significant beside the other: the one that is alone stays; where none is, both leave."""
    first, second = examined.pair.first, examined.pair.second
    p_first, p_second = examined.alone_p(first), examined.alone_p(second)
    clause = "collinearity"
    if p_first > plan.alpha and p_second > plan.alpha:
        weaker = examined.weaker
        stronger = second if weaker == first else first
        left = _remove(weaker, examined, clause, "both_leave", state, plan, keeping, rulings)
        return _remove(stronger, examined, clause, "both_leave", left, plan, keeping, rulings)
    leaves = second if (rounded(p_first), 0) <= (rounded(p_second), 1) else first
    return _remove(leaves, examined, clause, "significant_alone_stays", state, plan, keeping, rulings)


def _both(examined: Examined, state: State, plan: Plan, keeping: Keeping, rulings: Rulings) -> State:
    """Both are significant: kept, or the weaker removed, or compared by what leaving it out changes."""
    rule = plan.collinearity.when_both_significant
    weaker = examined.weaker
    clause = "collinearity.when_both_significant"
    if rule == "keep_both":
        _rule(rulings, examined, clause, weaker, "both_stay", plan)
        return state
    if rule == "remove_weaker":
        return _remove(weaker, examined, clause, "weaker_leaves", state, plan, keeping, rulings)
    limits = plan.collinearity.large_change
    fitted = examined.alone_second if weaker == examined.pair.first else examined.alone_first
    r_squared = abs(examined.both.fit.r_squared - fitted.fit.r_squared)
    coefficient, column = _largest_shift(examined.both, fitted, examined.both.model.term(weaker))
    large_r2 = limits.r_squared is not None and r_squared >= limits.r_squared
    large_b = limits.coefficient is not None and coefficient >= limits.coefficient
    large = large_r2 or large_b
    evidence: dict[str, float | str] = {
        "change_r_squared": r_squared,
        "change_coefficient": coefficient,
        "of": column,
    }
    # The margin is that of the criterion which decides: the nearer to its limit where neither does.
    shares = [
        (abs(value / limit - 1.0), value, limit)
        for value, limit, hit in (
            (r_squared, limits.r_squared, large_r2),
            (coefficient, limits.coefficient, large_b),
        )
        if limit is not None and limit > 0 and (hit or not large)
    ]
    _, value, limit = min(shares, default=(0.0, r_squared, limits.r_squared))
    follow = plan.collinearity.if_large if large else plan.collinearity.if_small
    clause = "collinearity.if_large" if large else "collinearity.if_small"
    if follow == "keep_both":
        ground = "large_change_both_stay" if large else "small_change_both_stay"
        _rule(rulings, examined, clause, weaker, ground, plan, evidence, value, limit)
        return state
    ground = "large_change_weaker_leaves" if large else "small_change_weaker_leaves"
    return _remove(weaker, examined, clause, ground, state, plan, keeping, rulings, evidence, value, limit)


def _largest_shift(both: Fitted, without: Fitted, gone: Term) -> tuple[float, str]:
    """The largest change of any other coefficient, in standard errors of the fit with both."""
    remaining = {c.key: c.estimate for c in without.fit.coefficients if c.key is not None}
    largest, column = 0.0, ""
    for coefficient in both.fit.coefficients:
        key = coefficient.key
        if key is None or key in gone.keys or key not in remaining:
            continue
        change = abs(coefficient.estimate - remaining[key])
        shift = change / coefficient.standard_error if coefficient.standard_error > 0 else float(change > 0)
        if shift > largest:
            largest, column = shift, " × ".join(factor.column for factor in key.factors)
    return largest, column


def _remove(
    name: str,
    examined: Examined,
    clause: str,
    ground: str,
    state: State,
    plan: Plan,
    keeping: Keeping,
    rulings: Rulings,
    evidence: dict[str, float | str] | None = None,
    value: float | None = None,
    limit: float | None = None,
) -> State:
    """Take a predictor out unless a keep rule or its product holds it."""
    p = examined.both.p_of(name)
    hold = keeping.hold(name, state.working, p)
    if hold is not None:
        rulings.add(
            hold.clause, name, hold.ground, fits=examined.ids,
            evidence={"p": p, "would_have": ground}, value=p, limit=hold.limit, because=hold.because,
        )  # fmt: skip
        return state
    ruling = _rule(rulings, examined, clause, name, ground, plan, evidence, value, limit)
    return state.leaves(name, step=STEP, ruling=ruling.id)


def _rule(
    rulings: Rulings,
    examined: Examined,
    clause: str,
    name: str,
    ground: str,
    plan: Plan,
    evidence: dict[str, float | str] | None = None,
    value: float | None = None,
    limit: float | None = None,
) -> Ruling:
    """A ruling about a pair, with the p of each in each fit as evidence."""
    pair = examined.pair
    other = pair.second if name == pair.first else pair.first
    numbers: dict[str, float | str | int | bool | None] = {
        "partner": other,
        pair.reason if pair.reason != "joint_signal" else "r": pair.value,
        "p": examined.both.p_of(name),
        "p_partner": examined.both.p_of(other),
        "p_alone": examined.alone_p(name),
        "p_partner_alone": examined.alone_p(other),
    }
    numbers |= evidence or {}
    if value is None:
        value, limit = examined.both.p_of(name), plan.alpha
        if ground in ("both_leave", "significant_alone_stays"):
            value = examined.alone_p(name)
    return rulings.add(clause, name, ground, fits=examined.ids, evidence=numbers, value=value, limit=limit)
