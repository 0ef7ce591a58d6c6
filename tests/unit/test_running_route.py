"""The chooser: which route a case takes, why, and what is refused."""

import re

import numpy as np
import pytest

from bemwave import Case
from bemwave.errors import InputError
from bemwave.geometry.forms import box, cylinder, sphere, wigley
from bemwave.geometry.hull import place_hull
from bemwave.geometry.surface_mesh import joined
from bemwave.geometry.topology import weld
from bemwave.running.route import FEW_TRIANGLES, MOST_TRIANGLES, choose
from bemwave.running.survey import survey

MANY = FEW_TRIANGLES + 1


def case(route="auto", spacing=1.0, **surface):
    tables = {"size": [400.0, 300.0], "spacing": spacing, "route": route, **surface}
    return Case(water={"depth": 40.0}, surface=tables, run={"duration": 10.0})


def shifted(mesh, x, y, z=0.0):
    return mesh.with_points(mesh.points + np.array([x, y, z]))


def ship(beam=6.0):
    return place_hull("ship", wigley(40.0, beam, 2.5, 0.8))


def barges(gap):
    return [
        place_hull(name, box(12.0, 6.0, 2.0, 1.0), position=(0.0, y))
        for name, y in (("near", 0.0), ("far", 6.0 + gap))
    ]


NARROW = {
    "the waterplane of ship is 2 m across at (0": [ship(2.0)],
    "the waterplane of post is 1.9": [place_hull("post", cylinder(1.0, 3.0, 0.3))],
    "the waterplane of plate is 0.1 m across": [place_hull("plate", box(10.0, 0.1, 2.0, 0.5))],
    "the water between near and far is 3.5 m at": barges(3.5),
    "the water between parts of columns is 2.9": [
        place_hull(
            "columns", joined([shifted(cylinder(2.0, 6.0, 0.5), x, 0.0) for x in (-3.5, 3.5)])
        )
    ],
    "the water over ball is 1.46 m deep at (7, 0, -1.46)": [
        place_hull("ball", sphere(3.0, 4.5, 0.8), position=(7.0, 0.0))
    ],
}
WANTED = {"waterplane": "3 spacings or more (3 m)", "between": "4 spa", "over": "2 spacings"}
WIDE = {"ship": [ship()], "barges": barges(4.1), "none": []}


def thin_fin():
    """A barge, and under it a plate of .2 m from 1 to 2 m depth."""
    keel = shifted(box(10.0, 0.2, 0.5, 0.5), 0.0, 0.0, -1.5)
    lid = keel.points * [1.0, 1.0, -1.0]
    whole = weld(joined([keel, keel.with_points(lid - [0.0, 0.0, 3.0]).flipped()]), 1e-9)[0]
    return [place_hull("barge", joined([box(14.0, 8.0, 0.5, 0.5), whole]))]


@pytest.mark.parametrize("route", ["panels", "grid"])
@pytest.mark.parametrize("hulls", WIDE.values(), ids=WIDE)
@pytest.mark.parametrize("triangles", [10, 10 * MOST_TRIANGLES])
def test_a_route_named_is_taken(route, hulls, triangles):
    assert choose(case(route), hulls, triangles) == (route, "named in the case")


@pytest.mark.parametrize("hulls", WIDE.values(), ids=WIDE)
def test_large_open_water_goes_to_the_grid(hulls):
    route, reason = choose(case(), hulls, MANY)
    assert route == "grid"
    assert reason == f"open water that would take about {MANY} triangles"


def test_small_water_stays_on_panels():
    route, reason = choose(case(), [ship()], 3200)
    assert route == "panels"
    assert reason == "about 3200 triangles; up to 5000 are quick"


def test_what_is_just_as_wide_as_it_must_be_fits():
    post = place_hull("post", cylinder(1.5, 3.0, 0.5))
    assert choose(case("grid"), [post], 10)[0] == "grid"
    assert choose(case("grid"), barges(4.0), 10)[0] == "grid"


def test_round_water_fits_the_grid():
    assert choose(case(outline="circle", size=400.0), [ship()], MANY)[0] == "grid"


@pytest.mark.parametrize(("found", "hulls"), NARROW.items(), ids=NARROW)
def test_what_the_grid_does_not_show_goes_to_panels(found, hulls):
    route, reason = choose(case(), hulls, MANY)
    wanted = next(text for word, text in WANTED.items() if word in found)
    assert route == "panels"
    assert reason.startswith(found)
    assert f"; the grid wants {wanted}" in reason
    assert "\n" not in reason


@pytest.mark.parametrize(("found", "hulls"), NARROW.items(), ids=NARROW)
def test_what_the_grid_does_not_show_is_refused_where_it_is_named(found, hulls):
    with pytest.raises(InputError, match=r'^\[surface\] route = "grid" was given, and') as refused:
        choose(case("grid"), hulls, 10)
    text = str(refused.value)
    assert found in text
    remedy = re.search(r"give \[surface\] spacing (\S+) m or less", text)
    assert text.endswith(', or write route = "panels"')
    # and the remedy helps
    assert choose(case("grid", 0.99 * float(remedy[1])), hulls, 10)[0] == "grid"


def test_a_thin_part_can_be_left_out():
    with pytest.raises(
        InputError, match=r"a part of barge is 0\.2 m thick at .*by `without`, give"
    ):
        choose(case("grid"), thin_fin(), 10)
    assert choose(case("grid"), thin_fin()[:0], 10)[0] == "grid"


def test_a_thin_part_that_lies_deep_is_no_matter():
    assert choose(case("grid", spacing=0.5), thin_fin(), 10)[0] == "grid"


@pytest.mark.parametrize(
    ("surface", "found", "remedy"),
    [
        ({"edges": {"x_min": "wall"}}, "there are walls at x_min", "absorb"),
        ({"edges": "wall", "outline": "circle", "size": 50.0}, "walls all round", "absorb"),
        ({"mesh": "water.vtu"}, "mesh = 'water.vtu' is given", "take it out"),
    ],
)
def test_walls_and_ready_meshes_are_for_panels(surface, found, remedy):
    route, reason = choose(case(**surface), [ship()], MANY)
    assert route == "panels"
    assert found in reason
    with pytest.raises(InputError, match=remedy):
        choose(case("grid", **surface), [ship()], MANY)


def test_what_fits_neither_is_refused_with_both_reasons():
    with pytest.raises(InputError) as refused:
        choose(case(), barges(2.0), MOST_TRIANGLES + 1)
    text = str(refused.value)
    assert text.startswith("no route takes this case: the water between near and far is 2 m")
    assert "about 20001 triangles, where 20000 fit" in text
    assert "spacing 0.5 m or less" in text


def test_single_precision_is_the_grid_s():
    small = {"water": {"depth": 40.0}, "surface": {"size": [20.0, 20.0], "spacing": 2.0}}
    asked = Case(**small, run={"duration": 10.0, "precision": "single"})
    told = r'precision = "single" was given, and the route is panels \(about \d+ triangles; .*\); '
    with pytest.raises(InputError, match=told + 'expected "double" there: write that, or'):
        survey(asked)
