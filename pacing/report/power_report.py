"""What ``pacing fit-power`` says: one screen of text, or the same as JSON."""

from __future__ import annotations

import textwrap
from collections.abc import Sequence
from typing import Any

from pacing.field.highest_mean import HighestMean
from pacing.field.power_forms import FormFit
from pacing.field.power_fragment import power_fragment
from pacing.field.power_result import Effort, PowerFit
from pacing.report import words

WIDTH = 80
SCHEMA = "power-fit/1"
CAUTION = "Maximal efforts need medical clearance, a warm-up and a road or trainer fit for them."


def power_text(
    fit: PowerFit | None, means: HighestMean | None = None, warnings: Sequence[str] = ()
) -> str:
    """The fit as text: the numbers, the efforts, the other forms, warnings, what to paste."""
    blocks = []
    if means is not None:
        blocks.append(_means(means))
    if fit is not None:
        blocks += [
            "\n".join([*_headline(fit), textwrap.fill(words.sentence(f"form: {fit.why}"), WIDTH)]),
            _efforts(fit.efforts, bool(fit.shares)),
            _forms(fit.forms),
            _shares(fit),
        ]
    said = (*warnings, *(fit.warnings if fit is not None else ()), CAUTION)
    blocks.append("\n".join(_item(text) for text in said))
    if fit is not None:
        blocks.append("To paste into a race file:\n\n" + power_fragment(fit).rstrip())
    return "\n\n".join(block for block in blocks if block) + "\n"


def power_document(
    fit: PowerFit | None, means: HighestMean | None = None, warnings: Sequence[str] = ()
) -> dict[str, Any]:
    """The same as a JSON document; without a fit its numbers are None."""
    document: dict[str, Any] = {"schema": SCHEMA}
    document |= _fitted(fit) if fit is not None else dict.fromkeys(_FITTED)
    document["warnings"] = [*warnings, *(fit.warnings if fit is not None else ())]
    document["fragment"] = None if fit is None else power_fragment(fit)
    document["highest_mean_power"] = None
    if means is not None:
        rows = zip(*(column.tolist() for column in means), strict=True)
        document["highest_mean_power"] = [
            {"duration_s": d, "power_w": p, "from_s": at} for d, p, at in rows
        ]
    return document


_FITTED = (
    "critical_power_w",
    "critical_power_se_w",
    "w_prime_j",
    "w_prime_se_j",
    "peak_power_w",
    "peak_power_se_w",
    "covariance",
    "intervals_95",
    "form",
    "why",
    "forms",
    "efforts",
    "shares",
)


def _fitted(fit: PowerFit) -> dict[str, Any]:
    document: dict[str, Any] = {name: getattr(fit, name) for name in _FITTED if hasattr(fit, name)}
    document["intervals_95"] = fit.intervals()
    document["forms"] = [
        {
            "form": form.name,
            "critical_power_w": form.critical_power_w,
            "w_prime_j": form.w_prime_j,
            "peak_power_w": form.parameters[2] if len(form.parameters) == 3 else None,
            "standard_errors": form.standard_errors,
        }
        for form in fit.forms
    ]
    document["efforts"] = [
        {
            "duration_s": effort.duration_s,
            "power_w": effort.power_w,
            "position": effort.position or None,
            "residual_w": effort.residual_w,
            "flagged": bool(effort.flagged),
            "why": effort.flagged or None,
        }
        for effort in fit.efforts
    ]
    document["shares"] = [
        {
            "position": share.position,
            "power_share": share.power_share,
            "se": share.se,
            "efforts": share.efforts,
        }
        for share in fit.shares
    ]
    return {name: document[name] for name in _FITTED}


def _headline(fit: PowerFit) -> list[str]:
    rows = [
        ("critical power", fit.critical_power_w, fit.critical_power_se_w, "W", 0),
        ("W′", fit.w_prime_j / 1000.0, _kj(fit.w_prime_se_j), "kJ", 1),
    ]
    if fit.peak_power_w is not None:
        rows.append(("peak power", fit.peak_power_w, fit.peak_power_se_w, "W", 0))
    intervals = fit.intervals() or (None,) * len(rows)
    lines = []
    for (name, value, error, unit, digits), interval in zip(rows, intervals, strict=True):
        line = f"{name:16}{words.number(value, digits):>7} {unit:3}"
        if error is None or interval is None:
            lines.append(f"{line} error unknown")
            continue
        scale = 1000.0 if unit == "kJ" else 1.0
        low, high = (words.number(edge / scale, digits) for edge in interval)
        lines.append(
            f"{line} ± {words.number(error, digits + 1)} (one standard error);"
            f" 95 %: {low} to {high} {unit}"
        )
    return lines


def _efforts(efforts: tuple[Effort, ...], positions: bool) -> str:
    lines = [f"{'effort':>8}{'power':>8}{'off the curve':>16}"]
    lines.append(f"{'min:s':>8}{'W':>8}{'W':>16}")
    for effort in efforts:
        line = f"{_minutes(effort.duration_s):>8}{words.number(effort.power_w):>8}"
        line += f"{words.number(effort.residual_w, 1, signed=True):>16}"
        beside = [effort.position if positions else "", effort.flagged]
        lines.append("  ".join([line, *(text for text in beside if text)]))
    return "\n".join(lines)


def _forms(forms: tuple[FormFit, ...]) -> str:
    lines = [f"{'form':24}{'CP':>8}{'±':>7}{'W′':>8}{'±':>7}", f"{'':24}{'W':>8}{'W':>7}"]
    lines[1] += f"{'kJ':>8}{'kJ':>7}"
    for form in forms:
        errors = form.standard_errors or (None, None)
        lines.append(
            f"{form.name:24}{words.number(form.critical_power_w, 1):>8}"
            f"{words.number(errors[0], 1):>7}"
            f"{words.number(form.w_prime_j / 1000.0, 2):>8}{words.number(_kj(errors[1]), 2):>7}"
        )
    return "\n".join(lines)


def _shares(fit: PowerFit) -> str:
    if not fit.shares:
        return ""
    lines = [f"power share, against {fit.shares[0].position}"]
    for share in fit.shares[1:]:
        error = "error unknown" if share.se is None else f"± {words.number(share.se, 3)}"
        lines.append(f"  {share.position}: {words.number(share.power_share, 3)} {error}")
    return "\n".join(lines)


def _means(means: HighestMean) -> str:
    lines = [f"{'for':>8}{'highest mean':>14}{'from':>10}", f"{'min:s':>8}{'W':>14}{'h:mm:ss':>10}"]
    for duration, power, start in zip(*(c.tolist() for c in means), strict=True):
        lines.append(f"{_minutes(duration):>8}{words.number(power):>14}{words.clock(start):>10}")
    return "\n".join(lines)


def _minutes(seconds: float) -> str:
    whole = round(seconds)
    return f"{whole // 60}:{whole % 60:02d}"


def _kj(joules: float | None) -> float | None:
    return None if joules is None else joules / 1000.0


def _item(text: str) -> str:
    return textwrap.fill(text, WIDTH, initial_indent="- ", subsequent_indent="  ")
