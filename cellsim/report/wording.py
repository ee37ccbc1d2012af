"""Sentences made from the figures."""

from __future__ import annotations

from collections.abc import Iterator

from cellsim.report.book import Book
from cellsim.report.figures import OutputFigures, central_range
from cellsim.values import ErrorValue

CAUTION = (
    "The figures describe the model and the distributions that it was given; they are no advice to buy, sell or "
    "lend. A licensed professional and local rules come first."
)
_RARE, _COMMON = 0.05, 0.95
_THIN = 0.02


def percent(share: float) -> str:
    """A share in per cent, near its ends with a decimal."""
    if 0 < share < 0.01 or 0.99 < share < 1:
        return f"{share:.1%}"
    return f"{share:.0%}"


def question(book: Book) -> str:
    """What was asked, in one sentence."""
    record, results = book.results.record, book.results
    outputs = ", ".join(output.title for output in book.figures.outputs[:4])
    more = f" and {len(results.outputs) - 4} more" if len(results.outputs) > 4 else ""
    inputs = f"{len(results.inputs)} input{'s' if len(results.inputs) != 1 else ''}"
    return (
        f"How sure is {outputs}{more} in {record.model}, when {inputs} vary as the side-car "
        f"{record.sidecar} says? {record.draws:,} draws, seed {record.seed}, {record.sampling} sampling."
    )


def output_sentence(output: OutputFigures) -> str:
    """What came out for one output."""
    summary = output.summary
    if summary is None:
        return f"{output.title}: every draw failed, so nothing can be said about it."
    low, middle, high = central_range(summary)
    scale = output.scale
    text = (
        f"{output.title}: half of the draws lie below {scale.text(middle)}, and eight in ten between "
        f"{scale.text(low)} and {scale.text(high)}; the mean is {scale.text(summary.moments.mean)}."
    )
    if output.base is not None and output.at_base is not None:
        text += f" The base case, {scale.text(output.base)}, is exceeded in {percent(output.at_base.above.share)} of them."
    elif isinstance(output.record.base, ErrorValue):
        text += f" In the base case it is the error {output.record.base}."
    for threshold, found in zip(output.record.thresholds, output.thresholds, strict=True):
        if found is not None:
            text += f" It is above {scale.text(threshold.value)} in {percent(found.above.share)}."
    return text


def warnings(book: Book) -> Iterator[str]:
    """What a reader should be careful of."""
    results = book.results
    draws = results.record.draws
    if results.failures.draws:
        share = results.failures.draws / draws
        yield (
            f"{results.failures.draws:,} of {draws:,} draws ({percent(share)}) failed and are left out of all figures; "
            "see Failed draws."
        )
    check = results.check
    if check.compared > check.agreeing:
        yield (
            f"{check.compared - check.agreeing:,} of {check.compared:,} formulas of the model were not recalculated to "
            "the value stored in the file; see Model check."
        )
    for record in results.inputs:
        place = record.base_percentile
        if place is not None and not record.discrete and not _RARE <= place <= _COMMON:
            yield (
                f"The base value of {record.label or record.name} lies at the {place:.1%} point of its distribution: the "
                "base case is no middle case."
            )
    for output in book.figures.outputs:
        summary = output.summary
        if summary is None or not summary.moments.sd or summary.moments.mean_se is None:
            continue
        if summary.moments.mean_se > _THIN * summary.moments.sd:
            yield (
                f"With {summary.moments.count:,} draws the mean of {output.title} is known to about "
                f"{output.scale.spread_text(2 * summary.moments.mean_se)} only; more draws would narrow it."
            )
    if results.record.slow_cells:
        yield f"{len(results.record.slow_cells)} expressions were evaluated draw by draw; see Model check."


def interval_note(book: Book) -> str:
    """How the intervals are meant."""
    text = (
        "Intervals have 95 % confidence. Those of quantiles are distribution-free (binomial order statistics); those of "
        "shares are Wilson's."
    )
    if book.results.record.sampling == "latin-hypercube":
        text += (
            " They hold for independent draws; with Latin hypercube sampling the error of a mean is at most slightly "
            "larger and usually smaller."
        )
    return text
