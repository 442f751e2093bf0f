"""A fitted process for scripts."""

from __future__ import annotations

from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from evenstage.fitting.results import Fit, Residuals
    from evenstage.report.circuit_document import Document


def fit_body(fit: Fit) -> Document:
    """Return what a fit says, without head and notices; parts of one, and SI units in the keys."""
    return {
        "source": fit.source,
        "cells": fit.cells,
        "output": None if fit.output is None else str(fit.output),
        "process": {"name": fit.process.name, "fo4_s": fit.fo4},
        "measured": fit.measured,
        "used": fit.used,
        "transition_least_s": fit.transition_least,
        "transition_most_s": fit.transition_most,
        "constants": [
            {
                "models": one.models,
                "polarity": one.polarity,
                "key": one.key,
                "value": one.value,
                "standard_error": one.error,
                "told": one.told,
            }
            for one in fit.constants
        ],
        "not_told_apart": [
            {
                "constants": [{"polarity": p, "key": key} for p, key in one.constants],
                "spread": one.spread,
            }
            for one in fit.confusions
        ],
        "one_stage": None if fit.single is None else _residuals(fit.single),
        "several_stages": None if fit.several is None else _residuals(fit.several),
        "gates": [_residuals(one) for one in fit.gates],
    }


def _residuals(one: Residuals) -> Document:
    return {
        "name": one.name,
        "stages": one.stages,
        "count": one.count,
        "bias": one.bias,
        "median": one.median,
        "percentile_95": one.high,
        "transition_median": one.transition,
    }
