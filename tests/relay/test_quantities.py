"""Measured quantities against worked examples, and the errors a naive sum of magnitudes makes."""

import dataclasses

import numpy as np
import pytest

from relaycfg.relay import measured_quantities, severities


def test_displacement_is_that_of_phasors_and_not_of_magnitudes_at_assumed_angles(geometry, elements, tap):
    # own arithmetic on volts printed in an article (239/287/177 V), which gives the shift as 64 V
    printed = np.array([239.0, 287.0, 177.0])
    size = np.sqrt(np.mean(printed**2) - 230**2)
    direction = -(geometry.phasors * printed**2).sum()
    lost = tap(shift=size * direction / abs(direction))
    np.testing.assert_allclose(np.abs(lost[:3]), printed, atol=0.6)  # printed to a whole volt
    assert severities(elements["59N"], geometry, lost, "l-n")[0] == pytest.approx(63.6, abs=0.06)
    residual = dataclasses.replace(elements["59N"], quantity="3v0")
    assert severities(residual, geometry, lost, "l-n")[0] == pytest.approx(190.7, abs=0.06)
    naive = np.append(printed * geometry.phasors, np.nan)
    assert severities(elements["59N"], geometry, naive, "l-n")[0] == pytest.approx(31.8, abs=0.06)


def test_displacement_from_neutral_to_earth_is_taken_as_measured(geometry, elements, tap):
    residual = dataclasses.replace(elements["59N"], quantity="3v0")
    for element in (elements["59N"], residual):
        assert severities(element, geometry, tap(shift=60, n_pe=7j), "n-to-earth") == pytest.approx([7.0])
        assert severities(element, geometry, tap(shift=60), "n-to-earth") == pytest.approx([0.0])


def test_severities_have_one_channel_a_line_and_undervoltage_is_mirrored(geometry, elements, tap):
    taps = np.stack([tap(), tap(shift=57.5)])
    over = severities(elements["59"], geometry, taps, "l-n")
    np.testing.assert_allclose(over, [[230, 230, 230], [172.5, 263.5, 263.5]], atol=0.05)
    np.testing.assert_array_equal(severities(elements["27"], geometry, taps, "l-n"), -over)
    assert severities(elements["59N"], geometry, taps, "l-n").shape == (2, 1)


def test_line_to_line_quantities_are_blind_to_a_shifted_neutral(geometry, elements, tap):
    between_lines = dataclasses.replace(elements["59"], quantity="l-l")
    healthy, lost = tap(), tap(shift=100 - 40j)
    for name in ("59", "47"):
        seen = (
            severities(elements[name], geometry, lost, "l-n").max()
            - severities(elements[name], geometry, healthy, "l-n").max()
        )
        assert seen > 25
    np.testing.assert_allclose(
        severities(between_lines, geometry, lost, "l-n"), severities(between_lines, geometry, healthy, "l-n")
    )
    for definition in ("line-to-line deviation", "V2/V1"):
        blind = dataclasses.replace(elements["47"], quantity=definition)
        assert severities(blind, geometry, lost, "l-n")[0] == pytest.approx(0, abs=1e-9)


@pytest.mark.parametrize(
    ("l_l_v", "lvur", "spread", "vuf"),
    # own arithmetic (magnitude identity and closed triangle agree); the first four deviations are printed as
    # 1.96, 0.84, 1.1 and 1.9 percent on engineering pages
    [
        ((460, 467, 450), 1.961, 3.704, 2.146),
        ((480, 476, 472), 0.840, 1.681, 0.970),
        ((462, 463, 455), 1.087, 1.739, 1.091),
        ((429, 415, 419), 1.900, 3.325, 1.985),
        ((422, 409, 415), 1.605, 3.130, 1.810),
        ((400, 395, 388), 1.606, 3.043, 1.763),
    ],
)
def test_unbalance_definitions_on_line_to_line_triples(geometry, l_l_v, lvur, spread, vuf):
    first, second, third = l_l_v
    cosine = (first**2 + second**2 - third**2) / (2 * first * second)
    corners = np.array([first, 0.0, second * np.exp(1j * np.arccos(cosine))])  # L1, L2, L3 of the closed triangle
    measured = measured_quantities(geometry, np.append(corners - 200, np.nan))  # the neutral may be anywhere
    np.testing.assert_allclose(measured["l_l_v"], l_l_v)
    unbalance = measured["unbalance_percent"]
    assert unbalance["line-to-line deviation"] == pytest.approx(lvur, abs=6e-4)
    assert unbalance["V2/V1"] == pytest.approx(vuf, abs=6e-4)
    as_magnitudes = measured_quantities(geometry, np.append(np.array(l_l_v, complex), np.nan))["unbalance_percent"]
    assert as_magnitudes["spread"] == pytest.approx(spread, abs=6e-4)
    assert as_magnitudes["line-to-neutral deviation"] == pytest.approx(lvur, abs=6e-4)


@pytest.mark.parametrize(("conductances", "pvur"), [((1, 2, 3), 25.19), ((2, 1, 1), 26.02), ((1, 1, 0), 39.23)])
def test_line_to_neutral_deviation_of_an_open_star(geometry, tap, conductances, pvur):
    # own arithmetic: Millman, closed form and the invariant agree
    shift = 230 * np.dot(conductances, geometry.phasors) / sum(conductances)
    measured = measured_quantities(geometry, tap(shift=shift))
    assert measured["unbalance_percent"]["line-to-neutral deviation"] == pytest.approx(pvur, abs=0.006)
    assert measured["v0_v"] == pytest.approx(abs(shift))


def test_a_dead_system_has_no_unbalance_and_no_nan(geometry):
    dead = np.array([0.0, 0.0, 0.0, np.nan], complex)
    assert {float(x) for x in measured_quantities(geometry, dead)["unbalance_percent"].values()} == {0.0}
    reversed_order = np.append(230 * geometry.phasors.conj(), np.nan)
    assert np.isfinite(measured_quantities(geometry, reversed_order)["unbalance_percent"]["V2/V1"])
