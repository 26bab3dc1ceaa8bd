"""Fourier series and sums of ideal waveforms, written down from mathematics with mpmath and nothing of the project."""

from collections.abc import Callable, Mapping

from mpmath import asin, cos, mp, mpf, pi, sin, sqrt, zeta

mp.dps = 30
Series = Callable[[int], mpf]  # order → coefficient of sin kθ (or cos kθ), in any common scale


def square(order: int) -> mpf:
    """4/(πk) for odd k: Fourier series of a square wave."""
    return 4 / (pi * order) if order % 2 else mpf(0)


def triangle(order: int) -> mpf:
    """8/(π²k²) with alternating sign for odd k: Fourier series of a triangle wave."""
    return 8 / (pi * order) ** 2 * (-1) ** ((order - 1) // 2) if order % 2 else mpf(0)


def sawtooth(order: int) -> mpf:
    """2/(πk): Fourier series of a sawtooth."""
    return 2 / (pi * order)


def half_wave(order: int) -> mpf:
    """Fourier series of a half-wave rectified sine of peak 1: ½ at k = 1, 2/(π(k² − 1)) at even k."""
    if order == 1:
        return mpf(1) / 2
    return 2 / (pi * (order**2 - 1)) if order % 2 == 0 else mpf(0)


def full_wave(order: int) -> mpf:
    """4/(π(4k² − 1)), the fundamental at twice the sine's frequency: full-wave rectified sine of peak 1."""
    return 4 / (pi * (4 * mpf(order) ** 2 - 1))


def pulse(duty: float) -> Series:
    """2/(πk)·sin(πkD): Fourier series of a rectangular pulse of duty D."""
    return lambda order: 2 / (pi * order) * sin(pi * order * mpf(duty))


def clipped(theta_deg: float) -> Series:
    """Sine of peak A = 1/sin θ clipped at ±1, in sine terms: by integrating A·sin x up to θ and 1 beyond it."""
    theta = mpf(theta_deg) * pi / 180
    height = 1 / sin(theta)

    def term(order: int) -> mpf:
        if order % 2 == 0:
            return mpf(0)
        if order == 1:
            return 2 * height / pi * (theta + sin(theta) * cos(theta))
        below, above = sin((order - 1) * theta) / (order - 1), sin((order + 1) * theta) / (order + 1)
        return 2 * height / (order * pi) * (below + above)

    return term


def dead_zone(width: float) -> Series:
    """Sine of peak 1 less a dead zone of ±width, in sine terms: what a hard clipper at ±width would have passed."""
    alpha = asin(mpf(width))
    passed = clipped(float(alpha * 180 / pi))

    def term(order: int) -> mpf:
        return (1 if order == 1 else 0) - mpf(width) * passed(order)

    return term


def thd_f(series: Series, highest: int) -> float:
    """√Σ bk² / b1 over k = 2…highest."""
    return float(sqrt(sum(series(order) ** 2 for order in range(2, highest + 1))) / abs(series(1)))


def to_total(ratio_to_fundamental: float) -> float:
    """THD_R from THD_F: r/√(1 + r²)."""
    return float(ratio_to_fundamental / sqrt(1 + mpf(ratio_to_fundamental) ** 2))


def harmonics(series: Series, highest: int, *, cosine: bool = False) -> Mapping[int, tuple[float, float]]:
    """Return order → (ratio, phase of sin kθ + phase) up to an order, for a fundamental sin θ.

    `cosine`: the coefficients belong to cos kx, and the fundamental cos x is sin θ at θ = x + π/2.
    """
    first = series(1)
    shift = pi / 2 if cosine else mpf(0)
    found = {}
    for order in range(2, highest + 1):
        ratio = series(order) / first
        if ratio:
            phase = (pi if ratio < 0 else 0) + (shift - order * shift)
            found[order] = (float(abs(ratio)), float(phase))
    return found


# THD to the fundamental with every harmonic counted, from Σ bk² = 2·(mean square) (Parseval)
ALL_HARMONICS = {
    "square": float(sqrt(pi**2 / 8 - 1)),
    "triangle": float(sqrt(pi**4 / 96 - 1)),
    "sawtooth": float(sqrt(zeta(2) - 1)),
    "half-wave": float(sqrt(1 - 8 / pi**2)),
    "full-wave": float(sqrt(9 * pi**2 / 16 - mpf(11) / 2)),
}
