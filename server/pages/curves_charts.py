"""Pictures of a page of curves: the rates with curves through them, and what a law misses."""

import numpy as np
from numpy.typing import NDArray
from scipy.special import ndtri

from engine.ages import Array
from server.charts.chart import At, Chart, Series
from server.charts.scales import log_ticks, ticks
from server.pages.drawing import ages, bars, isolated, places, single_years, values
from server.results.curves import Curves, Smooth
from server.results.laws import Fitted
from server.sentences import curves as say
from server.sentences import names
from server.sentences.text import _

THOUSAND = 1000


def rates(found: Curves, source: str) -> Chart | None:
    """Observed rates, the smooth curve with its band, and the best law."""
    grid = found.panel.grid
    mx = found.chain.rates.mx[:-1]
    observed = np.where((mx > 0) & ~found.withheld[:-1], THOUSAND * mx, np.nan)
    inside = grid.mids[:-1] < ages(grid)[1]
    if not np.isfinite(observed[inside]).any():
        return None
    shown = [observed[inside]]
    series = _observed(found, observed)
    if found.smooth:
        series.append(_smooth(found, found.smooth))
        shown.append(THOUSAND * found.smooth.curve[0])
    if found.best:
        law = _law(found, found.best)
        series.append(law)
        shown.append(np.array(law.y, float))
    low, high = (float(end(np.concatenate(shown))) for end in (np.nanmin, np.nanmax))
    low, high = low / 2.5, high * 1.5
    on_scale = log_ticks(low, high)
    return Chart(
        key="rates",
        finding=_finding(found),
        unit=_unit(found),
        source=source,
        described=_(
            "Death rates by age on a ratio scale, {who}, with the curves fitted to them; the"
            " numbers are in the table below it.",
            who=_who(found),
        ),
        size="tall",
        x_kind="age",
        x_range=ages(grid),
        y_title=_("per 1,000, ratio scale"),
        y_range=(low, high),
        y_ticks=on_scale,
        y_text=tuple(f"{at:,g}" for at in on_scale),
        y_log=True,
        hover=_("age %{x}: %{y:,.2f} per 1,000"),
        table="curves",
        series=tuple(series),
    )


def _who(found: Curves) -> str:
    return _("{sex}, {year}", sex=names.sex(found.of.sex), year=found.period)


def _unit(found: Curves) -> str:
    return _(
        "Deaths per 1,000 person-years, {who}: as counted at the middle of each age group, by the"
        " smooth curve with its {level} % band, and by the law; each step of the scale is a tenfold"
        " rate",
        who=_who(found),
        level=round(100 * found.settings.level),
    )


def _finding(found: Curves) -> str:
    best, smooth = found.best, found.smooth
    if smooth is None:
        return say.rates_alone()
    if best is None:
        return say.smooth_alone()
    shared = smooth.ages >= best.first
    at = smooth.ages[shared]
    law, (_curve, low, high) = best.fit.hazard(at), smooth.curve[:, shared]
    outside = [int(age) for age in at[(law < low) | (law > high)]]
    return say.beside(_(best.law.label), outside, best.first, int(at[-1]))


def _observed(found: Curves, observed: Array) -> list[Series]:
    """Dots for groups; a thin line for single years, which would hide the curves as dots."""
    grid = found.panel.grid
    label, dots = _("as counted"), np.flatnonzero(np.isfinite(observed)).tolist()
    at = At(float(grid.mids[dots[0]]), float(observed[dots[0]]), dy=15)  # over the first of them
    series = []
    if single_years(grid):
        dots = isolated(observed)
        series.append(
            Series(
                label,
                places(grid.mids[:-1]),
                values(observed),
                role="ink-2",
                weight="many",
                at=at,
            )
        )
    if dots:
        series.append(
            Series(
                label,
                places(grid.mids[dots]),
                values(observed[dots]),
                draw="dots",
                role="ink-2",
                names=tuple(grid.labels[one] for one in dots),
                at=None if series else at,
            )
        )
    return series


def _label_at(x: Array, y: Array, age: float, times: float, side: str = "left") -> At:
    """Beside a curve at an age, so many times as high."""
    known = np.isfinite(y)
    height = float(np.exp(np.interp(age, x[known], np.log(y[known]))))
    return At(age, times * height, "right" if side == "right" else "left")


def _smooth(found: Curves, smooth: Smooth) -> Series:
    curve, low, high = THOUSAND * smooth.curve
    return Series(
        _("smooth curve"),
        places(smooth.ages),
        values(curve),
        sex=found.of.sex,  # type: ignore[arg-type]
        low=values(low),
        high=values(high),
        at=_label_at(smooth.ages, curve, 44, 0.45),
    )


def _law(found: Curves, best: Fitted) -> Series:
    at = np.arange(best.first, found.panel.grid.open_age + 1.0)
    curve = THOUSAND * best.fit.hazard(at)
    return Series(
        _("law of {law}", law=_(best.law.label)),
        places(at),
        values(curve),
        sex="f" if found.of.sex == "p" else "p",  # another line than the people's own
        role="s2",
        weight="that",
        at=_label_at(at, curve, 66, 2.4, "right"),
    )


def residuals(found: Curves, source: str) -> Chart | None:
    """How far each age group lies from the best law, upwards and downwards."""
    if found.best is None or found.withheld[:-1].all():
        return None
    grid, fit = found.panel.grid, found.best.fit
    far, first = fit.residuals, len(grid) - 1 - fit.deaths.shape[-1]
    reach = float(ndtri((1 + found.settings.level) / 2))
    placed = np.concatenate([np.full(first, np.nan), far])
    shown = ~found.withheld[first:-1]
    most = 1.1 * max(float(np.abs(far).max()), 1.2 * reach)
    sides = [
        bars(grid, placed, (first + np.flatnonzero(side)).tolist(), label)
        for side, label in (
            ((far >= 0) & shown, _("more deaths than the law expects")),
            ((far < 0) & shown, _("fewer deaths than the law expects")),
        )
        if side.any()
    ]
    ends = (float(grid.starts[first]), float(grid.open_age))
    limits = [
        Series(
            _("1 in 20 by chance"),
            ends,
            (sign * reach, sign * reach),
            sex="p",
            role="ink-2",
            weight="that",
            at=At(2, reach, dy=10) if sign > 0 else None,
        )
        for sign in (1, -1)
    ]
    return Chart(
        key="residuals",
        finding=_farthest(found.best, grid.labels[first:-1], shown),
        unit=_(
            "Distance of the deaths in each age group from those that the law of {law} expects, in"
            " units of what chance does (deviance residuals); above 0 more died than it expects",
            law=_(found.best.law.label),
        ),
        source=source,
        described=_(
            "Distances of age groups from the fitted law, {who}; the numbers are in the table below"
            " it.",
            who=_who(found),
        ),
        size="low",
        x_kind="age",
        x_range=ages(grid),
        y_title=_("distance"),
        y_range=(-most, 1.3 * most),  # with room for the words
        y_ticks=ticks(-most, most),
        hover=_("age %{customdata}: %{y:.2f}"),
        table="residuals",
        series=(*sides, *limits),
    )


def _farthest(best: Fitted, labels: tuple[str, ...], shown: NDArray[np.bool_]) -> str:
    """Of the groups shown. Clear where it lies beyond what the level allows any of so many groups.

    Source: Sidak (1967), Journal of the American Statistical Association 62, 626-633.
    """
    fit = best.fit
    at = int(np.argmax(np.where(shown, np.abs(fit.residuals), -1.0)))
    each = best.level ** (1 / len(fit.residuals))
    more = float(fit.deaths[at] - fit.exposure[at] * fit.rates[at])
    clear = bool(abs(fit.residuals[at]) > ndtri((1 + each) / 2))
    return say.farthest(labels[at], more, clear=clear)
