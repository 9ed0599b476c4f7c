"""`visit` by the shortest way against published optima of the travelling salesman problem.

Instances and optima: Reinelt, "TSPLIB - a traveling salesman problem library", ORSA Journal on Computing 3 (1991):
burma14, optimum 3323; gr17, optimum 2085. Those are closed tours, our paths are open. So the first city is split: the
path begins at one half of it, and the other half is one more place, from which nothing leads on. The shortest path
through all places then ends there, and is the shortest tour.
"""

from __future__ import annotations

import math

from runner.machine.ordering import Matrix, path_length, shortest_order

NO_WAY_ON = 1e9

# Latitude and longitude in degrees and minutes, DDD.MM.
BURMA14 = (
    (16.47, 96.10), (16.47, 94.44), (20.09, 92.54), (22.39, 93.37), (25.23, 97.24), (22.00, 96.05), (20.47, 97.02),
    (17.20, 96.29), (16.30, 97.38), (14.05, 98.12), (16.53, 97.38), (21.52, 95.59), (19.41, 97.13), (20.09, 94.55),
)  # fmt: skip

# The lower triangle without its diagonal, row by row.
GR17 = (
    (633,),
    (257, 390),
    (91, 661, 228),
    (412, 227, 169, 383),
    (150, 488, 112, 120, 267),
    (80, 572, 196, 77, 351, 63),
    (134, 530, 154, 105, 309, 34, 29),
    (259, 555, 372, 175, 338, 264, 232, 249),
    (505, 289, 262, 476, 196, 360, 444, 402, 495),
    (353, 282, 110, 324, 61, 208, 292, 250, 352, 154),
    (324, 638, 437, 240, 421, 329, 297, 314, 95, 578, 435),
    (70, 567, 191, 27, 346, 83, 47, 68, 189, 439, 287, 254),
    (211, 466, 74, 182, 243, 105, 150, 108, 326, 336, 184, 391, 145),
    (268, 420, 53, 239, 199, 123, 207, 165, 383, 240, 140, 448, 202, 57),
    (246, 745, 472, 237, 528, 364, 332, 349, 202, 685, 542, 157, 289, 426, 483),
    (121, 518, 142, 84, 297, 35, 29, 36, 236, 390, 238, 301, 55, 96, 153, 336),
)


def geographical(cities: tuple[tuple[float, float], ...]) -> Matrix:
    """Whole kilometers on a sphere, as the library defines them: pi is 3.141592 and the radius 6378.388 km."""

    def radians(value: float) -> float:
        degrees = int(value)
        return 3.141592 * (degrees + 5.0 * (value - degrees) / 3.0) / 180.0

    def length(one: tuple[float, float], other: tuple[float, float]) -> float:
        (lat_1, lon_1), (lat_2, lon_2) = (tuple(map(radians, city)) for city in (one, other))
        q1, q2, q3 = math.cos(lon_1 - lon_2), math.cos(lat_1 - lat_2), math.cos(lat_1 + lat_2)
        return float(int(6378.388 * math.acos(0.5 * ((1.0 + q1) * q2 - (1.0 - q1) * q3)) + 1.0))

    return tuple(tuple(0.0 if one is other else length(one, other) for other in cities) for one in cities)


def from_triangle(rows: tuple[tuple[int, ...], ...]) -> Matrix:
    count = len(rows) + 1
    return tuple(
        tuple(0.0 if one == other else float(rows[max(one, other) - 1][min(one, other)]) for other in range(count))
        for one in range(count)
    )


def split_first(lengths: Matrix) -> Matrix:
    """One more place, at the end: the other half of the first."""
    return (*((*row, row[0]) for row in lengths), (*(NO_WAY_ON for _ in lengths), 0.0))


def tour(lengths: Matrix) -> tuple[float, list[int]]:
    split = split_first(lengths)
    order = shortest_order(split, exact_most=len(lengths))
    return path_length(split, order), order


def test_the_shortest_tour_of_burma14_is_the_published_one() -> None:
    length, order = tour(geographical(BURMA14))
    assert length == 3323.0
    assert sorted(order) == list(range(1, 15))
    assert order[-1] == 14


def test_the_shortest_tour_of_gr17_is_the_published_one() -> None:
    length, order = tour(from_triangle(GR17))
    assert length == 2085.0
    assert order[-1] == 17


def test_the_heuristic_for_many_places_comes_near_the_published_tours() -> None:
    """Open paths, against the exact ones: what `trundle check` calls short, but perhaps not the shortest."""
    for lengths in (geographical(BURMA14), from_triangle(GR17)):
        exact = path_length(lengths, shortest_order(lengths, exact_most=17))
        found = path_length(lengths, shortest_order(lengths, exact_most=0))
        assert exact <= found <= 1.25 * exact
