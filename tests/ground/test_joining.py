"""Lines joined into nodes and legs: where they meet, where sites stand, what does not fit."""

from __future__ import annotations

import numpy as np
import pytest

from routeplan.errors import GeometryError
from routeplan.ground.legs import lay_ground
from routeplan.ground.model import Ground
from routeplan.run.model import Line, Place
from tests.drawn_runs import lonlat, make_line, make_place, make_run


def ground(*lines: Line, places: tuple[Place, ...] = (), toml: str = "") -> Ground:
    return lay_ground(make_run(lines, places, toml=toml))


def site(name: str, east_m: float, north_m: float, **more: object) -> Place:
    return make_place("site", lonlat((east_m, north_m)), name, **more)


def ends(laid: Ground) -> list[tuple[str, str]]:
    return [(laid.node(leg.start).name, laid.node(leg.end).name) for leg in laid.legs]


def lengths_m(laid: Ground) -> list[float]:
    return [round(leg.length_mm / 1000, 1) for leg in laid.legs]


def texts(laid: Ground) -> str:
    return "\n".join(f"{where}: {message}" for where, message in laid.warnings)


def problems_of(*lines: Line, places: tuple[Place, ...] = (), toml: str = "") -> list[str]:
    with pytest.raises(GeometryError) as caught:
        ground(*lines, places=places, toml=toml)
    return [str(problem) for problem in caught.value.problems]


def line(*at: tuple[float, float], **more: object) -> Line:
    return make_line(lonlat(*at), **more)


# ------------------------------------------------------------------ ends


@pytest.mark.parametrize(("gap_m", "legs"), [(0.0, 1), (0.5, 1), (0.999, 1), (1.001, 2), (5.0, 2)])
def test_ends_within_the_tolerance_are_one(gap_m: float, legs: int) -> None:
    """Ends a metre apart are joined, ends farther apart are not and are warned of."""
    laid = ground(line((0, 0), (0, 500)), line((0, 500 + gap_m), (0, 900)))
    assert len(laid.legs) == legs
    assert ("not joined" in texts(laid)) == (legs == 2)
    assert len(laid.nodes) == 2 * legs


def test_a_gap_just_short_of_the_middle_of_a_line_is_warned_of() -> None:
    """An end that stops 3 m from another line's middle is told of, with the distance."""
    laid = ground(line((0, 0), (0, 500)), line((3, 200), (400, 200)))
    assert len(laid.legs) == 2
    assert "3.00 m from another line" in texts(laid)
    assert "join_tolerance_m is 1" in texts(laid)


def test_parallel_lines_far_apart_are_no_gap() -> None:
    """Ends farther than 25 m from other lines are no slip."""
    laid = ground(line((0, 0), (0, 500)), line((40, 0), (40, 500)))
    assert "not joined" not in texts(laid)


def test_a_named_end_is_no_gap() -> None:
    """Two sites near each other, each at its own line's end, are meant so."""
    places = (site("P", 0, 500), site("Q", 0, 503))
    laid = ground(line((0, 0), (0, 500)), line((0, 503), (0, 900)), places=places)
    assert "not joined" not in texts(laid)


def test_a_t_junction_cuts_the_line_it_touches() -> None:
    """A line's end on another's middle makes a node of three legs; lengths add up."""
    laid = ground(line((0, 0), (0, 500)), line((0.4, 200), (300, 200)))
    assert len(laid.legs) == 3
    assert sorted(lengths_m(laid)) == pytest.approx([200.0, 299.6, 300.0], abs=0.11)
    (node,) = (node for node in laid.nodes if not node.is_site)
    assert sum(node.id in (leg.start, leg.end) for leg in laid.legs) == 3


def test_lines_that_cross_without_an_end_are_not_joined() -> None:
    """Two lines that cross, one perhaps on a bridge, stay two legs."""
    laid = ground(line((0, -200), (0, 200)), line((-200, 0), (200, 0)))
    assert len(laid.legs) == 2


def test_two_ends_on_both_sides_of_a_line_are_one_node() -> None:
    """Lines that end 0.8 m left and right of another meet it in one node of four legs."""
    laid = ground(
        line((0, 0), (0, 500)), line((-300, 200), (-0.8, 200)), line((0.8, 200), (300, 200))
    )
    assert len(laid.legs) == 4
    assert sum(not node.is_site for node in laid.nodes) == 1


def test_an_end_beside_anothers_end_leaves_no_stub() -> None:
    """An end a little off another line's end, a little along it, joins that end."""
    laid = ground(line((0, 0), (0, 500)), line((0.8, 499.3), (300, 499.3)))
    assert len(laid.legs) == 1
    assert lengths_m(laid)[0] == pytest.approx(799.2, abs=0.2)


def test_a_line_shorter_than_the_tolerance_is_left_out_with_a_warning() -> None:
    """A stub within one node does not break a leg in two."""
    laid = ground(line((0, 0), (0, 500)), line((0, 500), (0, 500.8)), line((0, 500.8), (0, 900)))
    assert len(laid.legs) == 1
    assert "0.80 m of it lie within join_tolerance_m" in texts(laid)


def test_a_very_short_run_is_still_a_leg() -> None:
    """A single line of half a metre has two ends, not one."""
    laid = ground(line((0, 0), (0, 0.5)))
    assert ends(laid) == [("A", "B")]


def test_three_lines_at_one_end() -> None:
    """Three ends that meet make a branch node of three legs, in file order."""
    laid = ground(line((0, 0), (0, 100)), line((0, 100), (100, 100)), line((-100, 100), (0, 100)))
    assert len(laid.legs) == 3
    assert ends(laid) == [("A", "Node 2"), ("Node 2", "B"), ("C", "Node 2")]


# ------------------------------------------------------------------ legs


def test_pieces_drawn_either_way_are_one_leg() -> None:
    """Lines end to end are one leg that runs as its first line in file order was drawn."""
    laid = ground(line((0, 500), (0, 200)), line((0, 900), (0, 500)), line((0, 0), (0, 200)))
    assert lengths_m(laid) == [900.0]
    (leg,) = laid.legs
    assert leg.lonlat[0] == pytest.approx(lonlat((0, 900))[0])
    assert leg.lonlat[-1] == pytest.approx(lonlat((0, 0))[0])


@pytest.mark.parametrize("key", ["leg", "cable"])
def test_another_leg_or_cable_breaks_a_leg(key: str) -> None:
    """Lines that name different legs, or cables, meet at a node."""
    laid = ground(
        line((0, 0), (0, 100), **{key: "One"}),
        line((0, 100), (0, 200), **{key: "One"}),
        line((0, 200), (0, 300), **{key: "Two"}),
    )
    assert lengths_m(laid) == [200.0, 100.0]
    assert ends(laid) == [("A", "Node 2"), ("Node 2", "B")]


def test_a_leg_in_two_parts_is_a_problem() -> None:
    """One leg name on lines that do not meet is refused, with what to do."""
    found = problems_of(line((0, 0), (0, 100), leg="Hill"), line((0, 400), (0, 500), leg="Hill"))
    assert len(found) == 1
    assert 'leg "Hill" is in 2 parts' in found[0]
    assert "Close the gap" in found[0]


def test_a_site_at_a_joint_of_lines_makes_two_legs() -> None:
    """Two lines that meet at a site are two legs."""
    laid = ground(
        line((0, 0), (0, 400)), line((0, 400), (0, 900)), places=(site("Relay", 10, 400),)
    )
    assert ends(laid) == [("A", "Relay"), ("Relay", "B")]
    assert lengths_m(laid) == [400.0, 500.0]


def test_unnamed_lines_at_the_same_ends_have_their_own_names() -> None:
    """Two ways between the same two sites get a number each; nothing is refused."""
    places = (site("P", 0, 0), site("Q", 0, 900))
    laid = ground(
        line((0, 0), (100, 450), (0, 900)), line((0, 0), (-100, 450), (0, 900)), places=places
    )
    assert [leg.name for leg in laid.legs] == ["P - Q (1)", "P - Q (2)"]


# ------------------------------------------------------------------ rings


def test_a_ring_without_a_site() -> None:
    """A closed line is a leg from a node to itself."""
    laid = ground(line((0, 0), (300, 0), (300, 300), (0, 0)))
    assert len(laid.legs) == 1
    assert laid.legs[0].start == laid.legs[0].end
    assert lengths_m(laid)[0] == pytest.approx(600 + 2**0.5 * 300, abs=0.2)


def test_a_ring_with_a_site_begins_there() -> None:
    """A site in the middle of a closed line is where its leg begins and ends."""
    laid = ground(
        line((0, 0), (300, 0), (300, 300), (0, 300), (0, 0)), places=(site("Hub", 300, 305),)
    )
    assert ends(laid) == [("Hub", "Hub")]
    assert lengths_m(laid)[0] == pytest.approx(1200, abs=0.2)


def test_a_ring_of_two_lines_and_two_sites() -> None:
    """Two sites on a ring make two legs between them."""
    places = (site("P", 0, 0), site("Q", 300, 300))
    laid = ground(
        line((0, 0), (300, 0), (300, 300)), line((300, 300), (0, 300), (0, 0)), places=places
    )
    assert ends(laid) == [("P", "Q"), ("Q", "P")]


# ------------------------------------------------------------------ sites


def test_a_site_takes_the_nearest_end_within_its_distance() -> None:
    """A site 40 m off an end names it, also where the line's middle is as near."""
    laid = ground(line((0, 0), (0, 500)), places=(site("Studio", 40, 0), site("Mast", 0, 530)))
    assert ends(laid) == [("Studio", "Mast")]


def test_a_site_in_the_middle_cuts_the_line() -> None:
    """A site beside a line's middle makes two legs that meet at its foot."""
    laid = ground(line((0, 0), (0, 500)), places=(site("Relay", 30, 200),))
    assert ends(laid) == [("A", "Relay"), ("Relay", "B")]
    assert lengths_m(laid) == [200.0, 300.0]
    node = next(node for node in laid.nodes if node.name == "Relay")
    assert (node.lon, node.lat) == pytest.approx(tuple(lonlat((0, 200))[0]), abs=1e-8)


def test_two_sites_near_one_end_keep_their_own_places() -> None:
    """The site nearest an end takes it; another 30 m along the line cuts it there."""
    places = (site("Compound", 1, 30), site("Studio", 1, 0), site("Mast", 0, 500))
    laid = ground(line((0, 0), (0, 500)), places=places)
    assert ends(laid) == [("Studio", "Compound"), ("Compound", "Mast")]
    assert lengths_m(laid) == [30.0, 470.0]


def test_two_sites_at_one_place_are_refused() -> None:
    """Two sites whose nearest place is the same end, or the same foot, are named in one problem."""
    end = problems_of(line((0, 0), (0, 500)), places=(site("P", 0, -3), site("Q", 0, -9)))
    assert len(end) == 1
    assert 'sites "P" and "Q" take the same place' in end[0]
    foot = problems_of(line((0, 0), (0, 500)), places=(site("P", 3, 200), site("Q", 9, 200.3)))
    assert len(foot) == 1
    assert "take the same place" in foot[0]


def test_far_sites_and_far_points_are_all_told_at_once() -> None:
    """Every site and reach point that is too far off has its own problem, with its distance."""
    places = (
        site("Far", 800, 200),
        site("Farther", -200, 700),
        make_place("handhole", lonlat((60, 100)), "HH 1"),
        make_place("pole", lonlat((24, 100)), "Near"),
        make_place("crossing", lonlat((90, 100)), "Brook", crosses="water"),
    )
    found = problems_of(line((0, 0), (0, 500)), places=places)
    assert len(found) == 4
    assert any('site "Far" is far from every line (800.0 m' in text for text in found)
    assert any('handhole "HH 1" is far from every line (60.0 m' in text for text in found)
    assert any("limit reach_distance_max_m = 25" in text for text in found)
    assert not any("Near" in text for text in found)


def test_a_point_taken_for_a_site_is_left_out_with_a_warning() -> None:
    """A point without a kind is a site at an end; beside or far from the line it is left out."""
    assumed = {"kind_assumed": True}
    places = (
        site("Start", 5, -5, properties=assumed),
        site("Beside", 5, 250, properties=assumed),
        site("Far", 5000, 250, properties=assumed),
    )
    laid = ground(line((0, 0), (0, 500)), places=places)
    assert ends(laid) == [("Start", "A")]
    assert '"Beside" has no kind and stands beside the line' in texts(laid)
    assert '"Far" has no kind and is far from every line' in texts(laid)


def test_a_declared_site_comes_before_a_point_taken_for_one() -> None:
    """A declared site 20 m off takes an end before a point without a kind that stands on it."""
    places = (site("Waypoint", 0, 0, properties={"kind_assumed": True}), site("Studio", 0, -20))
    laid = ground(line((0, 0), (0, 500)), places=places)
    assert ends(laid) == [("Studio", "A")]
    assert "Waypoint" in texts(laid)


def test_points_taken_for_sites_with_one_name_are_told_apart() -> None:
    """Two waypoints of one name at both ends are two sites of different names."""
    assumed = {"kind_assumed": True}
    places = (site("WP", 0, 0, properties=assumed), site("WP", 0, 500, properties=assumed))
    assert ends(ground(line((0, 0), (0, 500)), places=places)) == [("WP", "WP (2)")]


def test_unnamed_ends_take_letters_that_are_free() -> None:
    """Unnamed ends become A, B, ...; a letter that a site has is passed over."""
    laid = ground(line((0, 0), (0, 500)), line((0, 200), (300, 200)), places=(site("B", 300, 200),))
    assert sorted(node.name for node in laid.nodes if node.is_site) == ["A", "B", "C"]
    assert sorted(node.name for node in laid.nodes if node.assumed) == ["A", "C"]


# ------------------------------------------------------------------ doubled ways


def test_a_line_over_itself_is_warned_of() -> None:
    """A line drawn there and back is measured twice, and told of."""
    laid = ground(line((0, 0), (0, 300), (0, 500), (0, 300), (200, 300)))
    assert "1 of its 4 steps run over itself" in texts(laid)
    assert lengths_m(laid) == [900.0]


def test_a_line_that_turns_straight_back_is_warned_of() -> None:
    """A spike that shares no step with its line is told of too, a sharp bend is not."""
    laid = ground(line((0, 0), (0, 500), (0, 300), (200, 300)))
    assert "it turns straight back on itself at " in texts(laid)
    assert lengths_m(laid) == [900.0]
    laid = ground(line((0, 0), (0, 500), (0, 300), (0, 800), (90, 800)))
    assert "itself 2 times, first at " in texts(laid)
    assert "straight back" not in texts(ground(line((0, 0), (0, 500), (2, 300))))


def test_a_line_over_another_is_warned_of() -> None:
    """A line that shares two steps with another, either way drawn, names it."""
    laid = ground(
        line((0, 0), (0, 300), (0, 500), name="First"),
        line((90, 500), (0, 500), (0, 300), (0, 0), name="Second"),
    )
    assert '2 of its 3 steps run over made.geojson, feature "First"' in texts(laid)


def test_a_figure_of_eight_is_no_overlap() -> None:
    """A line that crosses itself runs over nothing."""
    laid = ground(line((0, 0), (200, 200), (0, 200), (200, 0)))
    assert texts(laid) == ""


def test_junctions_of_a_reversed_file_are_the_same() -> None:
    """Nodes lie where they lie, whichever way and in whatever order the lines are drawn."""
    lines = [line((0, 0), (0, 400.4)), line((0.3, 400), (0, 900)), line((0, 400), (70, 400))]
    back = [make_line(each.lonlat[::-1]) for each in reversed(lines)]
    one, other = ground(*lines), ground(*back)
    assert sorted((n.lon, n.lat) for n in one.nodes) == sorted((n.lon, n.lat) for n in other.nodes)
    assert sorted(leg.length_mm for leg in one.legs) == sorted(leg.length_mm for leg in other.legs)


def test_many_junctions_add_up() -> None:
    """On a comb of side ways the legs' lengths add up to the lines' lengths."""
    spine = line(*((0.0, 50.0 * k) for k in range(41)))
    teeth = [line((0, 25 + 50 * k), (80, 25 + 50 * k)) for k in range(40)]
    laid = ground(spine, *teeth)
    assert len(laid.legs) == 40 + 41
    assert sum(lengths_m(laid)) == pytest.approx(2000 + 40 * 80, abs=1.5)
    degree = np.bincount([int(end[1:]) for leg in laid.legs for end in (leg.start, leg.end)])
    assert sorted(set(degree[1:].tolist())) == [1, 3]
