"""Keep rules: what no step may remove, and why."""

from __future__ import annotations

from dataclasses import dataclass

from beforehand.plan import KeepGroup, Plan, UnlessP


@dataclass(frozen=True, slots=True)
class Hold:
    """What prevents a removal: the clause, the plan's reason, and the bound where it has one."""

    clause: str
    ground: str
    because: str | None
    limit: float | None = None


@dataclass(frozen=True, slots=True)
class Keeping:
    """The keep rules and products of a plan, asked about one predictor at a time."""

    plan: Plan

    def hold(self, name: str, present: tuple[str, ...], p: float | None) -> Hold | None:
        """What prevents ``name`` from leaving the predictors ``present``, or None.

        Parameters
        ----------
        name : str
            Predictor that is about to leave.
        present : tuple of str
            Predictors in the working model, ``name`` included.
        p : float or None
            Its p in the working model of this moment; None where there is none yet, and then a
            rule with a bound holds, since nothing shows the bound to be passed.
        """
        for number, rule in enumerate(self.plan.keep):
            clause = f"keep[{number}]"
            if isinstance(rule, KeepGroup):
                if name in rule.at_least_one_of and not any(
                    other in present for other in rule.at_least_one_of if other != name
                ):
                    return Hold(clause, "kept_last_of_group", rule.because)
            elif name_of(rule.predictor) == name:
                if not isinstance(rule.rule, UnlessP):
                    return Hold(clause, "kept_always", rule.because)
                if p is None or p <= rule.rule.unless_p_above:
                    return Hold(clause, "kept_below_bound", rule.because, rule.rule.unless_p_above)
        for number, parts in enumerate(self.plan.products):
            if name in parts and product_name(parts) in present:
                return Hold(f"products[{number}]", "kept_for_product", product_name(parts))
        return None

    def always(self, name: str) -> bool:
        """Whether a flat keep rule names the predictor."""
        return any(
            not isinstance(rule, KeepGroup)
            and name_of(rule.predictor) == name
            and not isinstance(rule.rule, UnlessP)
            for rule in self.plan.keep
        )

    def parts(self, name: str) -> tuple[str, ...]:
        """The predictors of which a product is made; empty for a plain predictor."""
        return next((parts for parts in self.plan.products if product_name(parts) == name), ())

    @property
    def theory(self) -> bool:
        """Whether the plan has any theory-backed keep rule."""
        return bool(self.plan.keep)


def product_name(parts: tuple[str, ...]) -> str:
    """The name under which a product stands in rulings and tables."""
    return " × ".join(parts)


def name_of(predictor: str | tuple[str, ...]) -> str:
    """The name of a keep rule's predictor, which may be a product."""
    return predictor if isinstance(predictor, str) else product_name(tuple(predictor))


def order_of(plan: Plan) -> dict[str, int]:
    """Plan order of every predictor, products after the plain ones; ties go to the earlier."""
    names = [predictor.column for predictor in plan.predictors]
    names += [product_name(parts) for parts in plan.products]
    return {name: place for place, name in enumerate(names)}
