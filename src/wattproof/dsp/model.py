"""Which columns a fit has, and how their scalar products follow from sums of τ^r·cos dθ and τ^r·sin dθ.

Time is centred and scaled (τ runs from −1 to 1), so every column is an even or an odd function of time and the normal
equations fall into two real halves that know nothing of each other.
"""

from functools import lru_cache

import attrs
import numpy as np
from numpy.typing import NDArray

Indices = NDArray[np.intp]
Matrix = NDArray[np.float64]


@attrs.frozen
class Model:
    """A trend τ^0…τ^trend, the first order times τ^0…τ^ramp, and every further order as it stands.

    `orders` are multiples of the base frequency; the first is what may ramp and tells the frequency. Without any, the
    model is a trend alone.
    """

    orders: tuple[int, ...]
    ramp: int = 1
    trend: int = 3

    def __attrs_post_init__(self) -> None:
        if self.trend % 2 == 0:
            raise ValueError(f"Model.trend is {self.trend}; it must be odd, so that real and complex columns align")

    @property
    def terms(self) -> tuple[tuple[int, int], ...]:
        """(power of τ, order) of each term that has a cosine and a sine."""
        return _terms(self.orders, self.ramp)

    @property
    def parameters(self) -> int:
        """How many real numbers the model fits at a known frequency."""
        return self.trend + 1 + 2 * len(self.terms)


@lru_cache(maxsize=128)
def _terms(orders: tuple[int, ...], ramp: int) -> tuple[tuple[int, int], ...]:
    if not orders:
        return ()
    return tuple((power, orders[0]) for power in range(ramp + 1)) + tuple((0, order) for order in orders[1:])


@attrs.frozen(eq=False)
class Half:
    """The even or the odd columns: which products W_r(|d|) make up their Gram matrix, and with which signs.

    Gram = ½·(sign_difference·W[power, difference] + sign_sum·W[power, total]).
    """

    powers: Indices
    orders: Indices
    power: Indices
    difference: Indices
    total: Indices
    sign_difference: Matrix
    sign_sum: Matrix


def _half(columns: list[tuple[int, int]], *, even: bool) -> Half:
    powers = np.array([power for power, _ in columns], dtype=np.intp)
    orders = np.array([order for _, order in columns], dtype=np.intp)
    # a column is a cosine where its power's parity equals the half's: even half τ^even·cos, odd half τ^odd·cos
    cosine = (powers % 2 == 0) == even
    p, q = np.meshgrid(cosine, cosine, indexing="ij")
    k, m = np.meshgrid(orders, orders, indexing="ij")
    power = powers[:, None] + powers[None, :]
    # cos·cos: W(k−m)+W(k+m); sin·sin: W(k−m)−W(k+m); cos k·sin m: W(k+m)+W(m−k); sin k·cos m: W(k+m)+W(k−m)
    flip = np.where(p & ~q, -1.0, 1.0) * np.where((power % 2 == 1) & (k < m), -1.0, 1.0)
    sign_sum = np.where(~p & ~q, -1.0, 1.0)
    return Half(powers, orders, power, np.abs(k - m), k + m, flip, sign_sum)


@lru_cache(maxsize=128)
def halves(model: Model) -> tuple[Half, Half]:
    """Return the even and the odd half of a model; in both, trend columns come first, then `model.terms` in order."""
    even = [(power, 0) for power in range(0, model.trend + 1, 2)]
    odd = [(power, 0) for power in range(1, model.trend + 1, 2)]
    terms = list(model.terms)
    return _half(even + terms, even=True), _half(odd + terms, even=False)


def gram(half: Half, sums: Matrix) -> Matrix:
    """Return the Gram matrix of one half from `sums`, shape (powers, orders): W_r(d) for d = 0…2·highest order."""
    by_difference = half.sign_difference * sums[half.power, half.difference]
    product: Matrix = 0.5 * (by_difference + half.sign_sum * sums[half.power, half.total])
    return product
