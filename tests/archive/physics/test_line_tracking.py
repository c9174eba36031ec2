"""Lines followed through spectra: right assignments with their weight, and refusal where two would do or none does."""

from __future__ import annotations

import liquid_helium_svp
import numpy as np
import pytest

from archive.physics.fourth_sound import fourth_sound_ratio, fraction_from_frequency
from archive.physics.helium_liquid import superfluid_fraction
from archive.physics.line_tracking import Motion, track_lines

TEMPERATURES = np.array([0.6, 0.75, 0.9, 1.0, 1.1, 1.2, 1.3, 1.4])


def _spectra(
    seed: int = 0, *, clutter: int = 0, drop: tuple[int, ...] = (), fixed: tuple[float, ...] = (739.6, 1962.0)
):
    """Lines of eight spectra: one that follows fourth sound from 2037 Hz, tones, and chance lines; shuffled."""
    rng = np.random.default_rng(seed)
    rows = []
    for k, T in enumerate(TEMPERATURES):
        if k not in drop:
            rows.append((k, 2037.0 * float(fourth_sound_ratio(T, reference_temperature=0.6)), 0.02, 1.0))
        rows += [(k, f, 0.03, 0.3) for f in fixed]
        rows += [(k, f, 0.05, 0.1) for f in rng.uniform(100, 3000, clutter)]
    order = rng.permutation(len(rows))
    spectrum, frequency, u, height = (np.array(column)[order] for column in zip(*rows, strict=True))
    true = np.array([h == 1.0 for h in height])
    return {
        "spectrum": spectrum.astype(int),
        "frequency": frequency,
        "standard_uncertainty": u,
        "height": height,
    }, true


def test_the_line_that_moves_is_followed_through_one_that_stays() -> None:
    """It passes the tone at 1962 Hz between 1.3 and 1.4 K."""
    lines, true = _spectra()
    found = track_lines(TEMPERATURES, **lines)
    assert [each.spectra for each in found.fixed] == [8, 8]
    assert [round(each.frequency, 6) for each in found.fixed] == [739.6, 1962.0]
    (track,) = found.tracks
    assert all(true[list(track.members)])
    assert set(track.states) == {"assigned"}
    assert (track.confidence > 0.95).all()
    assert track.moves > 100
    assert found.loose == 0


def test_order_of_the_spectra_does_not_matter() -> None:
    lines, true = _spectra()
    mixed = np.array([5, 2, 7, 0, 3, 6, 1, 4])
    back = np.argsort(mixed)
    found = track_lines(TEMPERATURES[mixed], **{**lines, "spectrum": back[lines["spectrum"]]})
    (track,) = found.tracks
    assert all(true[list(track.members)])
    assert [int(mixed[each]) for each in found.order] == list(range(8))


def test_confidence_is_honest_in_clutter() -> None:
    """Of all assignments with a weight above 0.9, in forty sets with six chance lines a spectrum, more than 97 of 100 are right."""
    right = wrong = 0
    for seed in range(40):
        lines, true = _spectra(seed, clutter=6)
        for track in track_lines(TEMPERATURES, **lines).tracks:
            begun = next(member for member in track.members if member >= 0)
            if true[begun]:
                members = [member for member in track.members if member >= 0]
                right += int(np.count_nonzero(true[members]))
                wrong += int(np.count_nonzero(~true[members]))
    assert right > 200
    assert wrong <= 0.03 * (right + wrong)


def test_a_gap_is_bridged_and_a_lost_line_ends() -> None:
    lines, true = _spectra(drop=(3,))
    (track,) = track_lines(TEMPERATURES, **lines).tracks
    assert track.states == ("assigned",) * 3 + ("absent",) + ("assigned",) * 4
    assert all(true[[member for member in track.members if member >= 0]])
    lines, _ = _spectra(drop=(5, 6, 7))
    (track,) = track_lines(TEMPERATURES, **lines).tracks
    assert track.states[5:] == ("absent",) * 3


def test_two_equal_candidates_are_ambiguous() -> None:
    """In the fifth spectrum two lines lie equally far from where the line is expected: none is taken, and it goes on after it."""
    frequency = [1000.0, 999.0, 998.0, 997.0, 996.0 - 3, 996.0 + 3, 995.0]
    found = track_lines(
        np.arange(6.0), spectrum=[0, 1, 2, 3, 4, 4, 5], frequency=frequency, standard_uncertainty=[0.01] * 7
    )
    track = found.tracks[0]
    assert track.states == ("assigned",) * 4 + ("ambiguous", "assigned")
    assert np.isnan(track.confidence[4])


def test_heights_part_two_candidates() -> None:
    frequency = [1000.0, 999.0, 998.0, 997.0, 996.0 - 3, 996.0 + 3, 995.0]
    found = track_lines(
        np.arange(6.0), spectrum=[0, 1, 2, 3, 4, 4, 5], frequency=frequency, standard_uncertainty=[0.01] * 7,
        height=[1, 1, 1, 1, 1, 0.02, 1],
    )  # fmt: skip
    assert found.tracks[0].members == (0, 1, 2, 3, 4, 6)


def test_nothing_moves_where_all_lines_stay() -> None:
    found = track_lines(
        np.arange(5.0),
        spectrum=np.repeat(np.arange(5), 2),
        frequency=[500.0, 700.0] * 5,
        standard_uncertainty=[0.1] * 10,
    )
    assert [each.spectra for each in found.fixed] == [5, 5]
    assert not found.tracks


def test_a_line_that_comes_to_rest_has_moved() -> None:
    """As the open frequency sweeps: absent, then moving, then at one frequency in most spectra."""
    frequency = [1022.0, 1048.0, 1106.0, 1134.0, *[1140.0] * 8]
    found = track_lines(
        np.arange(16.0), spectrum=np.arange(4, 16), frequency=frequency, standard_uncertainty=[0.2] * 12,
        motion=Motion(first_step=0.03),
    )  # fmt: skip
    assert not found.fixed
    (track,) = found.tracks
    assert track.members == (-1, -1, -1, -1, *range(12))


@pytest.mark.parametrize(
    ("change", "why"),
    [
        ({"ordinate": [1.0, 2.0]}, "found 2 points"),
        ({"spectrum": [0, 1, 3]}, "found 3, expected 0 to 2"),
        ({"frequency": [1.0, 2.0]}, "found 3 points, expected 2"),
        ({"frequency": [1.0, -2.0, 3.0]}, r"frequency\[1\]"),
    ],
    ids=["two spectra", "no such spectrum", "length", "negative"],
)
def test_refusals_name_the_argument(change, why: str) -> None:
    arguments = {
        "ordinate": [1.0, 2.0, 3.0],
        "spectrum": [0, 1, 2],
        "frequency": [1.0, 2.0, 3.0],
        "standard_uncertainty": [0.1] * 3,
    }
    with pytest.raises(ValueError, match=why):
        track_lines(**(arguments | change))


def test_no_lines_at_all() -> None:
    found = track_lines([1.0, 2.0, 3.0], spectrum=[], frequency=[], standard_uncertainty=[])
    assert (found.fixed, found.tracks, found.loose) == ((), (), 0)


@pytest.mark.parametrize("T", [1.0, 1.2, 1.4, 1.6])
def test_fourth_sound_against_the_table_of_others(T: float) -> None:
    """Tabulated speeds of fourth sound of Donnelly and Barenghi (1998), as liquid-helium-svp carries them."""
    speeds = [float(liquid_helium_svp.sound_velocity_fourth(each)) for each in (T, 0.65)]
    assert float(fourth_sound_ratio(T, reference_temperature=0.65)) == pytest.approx(
        speeds[0] / speeds[1], rel=2e-3
    )


def test_the_fraction_is_the_inverse_of_the_ratio_and_refuses() -> None:
    ratio = fourth_sound_ratio(TEMPERATURES, reference_temperature=0.6)
    found = fraction_from_frequency(
        1500 * ratio, temperature=TEMPERATURES, reference_frequency=1500.0, reference_temperature=0.6
    )
    assert found == pytest.approx(superfluid_fraction(TEMPERATURES), abs=1e-12)
    with pytest.raises(ValueError, match="reference_frequency"):
        fraction_from_frequency(1.0, temperature=1.0, reference_frequency=0.0, reference_temperature=0.6)
    with pytest.raises(ValueError, match="temperature"):
        fourth_sound_ratio(0.01, reference_temperature=0.6)


def test_spectra_at_one_temperature_are_followed_from_the_last_point() -> None:
    """Sweeps up and down at the same temperature, as they are often taken."""
    T = np.array([1.0, 1.0, 1.1, 1.1, 1.2, 1.2])
    frequency = np.array([2000.0, 2000.5, 1988.0, 1988.5, 1970.0, 1970.5])
    found = track_lines(T, spectrum=np.arange(6), frequency=frequency, standard_uncertainty=np.full(6, 0.1))
    assert found.tracks[0].members == tuple(range(6))
