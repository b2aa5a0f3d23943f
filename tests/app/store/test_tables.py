"""The numbers on disk mean what they always meant."""

from __future__ import annotations

from app.store.tables import ALWAYS, ANALYSIS, LABORATORY, METADATA, QUANTITIES, QUANTITY_NAMES, READING, table_of

# Copied by hand from the first migration's day on: a number that changes changes what was measured.
ON_DISK = """
1 level_m, 2 ullage_m, 3 liquid_volume_m3, 4 liquid_volume_pct, 5 differential_pressure_kpa, 6 weighed_mass_kg,
7 free_water_level_m, 8 liquid_temperature_c, 9 ambient_temperature_c, 10 vapour_temperature_c, 11 pressure_kpa,
12 pressure_kpa_abs, 13 observed_density_kg_m3, 14 observed_density_temperature_c,
15 observed_density_pressure_kpa_abs, 16 observed_density_by, 17 sediment_water_pct, 18 density_basis,
19 liquid_composition, 20 vapour_composition, 21 roof_load_kg, 22 empty, 23 sample, 24 sample_holds_from,
25 barometric_pressure_kpa_abs
"""


def test_quantities_are_never_renumbered() -> None:
    kept = {name: int(number) for number, name in (entry.split() for entry in ON_DISK.split(","))}
    assert {name: QUANTITIES[name] for name in kept} == kept
    assert len(set(QUANTITIES.values())) == len(QUANTITIES)
    assert all(QUANTITY_NAMES[number] == name for name, number in QUANTITIES.items())
    assert set(QUANTITIES) >= LABORATORY


def test_a_series_tells_its_table_by_its_sign() -> None:
    assert table_of(1) is READING
    assert table_of(-1) is ANALYSIS


def test_the_site_leads_every_key() -> None:
    free = {"site", "access_key", "sign_in"}
    for table in METADATA.sorted_tables:
        if table.name not in free:
            assert next(iter(table.primary_key.columns)).name == "site_id", table.name


def test_always_is_before_every_instant_and_fits_64_bits() -> None:
    year_1 = -62_135_596_800_000_000  # 0001-01-01 in microseconds, the earliest instant of RFC 3339
    assert -(2**63) < ALWAYS < year_1
