"""Units of length. The factors are exact by definition: see the sources in torsionfe/units.py."""

import pytest
from hypothesis import given
from hypothesis import strategies as st

from torsionfe.errors import UnitError
from torsionfe.units import UNITS, length_factor, parse_unit


@pytest.mark.parametrize(
    ("start", "end", "factor"),
    [
        ("in", "mm", 25.4),  # the agreement of 1959
        ("ft", "m", 0.3048),
        ("yd", "m", 0.9144),
        ("ft", "in", 12.0),
        ("mil", "um", 25.4),
        ("m", "mm", 1000.0),
        ("km", "nm", 1e12),
        ("ft_us", "m", 1200 / 3937),  # US survey foot
        ("mm", "mm", 1.0),
    ],
)
def test_factors_are_those_of_the_definitions(start, end, factor):
    assert length_factor(start, end) == factor


@given(st.sampled_from(UNITS), st.sampled_from(UNITS), st.sampled_from(UNITS))
def test_there_and_on_and_back_is_no_change(a, b, c):
    assert length_factor(a, b) * length_factor(b, c) == pytest.approx(length_factor(a, c), rel=1e-15)
    assert length_factor(a, b) * length_factor(b, a) == pytest.approx(1.0, rel=1e-15)


@pytest.mark.parametrize(
    ("name", "symbol"),
    [
        ("MM", "mm"), ("Millimetres", "mm"), ("millimeter", "mm"), (" inch ", "in"), ("Inches", "in"),
        ('"', "in"), ("'", "ft"), ("\u00b5m", "um"), ("\u03bcm", "um"), ("microns", "um"), ("FT", "ft"),
        ("thou", "mil"), ("US survey  feet", "ft_us"),
    ],
)  # fmt: skip
def test_other_names_of_the_units(name, symbol):
    assert parse_unit(name) == symbol


@pytest.mark.parametrize("name", ["Mm", "mmm", "furlong", "", "kg", None, 25.4, True, b"mm", "m" * 10_000])
def test_an_unknown_unit_asks(name):
    with pytest.raises(UnitError, match="no unit of length") as caught:
        parse_unit(name)
    assert "mm, cm" in str(caught.value)
    assert len(str(caught.value)) < 250


def test_the_nearest_is_named():
    with pytest.raises(UnitError, match="did you mean 'mm'"):
        length_factor("mmm", "in")
    with pytest.raises(UnitError, match="did you mean 'inches'"):
        length_factor("mm", "inchse")
