"""A declared unit becomes the field's by one factor and one offset, to the last bit, or it is refused.

The bits were worked out with rational arithmetic from the definitions that stand beside them, rounded as
value × factor + offset rounds: factor, product, offset and sum once each.
"""

from __future__ import annotations

import math
from fractions import Fraction

import pytest
from hypothesis import given
from hypothesis import strategies as st

from app.schemas.errors import unit_of
from app.schemas.types import MEASURED
from app.services.convert import FIELDS, UnitError, by_quantity, conversion, number_of

# inch 0.0254 m, pound 0.45359237 kg: Refinement of values for the yard and the pound, Federal Register
# Doc. 59-5442, 1959. Barrel 9,702 in³, gallon 231 in³, short ton 2,000 lb, long ton 2,240 lb, imperial
# gallon 4.54609 L, standard gravity 9.80665 m/s², 1 °F = 5/9 K, 32 °F = 0 °C: NIST SP 811, 2008, app. B.
# Water column: the conventional 1000 kg/m³ of the same.
PINNED = [
    ("level_m", "ft", 27.5, "0x1.381d7dbf487fdp-2", "0x1.0c395810624ddp+3"),
    ("level_m", "in", 330.7, "0x1.a027525460aa6p-6", "0x1.0ccaff6d33094p+3"),
    ("ullage_m", "mm", 8231.0, "0x1.0624dd2f1a9fcp-10", "0x1.07645a1cac083p+3"),
    ("free_water_level_m", "ft", -0.1, "0x1.381d7dbf487fdp-2", "-0x1.f36262cba732fp-6"),
    ("pressure_kpa", "psi", 14.7, "0x1.b943b41800ff8p+2", "0x1.9569670fa7512p+6"),
    ("pressure_kpa_abs", "psi", 0.1, "0x1.b943b41800ff8p+2", "0x1.6102f6799a660p-1"),
    ("pressure_kpa", "inH2O", 6.5, "0x1.fe225391f8658p-3", "0x1.9e7be3e699d28p+0"),
    ("pressure_kpa", "kgf/cm2", 1.1, "0x1.8844189374bc7p+6", "0x1.af7e1b089a028p+6"),
    ("barometric_pressure_kpa_abs", "mbar", 1013.25, "0x1.999999999999ap-4", "0x1.954cccccccccdp+6"),
    ("pressure_kpa", "bar", 0.07, "0x1.9000000000000p+6", "0x1.c000000000001p+2"),
    ("pressure_kpa_abs", "atm", 1.3, "0x1.954cccccccccdp+6", "0x1.0771eb851eb85p+7"),
    ("liquid_volume_m3", "bbl", 12345.6, "0x1.459b21818fe80p-3", "0x1.eab2c97ea778ap+10"),
    ("liquid_volume_m3", "gal", 100000.0, "0x1.f02957a0db492p-9", "0x1.7a8a8aaae94d4p+8"),
    ("liquid_volume_m3", "imperial_gallon", 100000.0, "0x1.29eebbdfea8bdp-8", "0x1.c69be76c8b439p+8"),
    ("liquid_volume_m3", "L", 7.7, "0x1.0624dd2f1a9fcp-10", "0x1.f8a0902de00d2p-8"),
    ("liquid_volume_m3", "ft3", 3.3, "0x1.cff17682769adp-6", "0x1.7ec0ce92083fbp-4"),
    ("observed_density_kg_m3", "lb/ft3", 52.4, "0x1.004ba04035526p+4", "0x1.a3af099c57508p+9"),
    ("observed_density_kg_m3", "lb/gal", 7.1, "0x1.df4e42f66a5e4p+6", "0x1.a96241d44b33ap+9"),
    ("observed_density_kg_m3", "g/cm3", 0.8437, "0x1.f400000000000p+9", "0x1.a5d999999999ap+9"),
    ("weighed_mass_kg", "lb", 44100.0, "0x1.d07a84ab75e51p-2", "0x1.388db1ae70c13p+14"),
    ("weighed_mass_kg", "short_ton", 22.05, "0x1.c597a58f7121bp+9", "0x1.388db1ae70c14p+14"),
    ("weighed_mass_kg", "long_ton", 19.7, "0x1.fc06011b88f28p+9", "0x1.38c07f14f3821p+14"),
    ("roof_load_kg", "t", 3.3, "0x1.f400000000000p+9", "0x1.9c80000000000p+11"),
    ("liquid_temperature_c", "degF", 63.3, "0x1.1c71c71c71c72p-1", "0x1.1638e38e38e38p+4"),
    ("liquid_temperature_c", "degF", 32.0, "0x1.1c71c71c71c72p-1", "0x0.0p+0"),
    ("liquid_temperature_c", "degF", -40.0, "0x1.1c71c71c71c72p-1", "-0x1.4000000000000p+5"),
    ("liquid_temperature_c", "degF", 212.0, "0x1.1c71c71c71c72p-1", "0x1.9000000000000p+6"),
    ("vapour_temperature_c", "K", 290.54, "0x1.0000000000000p+0", "0x1.163d70a3d70b0p+4"),
    ("ambient_temperature_c", "degR", 522.97, "0x1.1c71c71c71c72p-1", "0x1.1638e38e38e40p+4"),
]
OFFSETS = {"degF": Fraction(-160, 9), "K": Fraction("-273.15"), "degR": Fraction("-273.15")}


@pytest.mark.parametrize(("field", "unit", "value", "factor", "converted"), PINNED)
def test_a_conversion_is_pinned_to_the_last_bit(
    field: str, unit: str, value: float, factor: str, converted: str
) -> None:
    found = conversion(field, unit)
    assert found.factor.hex() == factor
    assert found.offset.hex() == float(OFFSETS.get(unit, Fraction(0))).hex()
    assert (found.number(value).hex(), found.text(repr(value)).hex()) == (converted, converted)


def test_the_exact_definitions_are_the_factors() -> None:
    assert conversion("level_m", "in").factor == 0.0254
    assert conversion("pressure_kpa", "psi").factor == 6.894757293168361
    assert conversion("liquid_volume_m3", "bbl").factor == 0.158987294928
    assert by_quantity("liquid_temperature", "°F").number(50.0) == 10.0
    assert conversion("pressure_kpa", "inHg").factor == pytest.approx(3.38639, abs=5e-6)  # NIST SP 811, conventional
    assert [conversion("sediment_water_pct", unit).factor for unit in ("%", "1", "ppm")] == [1.0, 100.0, 1e-4]


@pytest.mark.parametrize(
    ("unit", "text", "fractions_of_an_inch", "parts"),
    [
        ("ft-in-16", "23-04-11", (23 * 12 + 4) * 16 + 11, 16),  # 23 ft 4 11/16 in
        ("ft-in-16", "0-0-0", 0, 16),
        ("ft-in-16", "0-00-1", 1, 16),
        ("ft-in-16", "-1-02-3", -(14 * 16 + 3), 16),  # below the zero
        ("ft-in-8", "23-04-5", (23 * 12 + 4) * 8 + 5, 8),
        ("ft-in-8", "48-11-7", (48 * 12 + 11) * 8 + 7, 8),
    ],
)
def test_feet_and_inches_are_whole_fractions_of_an_inch(
    unit: str, text: str, fractions_of_an_inch: int, parts: int
) -> None:
    assert by_quantity("level", unit).text(text) == float(Fraction(fractions_of_an_inch, parts) * Fraction("0.0254"))


def test_a_dip_in_sixteenths_is_pinned() -> None:
    assert by_quantity("level", "ft-in-16").text("23-04-11") == 7.1294625  # 4,491 sixteenths of 1.5875 mm
    assert by_quantity("ullage", "ft-in-8").text("00-00-1") == 0.003175


@pytest.mark.parametrize(
    "text", ["23-12-0", "23-4-16", "23-4", "23", "23.5", "23-04-11.5", "", "a-b-c", "23-04--1", "٢٣-04-11", "23 04 11"]
)
def test_what_is_no_dip_is_not_read(text: str) -> None:
    with pytest.raises(ValueError, match=r"."):
        by_quantity("level", "ft-in-16").text(text)


# API MPMS 11.1-2004: API = 141.5 / RD − 131.5, RD relative to 999.016 kg/m³; the bits as in PINNED.
@pytest.mark.parametrize(
    ("text", "bits"),
    [("10", "0x1.f3820c49ba5e3p+9"), ("35", "0x1.a881bd90ea7e3p+9"), ("-5.5", "0x1.187a4af69aeedp+10"),
     ("35.27", "0x1.a7d1cc51681c2p+9")],
)  # fmt: skip
def test_degrees_api_are_pinned(text: str, bits: str) -> None:
    for unit in ("degAPI", "°API"):
        assert by_quantity("observed_density", unit).text(text).hex() == bits


def test_ten_degrees_api_is_water_of_60_f_and_relative_density_is_its_multiple() -> None:
    assert by_quantity("observed_density", "degAPI").number(10.0) == 999.016
    assert by_quantity("observed_density", "RD60/60").text("0.8498").hex() == "0x1.a87b5db18bfeap+9"
    # 35 °API is a relative density of 0.8498 (from memory of the printed table).
    assert by_quantity("observed_density", "degAPI").number(35.0) / 999.016 == pytest.approx(0.8498, abs=5e-5)


def test_pitfall_5_a_relative_density_has_the_water_of_its_temperature_and_degrees_api_are_of_60_f() -> None:
    """Water has 999.016 kg/m³ at 60 °F and 999.102 at 15 °C (published): 0.85 by one is not 0.85 by the other.

    Taken for one another they are 73 g/m³ apart, 86 parts in a million; of water of 4 °C, 0.95 in a thousand.
    """
    found = by_quantity("observed_density", "RD60/60").number(0.85)
    assert found == pytest.approx(0.85 * 999.016, rel=1e-15)
    assert 0.85 * 999.102 / found - 1.0 == pytest.approx(86e-6, abs=5e-7)
    assert 0.85 * 999.975 / found - 1.0 == pytest.approx(0.96e-3, abs=5e-6)
    for unit in ("RD15/4", "RD15/15", "RD20/4", "degAPI15"):
        with pytest.raises(UnitError):
            conversion("observed_density_kg_m3", unit)


@pytest.mark.parametrize("text", ["-131.5", "-200", "x", "nan"])
def test_degrees_api_below_all_densities_are_not_read(text: str) -> None:
    with pytest.raises(ValueError, match=r"."):
        by_quantity("observed_density", "degAPI").text(text)


@pytest.mark.parametrize(
    ("field", "unit", "code"),
    [
        ("level_m", "degF", "other_dimension"),
        ("level_m", "degAPI", "other_dimension"),
        ("level_m", "m2", "other_dimension"),
        ("pressure_kpa", "kg/cm2", "other_dimension"),  # a mass on an area is no pressure; kgf/cm2 is
        ("liquid_temperature_c", "C", "other_dimension"),  # the coulomb
        ("liquid_temperature_c", "degC2", "other_dimension"),
        ("liquid_temperature_c", "degF*m/m", "other_dimension"),  # a difference, whose zero is no 32 °F
        ("level_m", "m*dB", "other_dimension"),
        ("observed_density_kg_m3", "ft-in-16", "other_dimension"),
        ("sediment_water_pct", "deg", "other_dimension"),
        ("sediment_water_pct", "kg", "other_dimension"),
        ("pressure_kpa", "psig", "unknown_unit"),  # gauge or absolute is the field's own matter
        ("pressure_kpa_abs", "bara", "unknown_unit"),
        ("liquid_temperature_c", "delta_degF", "unknown_unit"),
        ("weighed_mass_kg", "ton", "unknown_unit"),  # short, long or metric
        ("weighed_mass_kg", "Mlb", "unknown_unit"),  # a thousand, or a million
        ("liquid_volume_m3", "Mbbl", "unknown_unit"),
        ("level_m", "", "unknown_unit"),
        ("level_m", "cubits", "unknown_unit"),
        ("level_m", "FT", "unknown_unit"),
        ("level_m", "m**99", "unknown_unit"),
        ("level_m", "9**9**9", "unknown_unit"),
        ("level_m", "3*m", "unknown_unit"),
        ("level_m", "(m)", "unknown_unit"),
        ("level_m", "a" * 40 + "!", "unknown_unit"),
        ("level_m", "m" * 1_000_000, "unknown_unit"),
    ],
)
def test_a_unit_that_cannot_be_is_refused(field: str, unit: str, code: str) -> None:
    with pytest.raises(UnitError) as refused:
        conversion(field, unit)
    assert refused.value.code == code
    assert not unit or len(unit) < 6 or unit not in refused.value.detail


def test_the_unit_chooses_between_cubic_metres_and_parts() -> None:
    assert by_quantity("liquid_volume", "bbl").field == "liquid_volume_m3"
    assert by_quantity("liquid_volume", "%").field == "liquid_volume_pct"
    with pytest.raises(UnitError) as refused:
        by_quantity("volume", "bbl")
    assert refused.value.code == "unknown_quantity"


def test_every_number_of_a_reading_takes_its_own_unit_unchanged() -> None:
    assert sorted(field for fields in FIELDS.values() for field in fields) == sorted(MEASURED)
    own = {"kPa absolute": "kPa"}
    for field in MEASURED:
        unit = own.get(unit_of(field), unit_of(field))
        found = conversion(field, unit)
        assert (found.factor, found.offset) == (1.0, 0.0), (field, unit)


UNITS = [(field, unit) for field, unit, *_ in PINNED]


@given(st.sampled_from(UNITS), st.floats(-1e9, 1e9))
def test_zero_has_no_sign_and_order_is_kept(unit: tuple[str, str], value: float) -> None:
    found = conversion(*unit)
    assert math.copysign(1.0, found.number(-0.0)) == math.copysign(1.0, found.offset)
    assert found.number(value) != 0.0 or math.copysign(1.0, found.number(value)) == 1.0
    assert found.number(value) <= found.number(math.nextafter(value, math.inf))


@given(st.integers(-999 * 192, 999 * 192))
def test_a_dip_in_sixteenths_comes_back_from_its_metres(count: int) -> None:
    feet, rest = divmod(abs(count), 192)
    text = f"{'-' if count < 0 else ''}{feet}-{rest // 16:02}-{rest % 16:02}"
    metres = by_quantity("level", "ft-in-16").text(text)
    assert metres == float(Fraction(count) * Fraction("0.0015875"))
    assert round(metres / 0.0015875) == count


@given(st.floats(-130, 200))
def test_degrees_api_agree_with_rational_arithmetic(degrees: float) -> None:
    exact = Fraction("141.5") / (Fraction(degrees) + Fraction("131.5")) * Fraction("999.016")
    # The sum rounds near −131.5, where degrees mean little; the rest is three roundings.
    assert by_quantity("observed_density", "degAPI").number(degrees) == pytest.approx(float(exact), rel=1e-13)


@given(st.sampled_from(["level_m", "pressure_kpa", "sediment_water_pct"]), st.text(max_size=50))
def test_any_text_is_a_unit_or_is_refused(field: str, text: str) -> None:
    try:
        conversion(field, text)
    except UnitError as refused:
        assert refused.code in ("unknown_unit", "other_dimension")


NAMES = st.sampled_from(
    ["m", "ft", "kg", "lb", "degF", "degC", "K", "psi", "bar", "bbl", "in", "g_0", "pi", "e", "is", "H2O", "dB"]
)
POWERS = st.sampled_from(["", "2", "3", "^2", "**3", "²"])


@given(
    st.sampled_from(["level_m", "pressure_kpa", "liquid_temperature_c", "observed_density_kg_m3"]),
    st.lists(st.tuples(NAMES, POWERS), min_size=1, max_size=4), st.sampled_from("*/·"),
)  # fmt: skip
def test_any_product_of_names_is_a_unit_or_is_refused(field: str, parts: list[tuple[str, str]], sign: str) -> None:
    try:
        found = conversion(field, sign.join(name + power for name, power in parts))
    except UnitError as refused:
        assert refused.code in ("unknown_unit", "other_dimension")
    else:
        assert math.isfinite(found.factor) and found.factor > 0


@pytest.mark.parametrize(
    ("text", "value"), [("1", 1.0), ("-1.5", -1.5), (".5", 0.5), ("5.", 5.0), ("1e3", 1e3), ("+2E-2", 0.02)]
)
def test_a_plain_number_is_read(text: str, value: float) -> None:
    assert number_of(text) == value


@pytest.mark.parametrize("text", ["", "nan", "inf", "1_000", "1,5", "1 000", "٣", "0x10", "--1", "1e", "1" * 401])
def test_what_is_no_plain_number_is_not_read(text: str) -> None:
    with pytest.raises(ValueError, match="not a number"):
        number_of(text)
