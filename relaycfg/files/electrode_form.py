"""What a site may say of a driven earth electrode instead of its ohms: rods and the soil they stand in."""

from relaycfg.files.keys import Form, key


class ElectrodeForm(Form):
    """Vertical rods, instead of electrode_ohm."""

    rod_length_m: float = key("length of one rod in the ground", unit="m", ask="metres", gt=0, le=100)
    rod_diameter_mm: float = key("its diameter", unit="mm", ask="millimetres", gt=0, le=500)
    soil_ohm_m: float = key("resistivity of the soil, at its driest", unit="ohm*m", ask="ohm metres", gt=0, le=100000)
    rods: int = key("equal rods joined together", ask="a whole number", default=1, ge=1, le=100)
    spacing_m: float | None = key(
        "several rods: from one to the next", unit="m", ask="metres", gt=0, le=1000,
        otherwise="required with several rods",
    )  # fmt: skip
    group_factor: float | None = key(
        "several rods: lambda of their arrangement", ask="a factor", ge=0, le=20,
        otherwise="two rods: row rods-parallel; required with more",
    )  # fmt: skip
