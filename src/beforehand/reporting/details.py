"""The question and its promises, the variables, the road to the model, what was removed, the record."""

from __future__ import annotations

from collections.abc import Sequence

from beforehand.lock import RulingRecord
from beforehand.reporting import words
from beforehand.reporting.context import Context
from beforehand.reporting.document import (
    Block,
    Column,
    Grid,
    Listing,
    Paragraph,
    Picture,
    Said,
    Section,
    paragraph,
    section,
)
from beforehand.screen.digits import count, figure, listed, p_text, percent, trimmed

# Rulings beyond so many are in the lock; a page of them is read by nobody.
MOST_RULINGS = 400
MOST_ROWS = 60


def question_section(context: Context) -> Section | None:
    """The question, the seal, the looks, amendments and deviations."""
    lock = context.lock
    seal = lock.seal
    said = [
        Said(lock.plan.question),
        Said(words.sealed(seal.state, seal.seals, seal.before_first_look)),
    ]
    if context.looks is not None:
        said.append(Said(f"The register beside the plan has {count(context.looks, 'look')} at this outcome."))
    amended = [
        Said(f"{entry.get('date', '')}: {entry.get('why', '')} ({entry.get('kind', '')}).".strip())
        for entry in context.written.get("amendments") or ()
    ]
    changes = [Said(f"{change.says} ({change.class_}, {change.clause})") for change in seal.changes]
    return section(
        "question",
        words.TITLES["question"],
        [Paragraph(tuple(said)), Listing(tuple(amended)), Listing(tuple(changes)), _keep_rules(context)],
    )


def _keep_rules(context: Context) -> Grid:
    """What theory keeps, and why."""
    rules = context.written.get("keep") or ()
    who, how, why = [], [], []
    for rule in rules:
        group = rule.get("at_least_one_of")
        named = rule.get("predictor")
        who.append(listed([str(one) for one in group]) if group else _named(named))
        bound = rule.get("rule")
        how.append("at least one stays" if group else "always" if bound == "always" else _bound(bound))
        source = f" ({rule['source']})" if rule.get("source") else ""
        why.append(f"{rule.get('because', '')}{source}")
    return Grid(
        caption="What theory kept in the model",
        columns=(
            Column(head="Predictor", cells=tuple(who), align="left"),
            Column(head="Kept", cells=tuple(how), align="left"),
            Column(head="Because", cells=tuple(why), align="left"),
        ),
    )


def _named(name: object) -> str:
    return " × ".join(map(str, name)) if isinstance(name, list | tuple) else str(name)


def _bound(rule: object) -> str:
    bound = rule.get("unless_p_above") if isinstance(rule, dict) else None
    return f"unless its p is above {trimmed(float(bound))}" if isinstance(bound, int | float) else str(rule)


def variables_section(context: Context) -> Section | None:
    """Each column: how many, where, how spread, of which shape."""
    numbers = [one for one in context.lock.checks.descriptives if one.kind == "number"]
    categories = [one for one in context.lock.checks.descriptives if one.kind != "number"]
    cells = [
        (one.column, one.unit or "", f"{one.n:,}", f"{one.missing:,}", figure(one.mean), figure(one.sd),
         figure(one.minimum), figure(one.lower_quartile), figure(one.median), figure(one.upper_quartile),
         figure(one.maximum), figure(one.skewness), figure(one.kurtosis))
        for one in numbers
    ]  # fmt: skip
    heads = (
        "Variable", "Unit", "n", "Missing", "Mean", "SD", "Smallest", "Lower quartile", "Median",
        "Upper quartile", "Largest", "Skewness", "Kurtosis",
    )  # fmt: skip
    table = Grid(
        caption="Numbers, among the eligible rows",
        columns=columns_of(heads, cells, left=2),
        note="SD is the standard deviation; a normal sample has a kurtosis of 3.",
    )
    levels = [
        (one.column, f"{one.n:,}", f"{one.missing:,}",
         "; ".join(f"{level} {rows:,}" for level, rows in one.levels.items()))
        for one in categories
    ]  # fmt: skip
    other = Grid(
        caption="Categories",
        columns=columns_of(("Variable", "n", "Missing", "Rows of each level"), levels, left=1),
    )
    return section(
        "variables",
        words.TITLES["variables"],
        [table if cells else None, other if levels else None, Picture("columns")],
    )


def columns_of(heads: Sequence[str], rows: Sequence[Sequence[str]], *, left: int) -> tuple[Column, ...]:
    """Columns of a table from its rows; the first ``left`` lean left, and so does the last if it is text."""
    turned = list(zip(*rows, strict=True)) if rows else [() for _ in heads]
    return tuple(
        Column(
            head=head,
            cells=tuple(cells),
            align="left" if place < left or (place == len(heads) - 1 and _is_text(cells)) else "right",
        )
        for place, (head, cells) in enumerate(zip(heads, turned, strict=True))
    )


def _is_text(cells: Sequence[str]) -> bool:
    return any(cell and not (cell[0].isdigit() or cell[0] in "-−<.") for cell in cells)


def correlations_section(context: Context) -> Section | None:
    """How the variables go together, as a picture and where they are strong."""
    first = next((one.stage for one in context.lock.checks.correlations), None)
    strong = sorted(
        (one for one in context.lock.checks.correlations if one.stage == first and one.r is not None),
        key=lambda one: -abs(one.r or 0.0),
    )[:15]
    rows = [(one.first, one.second, f"{one.r:.2f}") for one in strong if one.r is not None]
    table = Grid(
        caption="The strongest correlations among predictors, before any was removed for them",
        columns=columns_of(("Predictor", "With", "r"), rows, left=2),
    )
    inflated = sorted(
        (one for one in context.lock.checks.inflation if one.stage == first and one.vif is not None),
        key=lambda one: -(one.vif or 0.0),
    )[:15]
    factors = [(one.predictor, figure(one.vif)) for one in inflated]
    other = Grid(
        caption="Variance inflation at the same stage, the largest first",
        columns=columns_of(("Predictor", "VIF"), factors, left=1),
        note="For a category it is the generalized form to the power 1/df (Fox and Monette 1992).",
    )
    return section(
        "correlations",
        words.TITLES["correlations"],
        [Picture("correlations"), table if rows else None, other if factors else None],
    )


def building_section(context: Context) -> Section | None:
    """Every ruling in its order, step by step, with clause, evidence, limit and margin."""
    blocks: list[Block | None] = [Picture("trail")]
    rulings = context.lock.rulings[:MOST_RULINGS]
    steps = list(dict.fromkeys(ruling.step for ruling in rulings))
    for step in steps:
        own = [ruling for ruling in rulings if ruling.step == step]
        blocks.append(_ledger(step, own))
    left = len(context.lock.rulings) - len(rulings)
    if left > 0:
        blocks.append(paragraph(Said(f"{count(left, 'more ruling')} in the lock.")))
    return section("building", words.TITLES["building"], blocks)


def _ledger(step: str, rulings: Sequence[RulingRecord]) -> Grid:
    """The rulings of one step."""
    rows = [
        (ruling.id, f"{ruling.says}{' Because: ' + ruling.because if ruling.because else ''}", ruling.clause,
         "" if ruling.limit is None else trimmed(ruling.limit),
         "" if ruling.margin is None else figure(ruling.margin), ", ".join((*ruling.fits, *ruling.checks)))
        for ruling in rulings
    ]  # fmt: skip
    return Grid(
        caption=words.STEPS.get(step, step.replace("_", " ")),
        columns=(
            *columns_of(
                ("Ruling", "What was ruled", "Clause of the plan"), [row[:3] for row in rows], left=3
            ),
            *columns_of(("Limit", "Margin"), [row[3:5] for row in rows], left=0),
            *columns_of(("Rests on",), [row[5:] for row in rows], left=1),
        ),
    )


def removed_section(context: Context) -> Section | None:
    """Predictors and rows that left, and what leaving rows out changed."""
    lock = context.lock
    gone = [
        (name, fate.ruling or "", fate.says)
        for name, fate in lock.predictors.items()
        if fate.verdict == "removed"
    ]
    predictors = Grid(
        caption="Predictors that left",
        columns=columns_of(("Predictor", "Ruling", "Why"), gone, left=3),
    )
    stages = [
        (stage.stage.replace("_", " "), f"{stage.rows:,}", stage.because or "") for stage in lock.ledger
    ]
    ledger = Grid(
        caption="Rows at each stage", columns=columns_of(("Stage", "Rows", "Because"), stages, left=1)
    )
    shown = lock.checks.influence[:MOST_ROWS]
    rows = [
        (one.row, "stays" if one.stays else "left", one.ruling or "", figure(one.leverage),
         figure(one.studentized_residual), figure(one.cooks_distance), figure(one.change_r_squared),
         figure(one.change_coefficient), one.of or "")
        for one in shown
    ]  # fmt: skip
    influence = Grid(
        caption="Flagged rows, with and without each",
        columns=columns_of(
            ("Row", "It", "Ruling", "Leverage", "Studentized residual", "Cook's distance", "Change of R²",
             "Largest change of a coefficient", "Of"),
            rows, left=3,
        ),
        note="The change of a coefficient is in standard errors of the fit with the row.",
    )  # fmt: skip
    joint = lock.checks.jointly_without_flagged
    together = None
    if joint is not None:
        said = (
            f"Without all {count(joint.rows, 'flagged row')} that stayed, R² changed by "
            f"{figure(joint.change_r_squared)} and a coefficient by at most "
            f"{figure(joint.change_coefficient)} of its "
            f"standard errors{f' ({joint.of})' if joint.of else ''}."
        )
        together = paragraph(Said(said, (joint.fit,)))
    return section(
        "removed",
        words.TITLES["removed"],
        [predictors if gone else None, ledger if stages else None, influence if rows else None, together],
    )


def checks_section(context: Context) -> Section | None:
    """Assumption checks before and after."""
    rows = [
        (
            one.id,
            one.stage.replace("_", " "),
            words.CHECK_NAMES.get(one.check, one.check),
            one.subject or "the model",
            "" if one.statistic is None else figure(one.statistic),
            "" if one.p is None else p_text(one.p, one.alpha),
            "" if one.alpha is None else trimmed(one.alpha),
            one.because or words.VERDICTS[one.verdict],
        )
        for one in context.lock.checks.assumptions
    ]
    table = Grid(
        caption="Checks of assumptions, in the order of the run",
        columns=(
            *columns_of(("Check", "Step", "Of what", "About"), [row[:4] for row in rows], left=4),
            *columns_of(("Statistic", "p", "Limit"), [row[4:7] for row in rows], left=0),
            *columns_of(("Verdict",), [row[7:] for row in rows], left=1),
        ),
    )
    missing = [
        (
            one.predictor,
            f"{one.missing:,}",
            percent(one.share),
            f"{one.rows_left:,}",
            figure(one.standardized_difference),
        )
        for one in context.lock.checks.missing
    ]
    gaps = Grid(
        caption="Missing cells",
        columns=columns_of(
            ("Predictor", "Cells", "Share", "Rows that left for it", "Standardized difference"),
            missing,
            left=1,
        ),
        note="The difference of the rows that left from those that stayed, in standard deviations.",
    )
    return section("checks", words.TITLES["checks"], [table if rows else None, gaps if missing else None])


def record_section(context: Context) -> Section | None:
    """Fingerprint, digests, environment."""
    lock = context.lock
    env = lock.environment
    rows = [
        ("Plan", lock.plan.file), ("Decisions", lock.plan.decisions), ("Whole plan", lock.plan.whole),
        ("Table", lock.data.file), ("Fingerprint", lock.data.fingerprint),
        ("Rows read", f"{lock.data.rows:,}"), ("Row labels", lock.data.labels),
        ("Lock", context.name), ("Digest", lock.digest),
        ("Made with", f"beforehand {env.beforehand}, Python {env.python}, numpy {env.numpy}, "
         f"scipy {env.scipy}, pandas {env.pandas}, statsmodels {env.statsmodels}"),
    ]  # fmt: skip
    return section(
        "record",
        words.TITLES["record"],
        [Grid(caption="What this was made from", columns=columns_of(("What", "Which"), rows, left=2))],
    )
