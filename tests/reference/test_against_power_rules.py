"""Each provision of the shipped power rules gives the limit or the example that its own text publishes.

Sources stand beside the numbers; unless said otherwise they are the paragraph or standard that the row cites.
"""

import math

import pytest

from fellspan.links.rules import RuleCheck, check_power, find_rule, load_rules

UNCONFIRMED = {"fcc-15.407-5g8-ptp", "fcc-15.255-60-conducted"}
MHZ, GHZ = 1e6, 1e9


def checked(
    rule_id: str,
    gain_dbi: float,
    *,
    width_hz: float = 20 * MHZ,
    power_dbm: float | None = None,
    feeder_db: float = 0.0,
    peak_to_average_db: float | None = None,
    fixed_outdoors: bool = True,
) -> RuleCheck:
    rule = find_rule(rule_id)
    return check_power(
        rule,
        frequency_hz=0.5 * (rule.low_hz + rule.high_hz),
        bandwidth_hz=width_hz,
        power_dbm=power_dbm,
        gain_dbi=gain_dbi,
        feeder_loss_db=feeder_db,
        peak_to_average_db=peak_to_average_db,
        fixed_outdoors=fixed_outdoors,
    )


def numbers(check: RuleCheck) -> tuple[float, float]:
    """Highest setting and EIRP, dBm."""
    assert check.reason == ""
    assert check.highest_setting_dbm is not None
    assert check.allowed_eirp_dbm is not None
    return check.highest_setting_dbm, check.allowed_eirp_dbm


# 47 CFR 15.247(c)(1)(i): 1 dB less power for each 3 dB over 6 dBi, from 1 W; the table follows from that sentence.
@pytest.mark.parametrize(
    ("gain_dbi", "power_dbm", "eirp_dbm"),
    [(6, 30, 36), (9, 29, 38), (12, 28, 40), (18, 26, 44), (24, 24, 48), (30, 22, 52)],
)
def test_point_to_point_at_2g4_trades_three_db_of_gain_for_one_of_power(
    gain_dbi: float, power_dbm: float, eirp_dbm: float
) -> None:
    check = checked("fcc-15.247-2g4-ptp", gain_dbi)
    assert numbers(check) == pytest.approx((power_dbm, eirp_dbm), abs=1e-9)
    assert check.allowed_conducted_dbm == pytest.approx(power_dbm, abs=1e-9)
    assert check.binds == "conducted power"


# 47 CFR 15.247(b): 1 W and 6 dBi, then 1 dB less for each dB: 36 dBm EIRP whatever the antenna.
@pytest.mark.parametrize("rule_id", ["fcc-15.247-900", "fcc-15.247-2g4", "fcc-15.247-5g8"])
@pytest.mark.parametrize("gain_dbi", [6, 16, 30])
def test_the_plain_limit_is_36_dbm_eirp(rule_id: str, gain_dbi: float) -> None:
    assert numbers(checked(rule_id, gain_dbi)) == pytest.approx((36.0 - gain_dbi, 36.0), abs=1e-9)


def test_less_gain_earns_no_more_than_one_watt() -> None:
    assert numbers(checked("fcc-15.247-2g4", 2.0)) == pytest.approx((30.0, 32.0), abs=1e-9)


# 47 CFR 15.247(c)(1)(ii): no reduction with gain.
@pytest.mark.parametrize("gain_dbi", [6, 23, 34])
def test_point_to_point_at_5g8_keeps_one_watt(gain_dbi: float) -> None:
    assert numbers(checked("fcc-15.247-5g8-ptp", gain_dbi)) == pytest.approx((30.0, 30.0 + gain_dbi), abs=1e-9)


def test_8_dbm_in_3_khz_decides_for_a_narrow_emission() -> None:
    # 47 CFR 15.247(e): 8 dBm in 3 kHz; 8 + 10 log(30/3) = 18 dBm in 30 kHz.
    check = checked("fcc-15.247-2g4-ptp", 6.0, width_hz=30e3)
    assert numbers(check)[0] == pytest.approx(18.0, abs=1e-9)
    assert check.binds == "conducted density"


# 47 CFR 15.407(a), 5.15-5.25 GHz: to 23 dBi 1 W and 17 dBm/MHz, then 1 dB for each dB: 53 dBm.
@pytest.mark.parametrize(("gain_dbi", "eirp_dbm"), [(20, 50), (23, 53), (26, 53), (34, 53)])
def test_the_23_dbi_rule_ends_at_53_dbm(gain_dbi: float, eirp_dbm: float) -> None:
    assert numbers(checked("fcc-15.407-5g2-ptp", gain_dbi, width_hz=40 * MHZ))[1] == pytest.approx(eirp_dbm, abs=1e-9)


def test_17_dbm_a_megahertz_decides_under_20_mhz_and_falls_with_gain() -> None:
    check = checked("fcc-15.407-5g2-ptp", 26.0, width_hz=10 * MHZ)  # 17 + 10 - (26 - 23)
    assert numbers(check) == pytest.approx((24.0, 50.0), abs=1e-9)
    assert check.binds == "conducted density"


def test_an_outdoor_access_point_has_6_dbi() -> None:
    assert numbers(checked("fcc-15.407-5g2", 16.0, width_hz=40 * MHZ)) == pytest.approx((20.0, 36.0), abs=1e-9)
    assert "125 mW (21 dBm)" in " ".join(find_rule("fcc-15.407-5g2").conditions)
    assert "30 degrees" in " ".join(find_rule("fcc-15.407-5g2").conditions)


# 47 CFR 15.407(a): the lesser of 250 mW and 11 dBm + 10 log B, 11 dBm/MHz, 6 dBi.
@pytest.mark.parametrize("rule_id", ["fcc-15.407-5g3", "fcc-15.407-5g5"])
@pytest.mark.parametrize(
    ("width_mhz", "power_dbm"), [(10, 11 + 10), (20, 10 * math.log10(250)), (80, 10 * math.log10(250))]
)
def test_250_mw_or_11_dbm_and_10_log_b(rule_id: str, width_mhz: float, power_dbm: float) -> None:
    assert numbers(checked(rule_id, 6.0, width_hz=width_mhz * MHZ))[0] == pytest.approx(power_dbm, abs=1e-9)
    assert numbers(checked(rule_id, 23.0, width_hz=width_mhz * MHZ))[0] == pytest.approx(power_dbm - 17, abs=1e-9)
    assert "DFS" in " ".join(find_rule(rule_id).conditions)


def test_other_than_point_to_point_at_5g8_has_36_dbm() -> None:
    assert numbers(checked("fcc-15.407-5g8", 23.0)) == pytest.approx((13.0, 36.0), abs=1e-9)
    # 30 dBm in 500 kHz: 1 W fits into 500 kHz, half of it into 250 kHz is no more dense than that.
    assert find_rule("fcc-15.407-5g8").densities[0].power_dbm == 30.0
    assert find_rule("fcc-15.407-5g8").densities[0].per_hz == 500e3


def test_5850_to_5895_is_for_indoors() -> None:
    check = checked("fcc-15.407-5g9", 6.0)
    assert check.highest_setting_dbm is None
    assert "indoor" in check.reason


# 47 CFR 15.255(c): 40 dBm average and 43 dBm peak where the kinder limits for point-to-point do not hold.
@pytest.mark.parametrize("gain_dbi", [20.0, 38.0, 51.0])
def test_the_plain_limit_at_60_ghz_is_40_dbm_eirp_whatever_the_antenna(gain_dbi: float) -> None:
    check = checked("fcc-15.255-60", gain_dbi, width_hz=2160 * MHZ)
    assert numbers(check) == pytest.approx((40.0 - gain_dbi, 40.0), abs=1e-9)
    peaky = checked("fcc-15.255-60", gain_dbi, width_hz=2160 * MHZ, peak_to_average_db=8.0)
    assert numbers(peaky)[1] == pytest.approx(35.0, abs=1e-9)  # 43 less 8
    assert peaky.binds == "peak EIRP"


# 47 CFR 15.255(c): 82 dBm average, 2 dB less for each dB under 51 dBi, not under 40; peak 85 and 43 alike.
@pytest.mark.parametrize(
    ("gain_dbi", "eirp_dbm"), [(55, 82), (51, 82), (45, 70), (40, 60), (38, 56), (30, 40), (10, 40)]
)
def test_60_ghz_outdoors_falls_two_db_for_each_under_51_dbi(gain_dbi: float, eirp_dbm: float) -> None:
    check = checked("fcc-15.255-60-ptp", gain_dbi, width_hz=2160 * MHZ)
    assert numbers(check) == pytest.approx((eirp_dbm - gain_dbi, eirp_dbm), abs=1e-9)
    assert check.binds == "EIRP"
    assert any("peak" in note for note in check.notes)
    peaky = checked("fcc-15.255-60-ptp", gain_dbi, width_hz=2160 * MHZ, peak_to_average_db=8.0)
    assert numbers(peaky)[1] == pytest.approx(eirp_dbm + 3 - 8, abs=1e-9)
    assert peaky.binds == "peak EIRP"


# EIRP limit, density per MHz and the width from which the EIRP decides, as the standard or recommendation cited prints them.
EUROPE = [
    ("etsi-300328-2g4", 20.0, 10.0),  # EN 300 328 V2.2.2
    ("etsi-301893-5g2", 23.0, 10.0),  # EN 301 893 V2.2.1
    ("etsi-301893-5g3-tpc", 23.0, 10.0),  # EN 301 893 V2.2.1
    ("etsi-301893-5g3", 20.0, 7.0),  # EN 301 893 V2.2.1; the density is ours, 3 dB down, which the row says
    ("etsi-301893-5g5-tpc", 30.0, 17.0),  # EN 301 893 V2.2.1
    ("etsi-301893-5g5", 27.0, 14.0),  # EN 301 893 V2.2.1; the density is ours, 3 dB down, which the row says
    ("cept-0604-5g8", 36.0, 23.0),  # ECC/REC/(06)04, EN 302 502
    ("cept-0604-5g8-mesh", 33.0, 20.0),  # ECC/REC/(06)04, EN 302 502
    ("cept-7003-60-c1", 40.0, 23.0),  # ERC/REC 70-03 Annex 3, c1
    ("cept-7003-60-c2", 40.0, 23.0),  # ERC/REC 70-03 Annex 3, c2
    ("cept-7003-60-c3", 55.0, 38.0),  # ERC/REC 70-03 Annex 3, c3
]


@pytest.mark.parametrize(("rule_id", "eirp_dbm", "density_dbm"), EUROPE)
def test_european_rows_hold_eirp_and_density(rule_id: str, eirp_dbm: float, density_dbm: float) -> None:
    wide = checked(rule_id, 38.0, width_hz=80 * MHZ, feeder_db=1.0, fixed_outdoors=_outdoors(rule_id))
    assert wide.binds == "EIRP"
    assert numbers(wide) == pytest.approx((eirp_dbm - 38.0 + 1.0, eirp_dbm), abs=1e-9)
    narrow = checked(rule_id, 38.0, width_hz=5 * MHZ, fixed_outdoors=_outdoors(rule_id))
    assert narrow.binds == "EIRP density"
    assert numbers(narrow)[1] == pytest.approx(density_dbm + 10 * math.log10(5), abs=1e-9)


def _outdoors(rule_id: str) -> bool:
    return find_rule(rule_id).place not in ("indoors", "not fixed outdoors")


@pytest.mark.parametrize("rule_id", ["etsi-301893-5g2", "etsi-301893-5g3-tpc", "etsi-301893-5g3", "cept-7003-60-c1"])
def test_rows_that_are_not_for_fixed_outdoor_links_give_these_no_number(rule_id: str) -> None:
    check = checked(rule_id, 23.0)
    assert (check.highest_setting_dbm, check.allowed_eirp_dbm, check.breach_db) == (None, None, None)
    assert "door" in check.reason


def test_ten_megahertz_of_fixed_broadband_access_have_33_dbm() -> None:
    # ECC/REC/(06)04: 33 dBm EIRP for channels of 10 MHz; the density of 23 dBm/MHz says the same.
    assert numbers(checked("cept-0604-5g8", 23.0, width_hz=10 * MHZ))[1] == pytest.approx(33.0, abs=1e-9)


def test_27_dbm_at_the_port_decide_for_a_small_antenna() -> None:
    # ERC/REC 70-03 Annex 3, c2: at most 27 dBm at the antenna port.
    check = checked("cept-7003-60-c2", 8.0, width_hz=2160 * MHZ)
    assert numbers(check) == pytest.approx((27.0, 35.0), abs=1e-9)
    assert check.binds == "conducted power"


@pytest.mark.parametrize("rule_id", ["cept-7003-60-c3", "ecc-0901-60"])
def test_55_dbm_ask_for_an_antenna_of_30_dbi(rule_id: str) -> None:
    # ERC/REC 70-03 Annex 3, c3, and ECC/REC/(09)01: 55 dBm, at least 30 dBi.
    assert numbers(checked(rule_id, 45.0, width_hz=500 * MHZ))[1] == pytest.approx(55.0, abs=1e-9)
    assert checked(rule_id, 30.0, width_hz=500 * MHZ).highest_setting_dbm is not None
    small = checked(rule_id, 29.9, width_hz=500 * MHZ)
    assert small.highest_setting_dbm is None
    assert "30 dBi" in small.reason


def test_the_fixed_service_at_60_ghz_has_10_dbm_of_power() -> None:
    # ECC/REC/(09)01: transmitter power at most 10 dBm.
    check = checked("ecc-0901-60", 38.0, width_hz=500 * MHZ)
    assert numbers(check) == pytest.approx((10.0, 48.0), abs=1e-9)
    assert check.binds == "conducted power"


def test_rows_that_nobody_read_are_marked_and_give_no_number() -> None:
    assert {row.id for row in load_rules() if row.status == "unconfirmed"} == UNCONFIRMED
    for rule_id in UNCONFIRMED:
        check = checked(rule_id, 23.0, power_dbm=50.0)
        assert (check.highest_setting_dbm, check.allowed_conducted_dbm, check.allowed_eirp_dbm) == (None, None, None)
        assert check.breach_db is None
        assert "unconfirmed" in check.sentence


def test_every_row_has_its_citation_and_date_and_is_tested_here() -> None:
    assert len({row.id for row in load_rules()}) == len(load_rules()) == 27
    for row in load_rules():
        assert row.citation.startswith(("47 CFR 15.", "ETSI EN 30", "ECC/REC", "ERC/REC"))
        assert row.seen
    with open(__file__, encoding="utf-8") as file:
        text = file.read()
    assert [row.id for row in load_rules() if f'"{row.id}"' not in text] == []
