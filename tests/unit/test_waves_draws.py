"""Draws by index: known answers, pinned numbers, independence of the range asked for."""

import numpy as np
import pytest

from bemwave.errors import InputError
from bemwave.waves import make_sea
from bemwave.waves.draws import fractions_by_index


def test_generator_gives_its_authors_known_answer():
    # philox4x64-10, counter 0, key 0: known-answer list of Salmon et al. (2011), from memory.
    # numpy raises the counter before it draws.
    raw = np.random.Philox(key=0, counter=2**256 - 1).random_raw(4)
    assert [int(number) for number in raw] == [
        0x16554D9ECA36314C,
        0xDB20FE9D672D0FDC,
        0xD7E772CEE186176B,
        0x7E68B68AEC7BA23B,
    ]


def philox(counter, key):
    """Philox4x64-10 after the paper, in Python's integers: the test's own reference."""
    mask = 2**64 - 1
    c = [counter >> 64 * i & mask for i in range(4)]
    k = [key & mask, key >> 64]
    for _ in range(10):
        first, second = 0xD2E7470EE14C6C93 * c[0], 0xCA5A826395121157 * c[2]
        c = [second >> 64 ^ c[1] ^ k[0], second & mask, first >> 64 ^ c[3] ^ k[1], first & mask]
        k = [(k[0] + 0x9E3779B97F4A7C15) & mask, (k[1] + 0xBB67AE8584CAA73B) & mask]
    return c


@pytest.mark.parametrize(("seed", "stream"), [(1, 0), (1, 3), (2**64 - 1, 1)])
@pytest.mark.parametrize("index", [-143, -1, 0, 999, 2**40])
def test_draws_are_the_generator_at_seed_and_index(seed, stream, index):
    found = fractions_by_index(seed, index, 1, stream)[0]
    expected = [(raw >> 11) / 2**53 for raw in philox(2**128 + index, seed + (stream << 64))]
    assert found.tolist() == expected


def test_draws_depend_on_their_index_alone():
    wide = fractions_by_index(5, -10, 40)
    assert np.array_equal(wide[10:30], fractions_by_index(5, 0, 20))
    assert not np.isin(fractions_by_index(6, -10, 40), wide).any()
    assert not np.isin(fractions_by_index(5, -10, 40, stream=1), wide).any()


def test_draws_are_even():
    draws = fractions_by_index(3, 0, 20000)
    assert draws.mean(axis=0) == pytest.approx(0.5, abs=0.01)
    assert draws.var(axis=0) == pytest.approx(1 / 12, abs=0.002)
    correlation = np.corrcoef(draws.T) - np.eye(4)
    assert np.abs(correlation).max() < 0.03


def test_seeds_outside_the_range_are_refused():
    for seed in (-1, 2**64):
        with pytest.raises(InputError, match=rf"seed was given as {seed}; expected a whole number"):
            fractions_by_index(seed, 0, 1)


# first and last component of a sea of seed 1, as first made
PINNED = {
    "frequency": [0.39276099925383673, 3.139758333090036],
    "heading": [0.1632203670138738, -0.6792398545781971],
    "phase": [3.2216538314390895, 4.152053583288228],
    "amplitude": [2.2305214702774125e-05, 0.0023677417248947003],
}


def test_a_seed_names_the_same_sea_for_good():
    """A change here would break the seas of every user's cases."""
    sea = make_sea("jonswap", depth=40.0, height=2.0, period=8.0, spreading=10.0, seed=1)
    ends = [0, -1]
    assert sea.frequency[ends] == pytest.approx(PINNED["frequency"], rel=1e-14)
    assert sea.heading[ends] == pytest.approx(PINNED["heading"], rel=1e-12)
    assert sea.phase[ends] == pytest.approx(PINNED["phase"], rel=1e-14)
    assert sea.amplitude[ends] == pytest.approx(PINNED["amplitude"], rel=1e-9)
