"""Woodland against values worked by hand from the formula and table 1 of Rec. ITU-R P.833-10 (as two programs hold them)."""

import pytest

from fellspan.propagation import MEASURED_WOODLAND, woodland_loss_db, woodland_saturation_db, woodland_specific_db_per_m


@pytest.mark.parametrize(
    ("row", "losses_db"),
    [(2, (1.647, 7.272, 19.154)), (4, (3.236, 13.387, 29.458))],
)
def test_loss_through_10_50_and_200_m(row: int, losses_db: tuple[float, float, float]) -> None:
    wood = MEASURED_WOODLAND[row]
    found = woodland_loss_db(
        [10.0, 50.0, 200.0], specific_db_per_m=wood.specific_db_per_m, saturation_db=wood.saturation_db
    )
    assert found == pytest.approx(losses_db, abs=6e-4)  # by hand


def test_table() -> None:
    assert [wood.frequency_hz for wood in MEASURED_WOODLAND] == [105.9e6, 466.475e6, 949e6, 1852.2e6, 2117.5e6]
    assert [wood.specific_db_per_m for wood in MEASURED_WOODLAND] == [0.04, 0.12, 0.17, 0.30, 0.34]
    assert [wood.saturation_db for wood in MEASURED_WOODLAND] == [9.4, 18.0, 26.5, 29.0, 34.1]


@pytest.mark.parametrize(
    ("ghz", "db_per_m"), [(0.03, 0.02), (1, 0.2), (2.4, 0.48), (5.8, 1.16), (10, 2.0), (28, 5.6), (30, 6)]
)
def test_line_of_the_figure(ghz: float, db_per_m: float) -> None:
    assert woodland_specific_db_per_m(ghz * 1e9) == pytest.approx(db_per_m, rel=2e-3)  # read from the figure by others


@pytest.mark.parametrize(("ghz", "db_per_m"), [(2.4, 0.429), (5.8, 1.131), (10, 2.06)])
def test_another_fit_of_the_figure_lies_within_the_spread(ghz: float, db_per_m: float) -> None:
    # 0.1636 f^1.1, f in GHz: another program's fit.
    assert woodland_specific_db_per_m(ghz * 1e9) == pytest.approx(db_per_m, rel=0.2)


def test_saturation_fits_its_table() -> None:
    for wood in MEASURED_WOODLAND:
        # The fit against what it was fitted to: 15 % is the scatter of the table itself.
        assert woodland_saturation_db(wood.frequency_hz) == pytest.approx(wood.saturation_db, rel=0.15)
