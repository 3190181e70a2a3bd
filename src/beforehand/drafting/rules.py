"""Every rule of the language with its default, as commented lines of a plan.

The defaults and the choices are read off the models, so that a draft cannot fall behind them; the
words about each block are written here.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping

from pydantic import BaseModel
from pydantic.fields import FieldInfo

from beforehand.fields import default_of, plain, words_of
from beforehand.plan import Plan

# What stands above each block: one line, about what its decision is.
ABOVE: Mapping[str, str] = {
    "purpose": "What the answer is for. To explain, say below which predictors are focal.",
    "eligibility": "Which rows belong to the question. Each line is counted in the record.",
    "derive": "New columns with a meaning of their own, made before anything else.",
    "products": "Pairs of predictors of which one is expected to change the effect of the other.",
    "keep": "What theory says must stay, with the reason. No step may remove it.",
    "alpha": "The level at which a predictor counts as significant. Intervals have level 1 - alpha.",
    "multiplicity": "How p is corrected over the focal predictors in the final table.",
    "intercept": "false forces the fit through the origin.",
    "steps": "Which steps run, in this order. [] fits the full model once.",
    "missing_data": "What happens to empty cells, decided without the outcome.",
    "assumptions": "Which checks are made, and at which level. Each may be the word skip.",
    "transforms": "Which bends are tried on a predictor, and only when a check calls for one.",
    "collinearity": "What happens when two predictors tell much the same story.",
    "influence": "When a row weighs too much, and what must change for it to leave.",
    "selection": "How predictors that do not show leave the model.",
    "weak_model": "What the answer is when the model as a whole is not significant.",
    "final_checks": "What a failed check of the final model calls for.",
    "errors": "Which standard errors stand behind every p. With 250 rows or fewer consider hc3.",
    "expects": "What you expect to find, so that the size of the table can be judged beforehand.",
    "rehearsal": "How the plan is tried out on tables whose truth is known.",
    "alternatives": "Other reasonable decisions, run beside this plan: does the answer hold?",
    "refresh": "What counts as an answer that still holds when the data are new.",
    "amendments": "Changes made after the plan was committed to, each with its reason.",
}

# An example under a block that is empty by default, as it could be written.
BELOW: Mapping[str, str] = {
    "eligibility": '- {column: NAME, is: "yes", because: why the other rows do not count}',
    "derive": "- {column: NEW, from: NAME - OTHER, unit: UNIT}",
    "products": "- [NAME, OTHER]",
    "keep": "- {predictor: NAME, rule: always, because: THEORY, source: WHERE IT IS WRITTEN}",
    "expects": "{residual_sd: 40, slopes: {NAME: 6.5}}",
    "alternatives": "stricter: {alpha: 0.01}",
    "amendments": "- {date: 2026-12-01, why: …, kind: gap, seen: nothing, expected_effect: …}",
}

# What stands beside a field whose own default says too little.
BESIDE: Mapping[str, str] = {
    "missing_data.fill": "NAME: mean, median, most_common, regression or {value: 0}",
    "influence.at_most": "of the rows; 0% removes none",
    "influence.flag_when": "limits; n rows, p coefficients",
    "influence.remove_when": "with the row against without it",
    "influence.remove_when.coefficient": "standard errors",
    "collinearity.large_change.coefficient": "standard errors",
    "refresh.coefficient": "old standard errors",
}

# Shares that people think of as a percentage.
_PERCENT = frozenset({"missing_data.remove_predictor_above", "influence.at_most"})


def block_lines(key: str, beside: Mapping[str, str]) -> list[str]:
    """One top-level block with its default, its comment above and its example below.

    Parameters
    ----------
    key : str
        Top-level key of the plan that has a default.
    beside : mapping of path to text
        Comments of this draft that stand beside a field, before those that always do.
    """
    field = Plan.model_fields[key]
    lines = [f"# {ABOVE[key]}", *_field(key, field, "", {**BESIDE, **beside})]
    if key in BELOW:
        lines.append(f"#  {BELOW[key]}")
    return lines


def _field(path: str, field: FieldInfo, indent: str, beside: Mapping[str, str]) -> Iterator[str]:
    """A field and what stands in it, one line each."""
    name = path.rsplit(".", 1)[-1]
    value = default_of(field)
    notes = " ".join(note for note in (_others(field, value), beside.get(path, "")) if note)
    comment = f"  # {notes}" if notes else ""
    if isinstance(value, BaseModel):
        inside = tuple(type(value).model_fields)
        if indent and len(inside) == 1:
            yield f"{indent}{name}: {{{inside[0]}: {plain(getattr(value, inside[0]))}}}{comment}"
            return
        yield f"{indent}{name}:{comment}"
        for attribute, inner in type(value).model_fields.items():
            yield from _field(f"{path}.{inner.alias or attribute}", inner, indent + "  ", beside)
        return
    shown = f"{100.0 * value:.10g}%" if path in _PERCENT else plain(value)
    yield f"{indent}{name}: {shown}{comment}"


def _others(field: FieldInfo, value: object) -> str:
    """The other words that a field may hold."""
    if isinstance(value, BaseModel | Mapping):
        return ""
    held = value if isinstance(value, tuple) else (value,)
    words = [word for word in words_of(field.annotation) if word not in held]
    return f"{'also:' if isinstance(value, tuple) else 'or'} {', '.join(words)}" if words else ""
