"""Sentences about a run, made from its figures."""

from __future__ import annotations

from cellsim.analysis.histogram import Histogram
from cellsim.analysis.shares import Exceedance, Share
from cellsim.functions.number_format import format_value
from cellsim.report.figures import Figures, InputFigures, OutputFigures, central_range
from cellsim.report.number_formats import PERCENT
from cellsim.report.plain_text import one_line
from cellsim.results import ModelCheck, RunResults
from cellsim.values import ErrorValue, Scalar

CAUTION = (
    "The figures describe the model and the distributions that it was given. They are no advice to buy, sell or "
    "lend; a licensed professional and local rules come first."
)
_SAMPLING = {
    "random": "independent random sampling",
    "latin-hypercube": "Latin hypercube sampling",
}
_FEW_DRAWS = 1000
_WIDE = 0.1
_FEW_VALUES = 4
_MOST_NAMED = 3


def counted(count: int, one: str, many: str) -> str:
    """A count with its noun: `1 draw`, `1,000 draws`."""
    return f"{count:,} {one if count == 1 else many}"


def share_text(share: Share) -> str:
    """A share as per cent that never claims more than was counted."""
    if share.hits == 0:
        return "0 %"
    if share.hits == share.count:
        return "100 %"
    if share.share < 0.0005:
        return "less than 0.1 %"
    if share.share > 0.9995:
        return "more than 99.9 %"
    return _percent(share.share)


def _percent(share: float) -> str:
    """A share rounded as the cells beside it show it: half away from zero, as spreadsheets do."""
    return f"{format_value(share, PERCENT)}".replace("%", " %")


def sampling_words(sampling: str) -> str:
    """How the draws were made."""
    return _SAMPLING.get(sampling, f"{one_line(sampling, 40)} sampling")


def precision_note(sampling: str) -> str:
    """What the standard errors and intervals mean for the way of sampling."""
    note = "Standard errors and 95 % intervals show the precision of the draws, not how well the model fits the world."
    if sampling == "random":
        return note
    note += " They are worked out as for independent draws. "
    if sampling == "latin-hypercube":
        # Owen 1997: the variance is at most n/(n - 1) times that of independent draws
        return note + (
            "With Latin hypercube sampling of independent inputs that is an upper bound for the standard error of the mean "
            "and of a share, but for a factor n/(n - 1) in its square. Quantiles, and draws of dependent inputs, are usually "
            "more precise than shown as well."
        )
    return (
        note
        + f"With {sampling_words(sampling)} they are a rough guide only; runs with other seeds show how far figures move."
    )


def asked(results: RunResults) -> str:
    """What was asked, in one paragraph."""
    record = results.record
    return (
        f"{one_line(record.model, 100)} was evaluated on {counted(record.draws, 'draw', 'draws')} "
        f"({sampling_words(record.sampling)}, seed {record.seed}) of "
        f"{counted(len(results.inputs), 'uncertain input', 'uncertain inputs')}, as {one_line(record.sidecar, 100)} "
        f"describes, for {counted(len(results.outputs), 'output', 'outputs')}. Everything else stays as the model has it."
    )


def base_text(base: Scalar, output: OutputFigures) -> str:
    """A base case as words: a number with its unit, or what it is instead."""
    if output.base is not None:
        return output.scale.text(output.base)
    if isinstance(base, ErrorValue):
        return f"the error {base}"
    if base is None:
        return "blank"
    return f"“{one_line(str(base), 40)}”, no number"


def output_sentences(output: OutputFigures) -> str:
    """An output in words: centre, spread, place of the base case, thresholds."""
    summary = output.summary
    if summary is None:
        return f"{output.title}: no draw gave a number."
    low, middle, high = central_range(summary)
    scale = output.scale
    bins = summary.histogram
    if len(bins.counts) == 1 and bins.separate:
        words = [f"{output.title}: {scale.text(middle)} in every draw."]
    elif bins.separate and len(bins.counts) <= _FEW_VALUES:
        words = [
            f"{output.title} takes {len(bins.counts)} values: {_values_in_words(output, bins)}."
        ]
    else:
        mean = scale.estimate_text(summary.moments.mean, scale.mean_code)
        middle_words = f"the median is {scale.estimate_text(middle)} and the mean {mean}"
        ends = f"{scale.estimate_text(low)} to {scale.estimate_text(high)}"
        words = [f"{output.title}: {middle_words}; the central 80 % of the draws run from {ends}."]
    words.append(_base_sentence(output))
    words += [
        _threshold_sentence(output, threshold.text, about)
        for threshold, about in zip(output.record.thresholds, output.thresholds, strict=True)
        if about is not None
    ]
    return " ".join(words)


def _values_in_words(output: OutputFigures, bins: Histogram) -> str:
    """Few separate values with their shares: `0 in 46.3 % of the draws and 1 in 53.7 %`."""
    total = int(bins.counts.sum())
    parts = [
        f"{output.scale.text(value)} in {_percent(count / total)}"
        for value, count in zip(bins.lower.tolist(), bins.counts.tolist(), strict=True)
    ]
    parts[0] += " of the draws"
    return f"{', '.join(parts[:-1])} and {parts[-1]}"


def _base_sentence(output: OutputFigures) -> str:
    about = output.at_base
    if about is None:
        return f"The base case is {base_text(output.record.base, output)}."
    equal = f", {counted(about.equal, 'draw is', 'draws are')} equal to it" if about.equal else ""
    return (
        f"The base case is {output.scale.text(about.value)}: {share_text(about.below)} of the draws lie below it"
        f"{equal} and {share_text(about.above)} above."
    )


def _threshold_sentence(output: OutputFigures, text: str, about: Exceedance) -> str:
    shown = output.scale.text(about.value)
    origin = f" ({one_line(text, 40)})" if text.startswith("=") else ""
    sentence = f"{share_text(about.above)} of the draws lie above {shown}{origin}."
    summary = output.summary
    if about.mean_above is None or about.mean_others is None or summary is None:
        return sentence
    if summary.histogram.separate and len(summary.histogram.counts) <= _FEW_VALUES:
        return sentence  # each value and its share are named already
    code = output.scale.mean_code
    means = [output.scale.estimate_text(m, code) for m in (about.mean_above, about.mean_others)]
    return f"{sentence} Their mean is {means[0]}, that of the others {means[1]}."


def cautions(results: RunResults, figures: Figures) -> list[str]:
    """What a reader should be careful of, most serious first; empty if nothing stands out."""
    return [
        *_failure_cautions(results, figures),
        *_check_cautions(results.check),
        *_precision_cautions(figures),
        *_mean_cautions(figures),
        *_base_cautions(figures),
        *[c for item in figures.inputs if (c := _input_caution(item)) is not None],
    ]


def _failure_cautions(results: RunResults, figures: Figures) -> list[str]:
    failed = results.failures.draws
    if not failed:
        return []
    worst = max(
        figures.outputs,
        key=lambda output: output.summary.failed if output.summary else results.record.draws,
    )
    share = failed / max(results.record.draws, 1)
    amount = "less than 0.1 %" if share < 0.0005 else _percent(share)
    text = (
        f"{counted(failed, 'draw', 'draws')} ({amount}) failed: at least one output was an error or not finite "
        "there. An output's figures are those of its other draws and say nothing about these. Most failures: "
        f"{worst.title}. See Failed draws."
    )
    return [text]


def _check_cautions(check: ModelCheck) -> list[str]:
    found = []
    if check.disagreements:
        roots = sum(d.root for d in check.disagreements)
        found.append(
            f"The model check found {counted(len(check.disagreements), 'formula', 'formulas')} whose recalculated value "
            f"differs from the stored one; {counted(roots, 'of them is', 'of them are')} where a difference starts. "
            "See Model check."
        )
    if check.unsupported:
        names = ", ".join(one_line(name, 30) for name, _, _ in check.unsupported[:_MOST_NAMED])
        found.append(f"Not every function of the model is calculated: {names}. See Model check.")
    if check.without_value:
        found.append(
            f"{counted(check.without_value, 'formula has', 'formulas have')} no stored value to compare with, so the model "
            "check is silent about them."
        )
    return found


def _precision_cautions(figures: Figures) -> list[str]:
    found = [text for output in figures.outputs if (text := _precision_caution(output)) is not None]
    return found[:_MOST_NAMED] + _rest(len(found), "outputs with thin precision")


def _precision_caution(output: OutputFigures) -> str | None:
    """What is known too roughly: everything, the mean, or a share beyond a threshold."""
    summary = output.summary
    if summary is None:
        return None
    found, scale = summary.moments, output.scale
    if found.count < _FEW_DRAWS or found.mean_se is None:
        draws = counted(found.count, "draw", "draws")
        return (
            f"Thin precision: {output.title} rests on {draws}; the intervals on Quantiles say how "
            "far its figures can be trusted."
        )
    if found.minimum == found.maximum:
        return None
    low, _, high = central_range(summary)
    if found.mean_se * 4 > _WIDE * (high - low) > 0:
        return (
            f"The mean of {output.title} is known only to about "
            f"{scale.spread_text(2 * found.mean_se)} either way: a few extreme draws weigh much in "
            "it. The median is the steadier figure."
        )
    shares = [about.above for about in output.thresholds if about is not None]
    widest = max((share.upper - share.lower for share in shares), default=0.0)
    if widest > _WIDE:
        return (
            f"The share of draws of {output.title} beyond a threshold is known only to about "
            f"{widest / 2:.0%} either way."
        )
    return None


def _mean_cautions(figures: Figures) -> list[str]:
    """Means that no ordinary draw comes near, as where a few successes pay for many failures."""
    found = []
    for output in figures.outputs:
        summary = output.summary
        if summary is None or summary.histogram.separate:
            continue
        low, _, high = central_range(summary)
        mean = summary.moments.mean
        if not low <= mean <= high:
            side = "above" if mean > high else "below"
            found.append(
                f"The mean of {output.title} ({output.scale.estimate_text(mean, output.scale.mean_code)}) lies {side} at "
                "least 90 % of its draws: a few far-off draws carry it, and the central 80 % say nothing about these. "
                "Look at Distribution and at the far rows of Quantiles."
            )
    return found[:_MOST_NAMED] + _rest(len(found), "means like this")


def _base_cautions(figures: Figures) -> list[str]:
    found = []
    for output in figures.outputs:
        about, summary = output.at_base, output.summary
        if about is None or summary is None or summary.moments.minimum == summary.moments.maximum:
            continue
        if about.below.share > 0.95 or about.above.share > 0.95:
            side = "above" if about.below.share > 0.95 else "below"
            found.append(
                f"The base case of {output.title} ({output.scale.text(about.value)}) lies {side} more than 95 % of its draws: "
                "the model's own figure is an extreme one under these distributions."
            )
    return found[:_MOST_NAMED] + _rest(len(found), "base cases like this")


def _input_caution(item: InputFigures) -> str | None:
    share = item.record.base_percentile
    if share is None or 0.05 <= share <= 0.95 or item.record.base is None:
        return None
    if item.record.discrete and share > 0.95:
        return None  # the share at or below the largest of a few values is 1 in the ordinary case
    side = "below its 5 %" if share < 0.05 else "above its 95 %"
    return (
        f"The model's own value of {item.title} ({item.scale.text(item.record.base)}) lies {side} quantile: the base case "
        "and the distribution tell different stories."
    )


def _rest(count: int, what: str) -> list[str]:
    left = count - _MOST_NAMED
    return [f"And {left:,} more {what}."] if left > 0 else []
