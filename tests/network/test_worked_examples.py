"""Published and own worked examples, reproduced from their own inputs; sources stand in the reference file."""

import numpy as np
import pytest

from relaycfg.model.geometry import three_phase
from relaycfg.network import Network, connected, healthy_emf, motor_start
from relaycfg.network.loadlaw import Law, flow, slope
from tests.network.examples import (
    EXAMPLES,
    LINES,
    ORDER,
    broken,
    close,
    close_row,
    magnitudes,
    of_recipe,
    rows,
    shift,
    star,
    volts_of,
)
from tests.network.sites import board, cable, load, motor, site


@pytest.mark.parametrize("name", of_recipe("star"))
def test_star_with_its_neutral_sound_or_open(name: str) -> None:
    example = EXAMPLES[name]
    inputs, expected = example["inputs"], example["expected"]
    made = star(inputs)
    closed, joint = inputs["neutral"] == "closed", inputs.get("joint_ohm")
    solved = broken(made, joint, "none" if closed and joint is None else "A")
    l_n, vn = solved.l_n[1, :, 0], shift(solved)
    v0, _, _ = three_phase(ORDER[inputs["sequence"]]).sequences(l_n)
    l_l = made.supply.geometry.line_to_line(l_n)
    _, v1, v2 = made.supply.geometry.sequences(l_n)
    figures = {
        "vn_v": abs(vn),
        "vn_deg": np.angle(vn, deg=True),
        "vn_real_v": vn.real,
        "vn_imag_v": vn.imag,
        "l_n_v": np.abs(l_n),
        "l_l_v": np.abs(l_l),
        "v0_v": abs(v0),
        "v2_v1_percent": 100 * abs(v2 / v1),
        "neutral_a": abs(solved.neutral_a[1, 0]),
        "neutral_deg": np.angle(solved.neutral_a[1, 0], deg=True),
        "touch_v": abs(solved.pe_earth[1, 0]),
        "l2_v": abs(l_n[1]),
        "l3_v": abs(l_n[2]),
    }
    if "load_ohm" in inputs:
        current = np.array([v / complex(*z) if z else 0 for v, z in zip(l_n, inputs["load_ohm"], strict=True)])
        figures |= {
            "current_a": np.abs(current),
            "current_deg": np.angle(current, deg=True),
            "i2_a": abs(current[1]),
            "i1_a": abs(current[0]),
            "i1_deg": np.angle(current[0], deg=True),
        }
    if "earth_path_ohm" in inputs:
        earth = vn / inputs["earth_path_ohm"]
        figures |= {"earth_a": abs(earth), "earth_deg": np.angle(earth, deg=True)}
    for key in expected:
        close(example, key, figures[key])


@pytest.mark.parametrize("name", of_recipe("series-pair"))
def test_two_phases_in_series_across_a_line_voltage(name: str) -> None:
    example = EXAMPLES[name]
    volts = magnitudes(broken(star(example["inputs"])))
    close(example, "loaded_v", volts[:2])
    if "loop_a" in example["expected"]:
        close(example, "loop_a", volts[0] / example["inputs"]["load_ohm"][0][0])


def test_two_phases_of_a_120_208_star_share_208_volts() -> None:
    example = EXAMPLES["two-of-three-208"]
    solved = broken(star(example["inputs"]))
    close(example, "l_n_v", magnitudes(solved))
    close(example, "vn_v", abs(shift(solved)))
    close(example, "sum_of_loaded_v", magnitudes(solved)[:2].sum())


@pytest.mark.parametrize("name", of_recipe("conductance-table"))
def test_voltages_by_conductance_ratio(name: str) -> None:
    example = EXAMPLES[name]
    for row in rows(example):
        loads = [load("A", at, 1000 * row[f"{at.lower()}_ratio"]) for at in LINES]
        solved = broken(star(example["inputs"], loads))
        volts = magnitudes(solved)
        close_row(
            example,
            row,
            l1_v=volts[0],
            l2_v=volts[1],
            l3_v=volts[2],
            vn_v=abs(shift(solved)),
            pvur_percent=100 * np.abs(volts - volts.mean()).max() / volts.mean(),
        )


@pytest.mark.parametrize("name", of_recipe("threshold-ratio"))
def test_load_ratio_at_which_a_phase_reaches_a_pickup(name: str) -> None:
    example = EXAMPLES[name]
    for row in rows(example):
        k = row["k_ratio"]
        shape = {"k:1:1": (k, 1, 1), "1/k:1:1": (1 / k, 1, 1), "k:1:1/k": (k, 1, 1 / k)}[example["inputs"]["shape"]]
        solved = broken(star(example["inputs"], [load("A", at, 1000 * g) for at, g in zip(LINES, shape, strict=True)]))
        volts = magnitudes(solved)
        # half of the ratio's last digit moves the pickup by 0.1 V at most
        assert volts.max() == pytest.approx(row["pickup_v"], abs=0.1)
        assert volts == pytest.approx([row["l1_v"], row["l2_v"], row["l3_v"]], abs=0.15)


def test_joint_resistance_table() -> None:
    example = EXAMPLES["loose-joint"]
    made = star(example["inputs"])
    for row in rows(example):
        solved = broken(made, row["joint_ohm"])
        volts = magnitudes(solved)
        close_row(
            example,
            row,
            neutral_a=abs(solved.joint_a[0]),
            vn_v=abs(solved.joint_v[0]),
            joint_w=abs(solved.joint_v[0] * solved.joint_a[0]),
            l1_v=volts[0],
            l2_v=volts[1],
            l3_v=volts[2],
        )
    opened = broken(made)
    close(example, "open_vn_v", abs(opened.joint_v[0]))
    close(example, "open_l_n_v", magnitudes(opened))
    hottest = broken(made, example["expected"]["max_power_joint_ohm"])
    close(example, "max_power_w", abs(hottest.joint_v[0] * hottest.joint_a[0]))


def test_joint_resistance_at_which_a_phase_reaches_a_pickup() -> None:
    example = EXAMPLES["loose-joint-pickup"]
    made = star(example["inputs"])
    for row in rows(example):
        solved = broken(made, row["joint_ohm"])
        # the printed ohms carry two decimals: 0.005 ohm is up to 0.03 V and 0.3 W
        assert magnitudes(solved).max() == pytest.approx(row["pickup_v"], abs=0.03)
        assert abs(solved.joint_v[0]) == pytest.approx(row["vn_v"], abs=0.05)
        assert abs(solved.joint_v[0] * solved.joint_a[0]) == pytest.approx(row["joint_w"], abs=0.3)


def test_earth_is_no_substitute_for_a_neutral() -> None:
    example = EXAMPLES["earth-path-100-60-40"]
    for row in rows(example):
        by_earth = broken(star(example["inputs"], electrode=row["path_ohm"], source_electrode=0.0))
        by_joint = broken(star(example["inputs"]), row["path_ohm"])
        for solved in (by_earth, by_joint):
            close_row(example, row, vn_v=abs(shift(solved)), high_v=magnitudes(solved).max())
    close(example, "open_vn_v", abs(shift(broken(star(example["inputs"])))))


@pytest.mark.parametrize("name", of_recipe("electrode-limit"))
def test_electrode_that_keeps_touch_voltage_at_a_limit(name: str) -> None:
    example = EXAMPLES[name]
    for row in rows(example):
        for limit in example["inputs"]["touch_limit_v"]:
            ohm = row[f"at_{limit:.0f}_v_ohm"]
            loads = [load("A", "L1", 230 * row["load_a"])]
            solved = broken(star(example["inputs"], loads, electrode=ohm, source_electrode=0.0))
            # ohms printed to 0.01: the relative half digit, on a divider
            assert abs(solved.pe_earth[1, 0]) == pytest.approx(limit, rel=0.006 / ohm)


def test_touch_voltage_of_a_house_with_a_broken_combined_neutral() -> None:
    example = EXAMPLES["touch-single-phase"]
    for row in rows(example):
        for source_electrode, key in ((0.0, "stiff_earth_touch_v"), (10.0, "ten_ohm_touch_v")):
            loads = [load("A", "L1", 1e3 * row["load_kw"])]
            solved = broken(
                star(example["inputs"], loads, electrode=row["electrode_ohm"], source_electrode=source_electrode)
            )
            close_row(example, row, **{key: abs(solved.pe_earth[1, 0])})


@pytest.mark.parametrize("name", of_recipe("neighbours"))
def test_more_electrodes_lower_touch_voltage_not_overvoltage(name: str) -> None:
    example = EXAMPLES[name]
    inputs = example["inputs"]
    for row in rows(example):
        houses = int(row["houses_count"])
        street = [board("A", cable=cable(0j), link=True)]
        street += [board(f"H{k}", "A", None, electrode=inputs["electrode_each_ohm"]) for k in range(houses)]
        loads = [
            load(f"H{k}", at, 1e3 * kw / 3)
            for k in range(houses)
            for at, kw in zip(LINES, inputs["kw_of_three_houses"], strict=True)
        ]
        made = site([board("S"), *street], loads, electrode_ohm=inputs["source_electrode_ohm"], earthing="TN-C-S")
        solved = broken(made)
        volts = magnitudes(solved)
        close_row(
            example,
            row,
            touch_v=abs(solved.pe_earth[1, 0]),
            vn_v=abs(shift(solved)),
            l1_v=volts[0],
            l2_v=volts[1],
            l3_v=volts[2],
        )


def test_snapshots_of_a_street_feeder() -> None:
    example = EXAMPLES["european-feeder-whole"]
    inputs = example["inputs"]
    for kw, row in zip(inputs["phase_kw"], rows(example), strict=True):
        made = star(inputs | {"load_kw": kw, "load_nominal_v": 230.0})
        solved, volts = broken(made), magnitudes(broken(made))
        close_row(
            example,
            row,
            vn_v=abs(shift(solved)),
            shift_pu=abs(shift(solved)) / 230,
            l1_v=volts[0],
            l2_v=volts[1],
            l3_v=volts[2],
            neutral_a=abs(broken(made, place="none").neutral_a[1, 0]),
        )


def test_bounded_load_law() -> None:
    example = EXAMPLES["bounded-load-law"]
    inputs = example["inputs"]
    for row in rows(example):
        loads = [load("A", "L1", 2300.0, zip_p=tuple(inputs["zip"]), band=tuple(inputs["band_pu"]))]
        made = site([board("A")], loads, emf_v=230 * row["voltage_pu"])
        solved = Network(made).solve("none", connected(made), healthy_emf(made))
        close_row(example, row, current_pu=abs(solved.neutral_a[0, 0]) / 10)
        assert bool(solved.below_band[0]) == (row["voltage_pu"] < 0.8 - 1e-9)
        assert bool(solved.above_band[0]) == (row["voltage_pu"] > 1.2 + 1e-9)


def constant_power_law(kw: list[float]) -> Law:
    """Constant power in a band that never ends."""
    none, edge = np.zeros((3, 1)), np.ones((3, 1))
    return Law(none, none, none, none, 1e3 * np.array(kw)[:, None], none, 1e-3 * edge, 1e6 * edge)


def test_constant_power_roots_are_no_stable_states() -> None:
    example = EXAMPLES["constant-power-roots"]
    emf = 230 * three_phase().phasors
    for row in rows(example):
        kw = [row["l1_kw"], row["l2_kw"], row["l3_kw"]]
        vn = star_point(emf, np.array([row["l1_v"], row["l2_v"], row["l3_v"]]))
        assert abs(vn) == pytest.approx(row["vn_v"], abs=0.3)
        u = (emf - vn)[:, None]
        law = constant_power_law(kw)
        now = flow(law, u.real, u.imag)
        current = (now.g_re + 1j * now.g_im) * u
        # magnitudes printed to 0.1 V leave up to 0.5 % of the largest current in the sum
        assert abs(current.sum()) < 5e-3 * np.abs(current).max()
        a_re, a_im, b_re, b_im = slope(law, now, u.real, u.imag)
        alpha, beta = complex(a_re.sum(), a_im.sum()), complex(b_re.sum(), b_im.sum())
        assert alpha.real <= abs(beta)


def star_point(emf: np.ndarray, l_n: np.ndarray) -> complex:
    """The star point [V] from the three line-to-neutral magnitudes: trilateration, own arithmetic."""
    matrix = np.array([[2 * (e - emf[0]).real, 2 * (e - emf[0]).imag] for e in emf[1:]])
    right = l_n[0] ** 2 - l_n[1:] ** 2
    x, y = np.linalg.solve(matrix, right)
    return complex(x, y)


def test_constant_power_displacement_goes_with_the_root_of_the_unbalance() -> None:
    example = EXAMPLES["constant-power-small-unbalance"]
    emf = 230 * three_phase().phasors

    for row in rows(example):
        heavy = row["heavy_ratio"]
        # sum P_k / (E_k - vn) = 0 cleared of its denominators (own arithmetic); two roots, mirrored about L1
        parts = [p * np.poly(np.delete(emf, k)) for k, p in enumerate((heavy, 1.0, 1.0))]
        found = np.roots(np.sum(parts, axis=0))
        assert found.imag[0] == pytest.approx(-found.imag[1])
        for vn in found:
            u = (emf - vn)[:, None]
            now = flow(constant_power_law([heavy, 1.0, 1.0]), u.real, u.imag)
            assert abs(((now.g_re + 1j * now.g_im) * u).sum()) < 1e-9
        vn = abs(found[0])
        loads = [load("A", at, 1e3 * p) for at, p in zip(LINES, (heavy, 1.0, 1.0), strict=True)]
        linear = broken(star(example["inputs"], loads))
        close_row(example, row, constant_power_vn_v=vn, constant_impedance_vn_v=abs(shift(linear)))


@pytest.mark.parametrize("number", range(3))
def test_motor_start_dips_a_little_less_than_the_scalar_estimate(number: int) -> None:
    example = EXAMPLES["motor-start-dips"]
    inputs, row = example["inputs"], rows(example)[number]
    rating = 1e3 * row["motor_kw"] / inputs["efficiency_ratio"] / inputs["pf_ratio"]
    start_pf = 0.3
    starting = inputs["current_ratio"] * rating * complex(start_pf, (1 - start_pf**2) ** 0.5)
    reactance = row["source_pu"] * 3 * 230**2 / (1e3 * row["source_kva"])
    made = site([board("A")], [], [motor("A", rating * complex(0.85, 0.527), starting)], line_ohm=1j * reactance)
    solved = motor_start(Network(made), made, 0, connected(made), healthy_emf(made))
    dip = 100 * (1 - np.abs(solved.l_n[0, :, 0]) / 230)
    assert dip == pytest.approx(np.full(3, dip[0]), abs=1e-6)
    assert 0.9 * row["dip_percent"] < dip[0] < row["dip_percent"]


def test_reference_file_holds_only_what_may_be_tested() -> None:
    assert len(EXAMPLES) >= 50
    assert {e["status"] for e in EXAMPLES.values()} <= {"read", "quoted", "own"}
    assert all(volts_of(e["inputs"]) > 0 for e in EXAMPLES.values() if e["recipe"] == "star")
