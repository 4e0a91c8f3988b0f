"""What a column's name says: its quantity and its unit."""

from __future__ import annotations

import re

# Units that may stand behind an underscore; only these, because `run_a` is no current.
_UNIT_LIST = (
    "m mm cm km nm in ft s ms min h kg g mg t K Pa kPa MPa hPa bar mbar psi A mA nA V mV kV N mN kN MN Nm Hz kHz MHz "
    "W kW J kJ l L ml mL mol mmol ppm ppb rpm % µm µA µV µg °C °F Ω kΩ"
)
_UNITS = frozenset(_UNIT_LIST.split())
_WRITTEN = {"um": "µm", "uA": "µA", "uV": "µV", "ug": "µg", "C": "°C", "degC": "°C", "degF": "°F", "pct": "%"}
_WRITTEN |= {"percent": "%", "ohm": "Ω", "Ohm": "Ω", "kohm": "kΩ", "kOhm": "kΩ"}
_BRACKETED = re.compile(r"(?P<name>.*?)\s*(?:\[(?P<square>[^\]]*)\]|\((?P<round>[^)]*)\))\s*")
_QUOTIENT = re.compile(r"(?P<name>.*?\S)\s+(?:/|in)\s+(?P<unit>\S+)")  # "p / kPa", as in ISO 80000-1
_SUFFIXED = re.compile(r"(?P<name>.+)[_ ](?P<unit>[^_ ]+)")


def split_unit(header: str) -> tuple[str, str | None]:
    """Quantity and unit that a column's name gives; None when it gives no unit.

    ``level_m``, ``pressure [kPa]``, ``pressure (kPa)`` and ``p / kPa`` are understood.
    """
    found = _BRACKETED.fullmatch(header)
    if found:
        unit = (found["square"] if found["square"] is not None else found["round"]).strip()
        unit = "1" if unit in ("-", "–") else unit
        return _spoken(found["name"]) or _spoken(header), _WRITTEN.get(unit, unit) or None
    found = _QUOTIENT.fullmatch(header) or _SUFFIXED.fullmatch(header)
    if found:
        unit = _WRITTEN.get(found["unit"], found["unit"])
        if unit in _UNITS:
            return _spoken(found["name"]), unit
    return _spoken(header), None


def _spoken(name: str) -> str:
    return re.sub(r"[_\s]+", " ", name).strip()
