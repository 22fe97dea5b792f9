"""Products of transfer functions against scipy: response by frequency, integrated noise, step response.

The reference forms the product as polynomials with scipy.signal and integrates with scipy.integrate.quad; the program
does neither.
"""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy import integrate, linalg, optimize, signal

from worksheet.engine import polynomial as poly
from worksheet.engine.cascade import Cascade, Link, Noise
from worksheet.model.metrics import Reason

TWO_PI = 2 * np.pi


def link(numerator: list[float], denominator: list[float], *noise: tuple[list[float], float]) -> Link:
    """A link over one condition; of each noise the numerator and the white density."""
    sources = tuple(Noise([np.array([c]) for c in top], white, 0.0, 1.0) for top, white in noise)
    top: poly.Poly = [np.array([c]) for c in numerator]
    bottom: poly.Poly = [np.array([c]) for c in denominator]
    return Link(top, bottom, sources, 1.0, poly.inverse_roots(bottom))


def of_tau(gain: float, tau: float, feed: float = 0.0) -> Link:
    """One pole, a share of feed-through, and a noise current of 1e-20 A^2/Hz into 1 kohm."""
    return link([gain, gain * feed * tau], [1.0, tau], ([1e3], 1e-20))


def of_two(gain: float, tau: float, damping: float) -> Link:
    """Two poles, complex where the damping is below 1."""
    return link([gain, 0.0, 0.0], [1.0, 2 * damping * tau, tau * tau], ([1e3, 0.3e3 * tau, 0.0], 2e-20))


def product(links: list[Link]) -> tuple[np.ndarray, np.ndarray]:
    """Numerator and denominator of the whole, highest power first."""
    top, bottom = np.array([1.0]), np.array([1.0])
    for one in links:
        top = np.polymul(top, np.trim_zeros([float(np.ravel(c)[0]) for c in one.numerator][::-1], "f"))
        bottom = np.polymul(bottom, [float(np.ravel(c)[0]) for c in one.denominator][::-1])
    return top, bottom


PATHS = {
    "one pole": [of_tau(-40.0, 1e-6)],
    "two poles apart": [of_tau(-40.0, 1e-6), of_tau(0.7, 1e-8)],
    "feed-through within": [of_tau(0.7, 1e-8, 0.2), of_tau(-20.0, 2e-7, -0.01), of_tau(0.6, 5e-9, 0.3)],
    "two equal": [of_tau(2.0, 1e-7), of_tau(3.0, 1e-7)],
    "five equal": [of_tau(1.5, 1e-7)] * 5,
    "equal, and one slow": [of_tau(1.5, 1e-9)] * 4 + [of_tau(1.0, 1e-6)],
    "ringing": [of_two(5.0, 1e-7, 0.3), of_tau(1.0, 2e-8)],
    "ringing twice": [of_two(5.0, 1e-7, 0.5), of_two(-2.0, 1e-7, 0.5)],
}


@pytest.mark.parametrize("links", PATHS.values(), ids=PATHS)
def test_bandwidth_is_where_the_response_has_fallen_by_3_db(links: list[Link]) -> None:
    top, bottom = product(links)
    found = float(Cascade(links, 1).bandwidth().values[0])
    grid = np.geomspace(found * 1e-6, found, 4000)
    static = abs(top[-1] / bottom[-1])
    response = abs(signal.freqs(top, bottom, grid * TWO_PI)[1]) / static
    assert response[-1] == pytest.approx(np.sqrt(0.5), rel=1e-9)
    assert (response[:-1] > np.sqrt(0.5)).all()
    assert float(Cascade(links, 1).dc_gain().values[0]) == pytest.approx(static, rel=1e-12)


@pytest.mark.parametrize("links", PATHS.values(), ids=PATHS)
def test_noise_is_the_integral_over_all_frequency(links: list[Link]) -> None:
    powers = Cascade(links, 1).noise_powers()[:, 0]
    for place, one in enumerate(links):
        total = 0.0
        for source in one.noise:
            own = np.trim_zeros([float(np.ravel(c)[0]) for c in source.numerator][::-1], "f")
            top, bottom = product(links[place + 1 :])
            top = np.polymul(top, own)
            bottom = np.polymul(bottom, [float(np.ravel(c)[0]) for c in one.denominator][::-1])
            corner = 1.0 / np.max(np.abs(Cascade(links[place:], 1).constants)) / TWO_PI

            def density(x: float, top: np.ndarray = top, bottom: np.ndarray = bottom, corner: float = corner) -> float:
                f = corner * np.exp(x)
                return float(abs(np.polyval(top, 2j * np.pi * f) / np.polyval(bottom, 2j * np.pi * f)) ** 2 * f)

            area = integrate.quad(density, -30, 30, limit=400, points=[0.0], epsabs=0, epsrel=1e-10)[0]
            total += float(source.white) * area
        assert powers[place] == pytest.approx(total, rel=1e-7), place


def settled(links: list[Link], tolerance: float) -> float:
    """The last time at which scipy's step response is outside the tolerance, refined between its samples.

    In units of the slowest time constant, which scipy's state equations want.
    """
    slowest = float(np.max(np.abs(Cascade(links, 1).constants)))
    systems = []
    for one in links:
        top, bottom = product([one])
        top, bottom = (part / slowest ** np.arange(len(part))[::-1] for part in (top, bottom))
        systems.append(signal.TransferFunction(np.trim_zeros(top, "f"), bottom).to_ss())
    a, b, c, d = systems[0].A, systems[0].B, systems[0].C, systems[0].D
    for one in systems[1:]:
        a = np.block([[a, np.zeros((len(a), len(one.A)))], [one.B @ c, one.A]])
        b, c, d = np.vstack([b, one.B @ d]), np.hstack([one.D @ c, one.C]), one.D @ d
    times = np.linspace(0, 2 * len(a) + 3 * np.log(1 / tolerance), 6001)
    _, response = signal.step((a, b, c, d), T=times)
    final = float((d - c @ np.linalg.solve(a, b))[0, 0])
    error = abs(response / final - 1) - tolerance
    last = int(np.max(np.flatnonzero(error > 0), initial=-1))
    if last < 0:
        return 0.0

    def at(time: float) -> float:
        state = linalg.expm(a * time) @ b
        return float(abs((c @ np.linalg.solve(a, state))[0, 0] / final) - tolerance)

    return slowest * float(optimize.brentq(at, times[last], times[last + 1], xtol=1e-13))


@pytest.mark.parametrize("tolerance", [1e-3, 0.05])
@pytest.mark.parametrize("links", PATHS.values(), ids=PATHS)
def test_settling_is_that_of_the_step_response(links: list[Link], tolerance: float) -> None:
    found = float(Cascade(links, 1).settling_time(tolerance).values[0])
    assert found == pytest.approx(settled(links, tolerance), rel=1e-6)


@settings(max_examples=15, deadline=None)
@given(st.lists(st.tuples(st.floats(-9, -5), st.floats(0.01, 0.4)), min_size=1, max_size=4))
def test_any_path_settles_as_its_step_response(poles: list[tuple[float, float]]) -> None:
    links = [of_tau(1.0, 10.0**decade, feed) for decade, feed in poles]
    slow, fast = (f(decade for decade, _ in poles) for f in (max, min))
    if slow - fast > 2.5:  # the reference samples evenly
        links = [of_tau(1.0, 10.0 ** max(decade, slow - 2.5), feed) for decade, feed in poles]
    found = float(Cascade(links, 1).settling_time(1e-3).values[0])
    assert found == pytest.approx(settled(links, 1e-3), rel=1e-5)


def test_five_equal_poles_agree_with_the_closed_form() -> None:
    """n equal poles: 1 - exp(-x) times the sum of x^k/k! below n (tables of Laplace transforms)."""
    x = float(Cascade([of_tau(1.5, 1e-7)] * 5, 1).settling_time(1e-3).values[0]) / 1e-7
    rest = np.exp(-x) * sum(x**k / float(np.prod(np.arange(1, k + 1))) for k in range(5))
    assert rest == pytest.approx(1e-3, rel=1e-9)


def test_n_equal_poles_have_the_bandwidth_of_the_shrinkage_law() -> None:
    """f_n = f_1 sqrt(2^(1/n) - 1), the shrinkage of bandwidth in equal stages (any textbook on amplifiers)."""
    for count in (1, 2, 5, 12):
        found = float(Cascade([of_tau(2.0, 1e-7)] * count, 1).bandwidth().values[0])
        assert found == pytest.approx(np.sqrt(2 ** (1 / count) - 1) / (TWO_PI * 1e-7), rel=1e-12)


def test_a_path_without_a_fall_or_a_gain_says_so() -> None:
    flat = Cascade([of_tau(1.0, 1e-7, 0.9)], 1)
    assert flat.bandwidth().reason((0,)) == Reason.FEED_THROUGH
    assert Cascade([of_tau(1.0, 1e-7), of_tau(0.0, 1e-7)], 1).input_noise().reason((0,)) == Reason.NO_GAIN
    endless = Cascade([of_tau(1.0, 1e-7), link([1.0, 0.0], [0.0, 1e-7], ([1e3], 1e-20))], 1)
    for measured in (endless.dc_gain(), endless.bandwidth(), endless.input_noise(), endless.settling_time(1e-3)):
        assert measured.reason((0,)) == Reason.UNLIMITED


def test_a_stage_taken_out_leaves_its_gain() -> None:
    path = Cascade([of_tau(3.0, 1e-6), of_tau(2.0, 1e-8)], 1)
    rest = path.without(0)
    assert float(rest.dc_gain().values[0]) == 6.0
    assert float(rest.bandwidth().values[0]) == pytest.approx(1 / (TWO_PI * 1e-8), rel=1e-12)
    none = Cascade([of_tau(3.0, 1e-6)], 1).without(0)
    assert none.bandwidth().reason((0,)) == Reason.UNLIMITED
    assert float(none.settling_time(1e-3).values[0]) == 0.0
