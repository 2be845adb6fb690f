"""Gaussian processes that stand in for figures between the solved points, with their own error.

Each is a linear trend plus a Matérn 5/2 process in what `Space.seen` gives (C. E. Rasmussen, C. K. I. Williams,
"Gaussian Processes for Machine Learning", MIT Press 2006, sections 2.7, 4.2 and 5.4), fitted by greatest marginal
likelihood. Its error is checked on itself: each solved point is predicted from all others (section 5.4.2), and where
those misses are larger than the process believes, all its errors are enlarged by that factor.
"""

from __future__ import annotations

import math
import warnings
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from scipy.linalg import cho_solve
from scipy.optimize import minimize
from sklearn.exceptions import ConvergenceWarning
from sklearn.gaussian_process import GaussianProcessRegressor
from sklearn.gaussian_process.kernels import ConstantKernel, DotProduct, Kernel, Matern, WhiteKernel

LEAST_NOISE = 1e-9


def _kernel(columns: int) -> Kernel:
    trend = ConstantKernel(1.0, (1e-3, 1e3)) * DotProduct(1.0, "fixed")
    bends = ConstantKernel(0.1, (1e-6, 1e2)) * Matern([1.0] * columns, (0.15, 15.0), nu=2.5)
    return trend + bends + WhiteKernel(1e-6, (LEAST_NOISE, 1e-2))


@dataclass
class Surrogate:
    """One figure as a process over what is seen of points.

    Attributes
    ----------
    missed
        Root mean square of the misses when each solved point is predicted from the others, in the figure's own unit.
    widened
        Factor by which the process's own error was enlarged.
    """

    model: GaussianProcessRegressor
    middle: float
    size: float
    missed: float
    widened: float

    def predict(self, seen: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """Mean and standard deviation at points, each (points,)."""
        mean, error = self.model.predict(seen, return_std=True)
        return self.middle + self.size * mean, self.size * self.widened * error

    def difference(self, seen: np.ndarray) -> tuple[float, float]:
        """Mean and standard deviation of the second of two points less the first."""
        mean, cov = self.model.predict(seen, return_cov=True)
        noise = self.model.kernel_.k2.noise_level
        spread = cov[0, 0] + cov[1, 1] - 2.0 * cov[0, 1] - 2.0 * noise
        return float(self.size * (mean[1] - mean[0])), float(self.size * self.widened * math.sqrt(max(spread, 0.0)))


def fit(seen: np.ndarray, values: np.ndarray, theta: np.ndarray | None = None) -> Surrogate:
    """A surrogate of values (points,) at what is seen of the points (points, columns).

    `theta`: parameters of the kernel from the fit before, from which the search for the best ones starts.
    """
    middle, size = float(values.mean()), float(values.std())
    size = size if size > 1e-12 * max(1.0, abs(middle)) else 1.0
    scaled = (values - middle) / size
    kernel = _kernel(seen.shape[1])
    model = _fitted(seen, scaled, kernel if theta is None else kernel.clone_with_theta(theta))
    missed, widened = _left_out(model, scaled)
    return Surrogate(model, middle, size, size * missed, widened)


def _fitted(seen: np.ndarray, scaled: np.ndarray, kernel: Kernel) -> GaussianProcessRegressor:
    model = GaussianProcessRegressor(kernel, alpha=1e-12, optimizer=_likeliest)
    with warnings.catch_warnings():
        warnings.simplefilter("ignore", ConvergenceWarning)  # a parameter at its bound is no fault
        return model.fit(seen, scaled)


def _likeliest(cost: Callable[[np.ndarray], tuple[float, np.ndarray]], start: np.ndarray, bounds: np.ndarray
               ) -> tuple[np.ndarray, float]:
    """Parameters of least `cost` (negative logarithm of the likelihood) from a start; near enough is good enough, for
    they are sought again after the next solve."""
    inside = np.clip(start, bounds[:, 0], bounds[:, 1])
    found = minimize(cost, inside, jac=True, method="L-BFGS-B", bounds=bounds, options={"maxiter": 40, "ftol": 1e-5})
    return found.x, float(found.fun)


def with_more(of: Surrogate, seen: np.ndarray, values: np.ndarray) -> Surrogate:
    """The same process, its parameters kept, on other points."""
    model = GaussianProcessRegressor(of.model.kernel_, alpha=1e-12, optimizer=None)
    return Surrogate(model.fit(seen, (values - of.middle) / of.size), of.middle, of.size, of.missed, of.widened)


def _left_out(model: GaussianProcessRegressor, scaled: np.ndarray) -> tuple[float, float]:
    """Root mean square miss at each point predicted from the others, and how much larger misses are than believed."""
    inverse = cho_solve((model.L_, True), np.eye(len(scaled)))
    variance = 1.0 / np.diag(inverse)
    misses = model.alpha_.ravel() * variance
    widened = math.sqrt(float(np.mean(misses**2 / variance)))
    return math.sqrt(float(np.mean(misses**2))), max(1.0, widened)
