"""The keys of a session text: for each table, what may stand there, in the order it is written.

One list serves the reader, which refuses everything else, and the writer.
"""

from __future__ import annotations

from dataclasses import dataclass

from physics import ranges
from physics.ranges import Range

ENERGY_EV = Range(-200.0, 200.0, "an energy lies between -200 and 200 eV")
WIDTH_EV = Range(0.0, 200.0, "a largest width is above 0 and at most 200 eV", open_below=True)
MONOLAYERS = Range(0.0, 1e6, "a number of monolayers is above 0", open_below=True)

RATE_PERCENT = Range(0.0, 20.0, "a growth rate's standard deviation lies between 0 and 20 %")
SPREAD_NM = Range(0.0, 10.0, "a thickness's standard deviation lies between 0 and 10 nm")
SPREAD_ML = Range(0.0, 50.0, "a thickness's standard deviation lies between 0 and 50 monolayers")
COMPOSITION = Range(0.0, 0.2, "a fraction's standard deviation lies between 0 and 0.2")
DONORS_PERCENT = Range(0.0, 30.0, "the donors' standard deviation lies between 0 and 30 %")
GRADING_NM = Range(0.0, 5.0, "a grade's mean width lies between 0 and 5 nm")
DRAWS = Range(8.0, 1e5, "draws are a whole number from 8 to 100000")
SEED = Range(0.0, 2.0**53, "a seed is a whole number from 0 to 2^53")
BOUND = Range(-1e300, 1e300, "a bound is a number that is not infinite")
WHOLE = ("draws", "seed")
"""Keys whose number is a whole one."""

NAME_RULE = "a text on one line without control characters, in quotation marks"
TEXT_RULE = "a text without control characters, in quotation marks"

BANDS = ("parabolic", "kane")
BAND_RULE = 'a band is "parabolic" or "kane"'
FIELD_MODELS = ("uniform", "screened")
FIELD_RULE = 'a field is "uniform" or "screened"'
CHARGE_MODELS = ("semi-classical", "quantum")
CHARGE_RULE = 'a charge is "semi-classical" or "quantum"'


@dataclass(frozen=True)
class Text:
    """A text value; on one line unless ``lines``."""

    lines: bool = False


Entry = Range | Text
Table = dict[str, Entry]

LINE_TEXT = Text()

CONDITIONS: Table = {
    "temperature_K": ranges.TEMPERATURE_K,
    "bias_V": ranges.BIAS_V,
    "field": LINE_TEXT,
    "charge": LINE_TEXT,
    "band": LINE_TEXT,
    "dephasing_eV": ranges.DEPHASING_EV,
    "scattering_time_s": ranges.SCATTERING_TIME_S,
    "mobility_cm2_Vs": ranges.MOBILITY_CM2_VS,
}
GROWTH: Table = {"substrate": LINE_TEXT}
CONTACT: Table = {
    "material": LINE_TEXT,
    "edge_eV": ranges.EDGE_EV,
    "mass": ranges.MASS,
    "donors_cm3": ranges.CONTACT_DONORS_CM3,
    "fermi_eV": ranges.FERMI_EV,
    "permittivity": ranges.PERMITTIVITY,
    "gap_eV": ranges.GAP_EV,
}
LAYER: Table = {
    "label": LINE_TEXT,
    "material": LINE_TEXT,
    "edge_eV": ranges.EDGE_EV,
    "mass": ranges.MASS,
    "to_material": LINE_TEXT,
    "to_edge_eV": ranges.EDGE_EV,
    "to_mass": ranges.MASS,
    "thickness_nm": ranges.THICKNESS_NM,
    "thickness_ml": MONOLAYERS,
    "donors_cm3": ranges.DONORS_CM3,
    "permittivity": ranges.PERMITTIVITY,
    "gap_eV": ranges.GAP_EV,
    "to_gap_eV": ranges.GAP_EV,
}
MATERIAL: Table = {
    "edge_eV": ranges.EDGE_EV,
    "mass": ranges.MASS,
    "permittivity": ranges.PERMITTIVITY,
    "monolayer_nm": ranges.MONOLAYER_NM,
    "gap_eV": ranges.GAP_EV,
}
VIEW: Table = {
    "from_eV": ENERGY_EV,
    "to_eV": ENERGY_EV,
    "max_width_eV": WIDTH_EV,
}
SWEEP: Table = {"from_V": ranges.BIAS_V, "to_V": ranges.BIAS_V, "overlay_K": LINE_TEXT}
DEVICE: Table = {
    "mesa_um2": ranges.MESA_UM2,
    "series_ohm": ranges.SERIES_OHM,
    "parallel_fF": ranges.PARALLEL_FF,
}
TOLERANCE: Table = {
    "rate_percent": RATE_PERCENT,
    "thickness_nm": SPREAD_NM,
    "thickness_ml": SPREAD_ML,
    "composition": COMPOSITION,
    "donors_percent": DONORS_PERCENT,
    "grading_nm": GRADING_NM,
    "draws": DRAWS,
    "seed": SEED,
}
SPEC: Table = {"result": LINE_TEXT, "at_least": BOUND, "at_most": BOUND}
TOP_TEXTS: Table = {"title": LINE_TEXT, "notes": Text(lines=True)}
TOP_TABLES = (
    "conditions",
    "growth",
    "left",
    "layer",
    "right",
    "material",
    "view",
    "sweep",
    "device",
    "tolerance",
    "spec",
)
TOP_KEYS = ("format", *TOP_TEXTS, *TOP_TABLES)

UNITLESS = {
    "thickness": "thickness_nm or thickness_ml",
    "temperature": "temperature_K",
    "bias": "bias_V",
    "dephasing": "dephasing_eV",
    "scattering_time": "scattering_time_s",
    "mobility": "mobility_cm2_Vs",
    "edge": "edge_eV",
    "to_edge": "to_edge_eV",
    "donors": "donors_cm3 or donors_percent",
    "doping": "donors_cm3",
    "fermi": "fermi_eV",
    "monolayer": "monolayer_nm",
    "gap": "gap_eV",
    "to_gap": "to_gap_eV",
    "width": "thickness_nm or thickness_ml",
    "from": "from_eV or from_V",
    "to": "to_eV or to_V",
    "max_width": "max_width_eV",
    "mesa": "mesa_um2",
    "area": "mesa_um2",
    "series": "series_ohm",
    "parallel": "parallel_fF",
    "overlay": "overlay_K",
    "rate": "rate_percent",
    "grading": "grading_nm",
}
"""Keys that people write without the unit, and what they mean."""
