"""The linear fit of overlay over wafer and field.

    dx = shift_x + scale_x X - (rotation + skew) Y + (m + a) x - (r + b) y
    dy = shift_y + scale_y Y +  rotation         X + (m - a) y + (r - b) x

with (X, Y) the place on the wafer, field centre plus site, and (x, y) the site in the field; m and r are
the field's magnification and rotation, a and b their asymmetric parts.
"""

from dataclasses import dataclass

import numpy as np

from flowplan.engine.sources import N_BASIS, FloatArray

WAFER_TERMS = ("shift_x", "shift_y", "scale_x", "scale_y", "rotation", "skew")
FIELD_TERMS = ("magnification", "rotation", "magnification_asymmetry", "rotation_asymmetry")
#: Columns of the basis: 1, field x, field y, wafer x, wafer y.
_ONE, _FX, _FY, _WX, _WY = range(N_BASIS)
#: Each term as a combination of coefficients: (axis, column, factor).
_COMBINATIONS: tuple[tuple[tuple[int, int, float], ...], ...] = (
    ((0, _ONE, 1.0),),
    ((1, _ONE, 1.0),),
    ((0, _WX, 1.0),),
    ((1, _WY, 1.0),),
    ((1, _WX, 1.0),),
    ((0, _WY, -1.0), (1, _WX, -1.0)),
    ((0, _FX, 0.5), (1, _FY, 0.5)),
    ((1, _FX, 0.5), (0, _FY, -0.5)),
    ((0, _FX, 0.5), (1, _FY, -0.5)),
    ((0, _FY, -0.5), (1, _FX, -0.5)),
)
#: Share of the largest below which an eigenvalue says that the places cannot tell two terms apart.
_RANK = 1e-9


@dataclass(frozen=True, slots=True)
class Fit:
    """A linear fit.

    Attributes
    ----------
    wafer, field : dict of str to float or None
        The terms [nm, ppm, urad]; None where the measured places cannot tell it from others.
    wafer_errors, field_errors : dict of str to float or None
        Their standard errors, sites taken as independent.
    coefficients : ndarray, shape (n_basis, 2)
        Of the basis functions along x and y [nm, nm/mm].
    residual : ndarray, shape (2,)
        Standard deviation of what the fit leaves [nm]; NaN without degrees of freedom.
    rank : int
        Coefficients that the places determine, along each axis.
    """

    wafer: dict[str, float | None]
    field: dict[str, float | None]
    wafer_errors: dict[str, float | None]
    field_errors: dict[str, float | None]
    coefficients: FloatArray
    residual: FloatArray
    rank: int


def linear_fit(sums: FloatArray, pattern: FloatArray) -> Fit:
    """Fit by least squares from sums.

    Parameters
    ----------
    sums : ndarray, shape (n_basis + 2, n_basis + 2)
        Sum over rows of z z', with z the basis functions and the overlay less `pattern`.
    pattern : ndarray, shape (n_basis, 2)
        What was taken off.

    Returns
    -------
    Fit
        The fit of the whole overlay. Where all rows share one field centre the wafer's terms are left
        out, where all stand at one site of the field the field's, since nothing can tell them apart.
    """
    n = float(sums[0, 0])
    used = _used(sums[:N_BASIS, :N_BASIS])
    gram = sums[np.ix_(used, used)]
    scale = np.sqrt(np.diag(gram))
    scale[scale == 0] = 1.0
    values, vectors = np.linalg.eigh(gram / np.outer(scale, scale))
    sound = values > _RANK * values[-1]
    rank = int(np.count_nonzero(sound))
    half = (vectors[:, sound] / np.sqrt(values[sound])) / scale[:, None]
    inverse = np.zeros((N_BASIS, N_BASIS))
    inverse[np.ix_(used, used)] = half @ half.T
    unknown = np.zeros((N_BASIS, N_BASIS - len(used) + len(values) - rank))
    unknown[used, : len(values) - rank] = vectors[:, ~sound] / scale[:, None]
    for column, basis in enumerate(np.setdiff1d(np.arange(N_BASIS), used), len(values) - rank):
        unknown[basis, column] = 1.0
    change = inverse @ sums[:N_BASIS, N_BASIS:]
    weights = np.vstack([-change, np.eye(2)])
    left = np.maximum(np.einsum("ia,ij,ja->a", weights, sums, weights), 0.0)
    residual = np.sqrt(left / (n - rank)) if n > rank else np.full(2, np.nan)
    # Along coefficients that nobody can tell the pattern counts for nothing either.
    coefficients = change + inverse @ sums[:N_BASIS, :N_BASIS] @ pattern
    terms, errors = zip(
        *(_term(c, coefficients, inverse, residual, unknown) for c in _COMBINATIONS), strict=True
    )
    split = len(WAFER_TERMS)
    return Fit(
        dict(zip(WAFER_TERMS, terms[:split], strict=True)),
        dict(zip(FIELD_TERMS, terms[split:], strict=True)),
        dict(zip(WAFER_TERMS, errors[:split], strict=True)),
        dict(zip(FIELD_TERMS, errors[split:], strict=True)),
        coefficients,
        residual,
        rank,
    )


def _used(gram: FloatArray) -> list[int]:
    """Return the columns of the basis that the fit uses."""
    n = gram[0, 0]
    # Field centres are wafer place minus site; their spread follows from the sums.
    turn = np.zeros((2, N_BASIS))
    turn[0, [_WX, _FX]] = turn[1, [_WY, _FY]] = 1.0, -1.0
    centres = _spread(turn, gram, n)
    sites = _spread(np.eye(N_BASIS)[[_FX, _FY]], gram, n)
    if not sites.any():
        return [_ONE, _WX, _WY]
    if not centres.any():
        return [_ONE, _FX, _FY]
    return list(range(N_BASIS))


def _spread(turn: FloatArray, gram: FloatArray, n: float) -> FloatArray:
    """Return which combinations of the basis vary from row to row."""
    mean_square = np.einsum("ki,ij,kj->k", turn, gram, turn) / n
    mean = turn @ gram[0] / n
    scale = np.abs(turn) @ np.sqrt(np.diag(gram) / n)
    return np.asarray(mean_square - mean**2 > _RANK * np.maximum(scale, 1e-9) ** 2)


def _term(
    combination: tuple[tuple[int, int, float], ...],
    coefficients: FloatArray,
    inverse: FloatArray,
    residual: FloatArray,
    unknown: FloatArray,
) -> tuple[float | None, float | None]:
    """Return a term and its standard error; None where the places do not tell it."""
    value, variance = 0.0, 0.0
    for axis, column, factor in combination:
        if unknown.shape[1] and np.abs(unknown[column]).max() > np.sqrt(_RANK) * np.abs(unknown).max():
            return None, None
        value += factor * float(coefficients[column, axis])
        variance += factor**2 * float(inverse[column, column]) * float(residual[axis]) ** 2
    error = float(np.sqrt(variance))
    return value, error if np.isfinite(error) else None
