"""A small invented device and helpers shared by the tests of the relay."""

import numpy as np
import pytest

from relaycfg.model.device import Accuracy, Device, Element, Function, SettableRange
from relaycfg.model.geometry import three_phase


def element(function, quantity, ratio, low=10.0, high=400.0, **changes):
    figures = {
        "function": function,
        "stages": 2,
        "pickup": SettableRange(low, high, 1.0),
        "unit": "v",
        "base_v": None,
        "delay_s": SettableRange(0.05, 30.0, 0.01),
        "dropout_ratio": (ratio,),
        "reset": ("instantaneous", "held"),
        "hold_s": 0.5,
        "accuracy": Accuracy(1.0, 1.0, 1.0, 0.03, "greater"),
        "quantity": quantity,
    }
    return Element(**(figures | changes))


@pytest.fixture
def geometry():
    return three_phase()


@pytest.fixture
def elements():
    return {
        "59": element(Function.OVERVOLTAGE, "l-n", 0.97),
        "27": element(Function.UNDERVOLTAGE, "l-n", 1.03),
        "59N": element(Function.DISPLACEMENT, "v0", 0.9),
        "47": element(Function.UNBALANCE, "line-to-neutral deviation", 0.9, 2.0, 30.0),
    }


@pytest.fixture
def device(elements):
    return Device("Trial", ("l-n",), "rms", 1.0, 0.5, "per phase", "l-n", tuple(elements.values()))


@pytest.fixture
def tap(geometry):
    """A tap whose neutral stands ``shift`` volts away from the star of a stiff source."""

    def build(level_v=230.0, shift=0.0, n_pe=np.nan):
        return np.array([*(level_v * geometry.phasors - shift), n_pe])

    return build
