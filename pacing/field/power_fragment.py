"""What to paste into a race file after a fit of critical power."""

from __future__ import annotations

import json

from pacing.field.power_result import PowerFit

MOST_PCT, MOST_KJ = 20.0, 15.0
"""The most that a race file takes as one standard deviation."""


def power_fragment(fit: PowerFit) -> str:
    """TOML for ``[rider]`` and ``[uncertainty]``, with the fit's standard errors.

    Powers are as the meter showed them: with ``power_meter_factor`` other than 1 in the race
    file, critical power and W′ have to be multiplied by it.
    """
    lines = [
        "[rider]",
        f"critical_power_w = {fit.critical_power_w:.1f}",
        f"w_prime_kj = {fit.w_prime_j / 1000.0:.2f}",
        f'fit_form = "{fit.form}"',
    ]
    if fit.peak_power_w is not None:
        lines.append(f"peak_power_w = {fit.peak_power_w:.0f}")
    if fit.shares:
        lines.append(f"tested_position = {_quoted(fit.shares[0].position)}")
        lines += [
            f"# in rider.positions {_quoted(share.position)}: power_share = {share.power_share:.3f}"
            + ("" if share.se is None else f"  # ± {share.se:.3f}")
            for share in fit.shares[1:]
        ]
    lines += ["", "[uncertainty]"]
    if fit.critical_power_se_w is None or fit.w_prime_se_j is None:
        lines.append("# too few efforts to tell: the defaults stand")
    else:
        percent = 100.0 * fit.critical_power_se_w / fit.critical_power_w
        lines += [
            f"critical_power_pct = {min(percent, MOST_PCT):.2f}",
            f"w_prime_kj = {min(fit.w_prime_se_j / 1000.0, MOST_KJ):.2f}",
        ]
    return "\n".join(lines) + "\n"


def _quoted(text: str) -> str:
    return json.dumps(text, ensure_ascii=False)
