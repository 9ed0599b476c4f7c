"""People who walk: the social force model (Helbing and Molnar, Physical Review E 51, 1995, 4282).

Each is pulled toward a point at a preferred speed and pushed away by others, by walls and by the robot. What lies
outside the field of view pushes half as much. Nobody ends a step inside a wall or inside the robot.
Rows of `people` are (x, y, radius), of `velocity` (vx, vy), of `target` (x, y); `wished` is the preferred speed.
"""

from __future__ import annotations

import math
from typing import Any

import numpy as np
from numpy.typing import NDArray

from backends.sim.kernels import grid, motion, overlap
from backends.sim.kernels.grid import value_at
from backends.sim.kernels.overlap import gap, nearest
from runner.site.compiled import kernel_compiler

kernel = kernel_compiler(__file__, grid.__file__, motion.__file__, overlap.__file__)

CELL = 0.05
RELAX_S = 0.5  # tau
PUSH, PUSH_REACH_M = 2.1, 0.3  # V0, m^2/s^2, and sigma
WALL, WALL_REACH_M = 10.0, 0.2  # U0, m^2/s^2, and R
FORESIGHT_S = (
    1.2  # the time step of the other's stride, by which its ellipse is stretched (MODEL.md: not the paper's 2 s)
)
HALF_VIEW = math.cos(math.radians(100.0))  # effective angle of sight 2 phi = 200 degrees
BEHIND = 0.5  # c
FASTER = 1.3  # highest speed over the preferred one
ASIDE_COSINE, ASIDE_SINE = math.cos(math.radians(80.0)), math.sin(math.radians(80.0))  # a step aside
IGNORED_M = 4.0  # beyond this a push is under 1e-4 m/s^2
CATCH_UP, SLOWEST_SHARE, FASTEST_SHARE = 0.4, 0.6, 1.3  # of a group: per meter behind its leader, and its bounds
LAGGING_M, WAITING_SHARE = 1.5, 0.7  # a leader slows down when somebody is so far behind
APART_M = 6.0  # farther from the leader than this one walks alone


@kernel
def pushed(off_x: float, off_y: float, other_vx: float, other_vy: float) -> tuple[float, float]:
    """Acceleration by somebody at minus (off_x, off_y) who walks at the given velocity: minus the gradient of
    V0 exp(-b / sigma), b the semi-minor axis of the ellipse around both ends of the other's next stride."""
    stride_x, stride_y = other_vx * FORESIGHT_S, other_vy * FORESIGHT_S
    near = max(math.sqrt(off_x * off_x + off_y * off_y), 1e-6)
    far_x, far_y = off_x - stride_x, off_y - stride_y
    far = max(math.sqrt(far_x * far_x + far_y * far_y), 1e-6)
    square = (near + far) * (near + far) - (stride_x * stride_x + stride_y * stride_y)
    axis = 0.5 * math.sqrt(max(square, 1e-6))
    strength = PUSH / PUSH_REACH_M * math.exp(-axis / PUSH_REACH_M) * (near + far) / (4.0 * axis)
    return strength * (off_x / near + far_x / far), strength * (off_y / near + far_y / far)


@kernel
def seen(force_x: float, force_y: float, way_x: float, way_y: float) -> float:
    """Weight of a push: whole where it comes from within the field of view around the way wanted, else `BEHIND`."""
    size = math.sqrt(force_x * force_x + force_y * force_y)
    return 1.0 if -(force_x * way_x + force_y * way_y) >= size * HALF_VIEW else BEHIND


@kernel
def uphill(distance: NDArray[Any], x: float, y: float) -> tuple[float, float]:
    """Gradient of the distance field by central differences, of length 1 at most: the direction away from the nearest
    wall; shorter where walls on two sides are as near, as in a doorway, for there they push against each other."""
    slope_x = (value_at(distance, x + CELL, y) - value_at(distance, x - CELL, y)) / (2.0 * CELL)
    slope_y = (value_at(distance, x, y + CELL) - value_at(distance, x, y - CELL)) / (2.0 * CELL)
    size = max(math.sqrt(slope_x * slope_x + slope_y * slope_y), 1.0)
    return slope_x / size, slope_y / size


@kernel
def force_on(
    one: int,
    people: NDArray[Any],
    velocity: NDArray[Any],
    target: NDArray[Any],
    wished: NDArray[Any],
    distance: NDArray[Any],
    outline: NDArray[Any],
    robot: NDArray[Any],
) -> tuple[float, float]:
    """Acceleration of one person. `robot` is (x, y, heading); its outline pushes as a wall does."""
    x, y = people[one, 0], people[one, 1]
    to_x, to_y = target[one, 0] - x, target[one, 1] - y
    away = math.sqrt(to_x * to_x + to_y * to_y)
    way_x, way_y = (to_x / away, to_y / away) if away > 1e-6 else (0.0, 0.0)
    speed = min(wished[one], away / RELAX_S)
    total_x = (speed * way_x - velocity[one, 0]) / RELAX_S
    total_y = (speed * way_y - velocity[one, 1]) / RELAX_S
    for other in range(people.shape[0]):
        off_x, off_y = x - people[other, 0], y - people[other, 1]
        if other == one or abs(off_x) > IGNORED_M or abs(off_y) > IGNORED_M:
            continue
        force_x, force_y = pushed(off_x, off_y, velocity[other, 0], velocity[other, 1])
        weight = seen(force_x, force_y, way_x, way_y)
        total_x += weight * force_x
        total_y += weight * force_y
    if abs(x - robot[0]) < IGNORED_M and abs(y - robot[1]) < IGNORED_M:
        apart, off_x, off_y = nearest(outline, robot[0], robot[1], robot[2], x, y)
        if apart > 0.0:
            strength = WALL / WALL_REACH_M * math.exp(-apart / WALL_REACH_M) / apart
            total_x += strength * off_x
            total_y += strength * off_y
    wall = value_at(distance, x, y)
    if wall < 2.0:
        up_x, up_y = uphill(distance, x, y)
        strength = WALL / WALL_REACH_M * math.exp(-wall / WALL_REACH_M)
        total_x += strength * up_x
        total_y += strength * up_y
    return total_x, total_y


@kernel
def step(
    people: NDArray[Any],
    velocity: NDArray[Any],
    target: NDArray[Any],
    wished: NDArray[Any],
    distance: NDArray[Any],
    outline: NDArray[Any],
    reach: float,
    robot: NDArray[Any],
    time: float,
) -> None:
    """Move everybody by one time step, in place. A person whose wished speed is 0 stands."""
    count = people.shape[0]
    force = np.zeros((count, 2))
    for one in range(count):
        if wished[one] > 0.0:
            force[one, 0], force[one, 1] = force_on(one, people, velocity, target, wished, distance, outline, robot)
    for one in range(count):
        if wished[one] == 0.0:
            velocity[one, 0] = velocity[one, 1] = 0.0
            continue
        vx, vy = velocity[one, 0] + force[one, 0] * time, velocity[one, 1] + force[one, 1] * time
        speed = math.sqrt(vx * vx + vy * vy)
        most = FASTER * wished[one]
        if speed > most:
            vx, vy = vx * most / speed, vy * most / speed
        move(one, people, velocity, vx, vy, distance, outline, reach, robot, time)


@kernel
def move(
    one: int,
    people: NDArray[Any],
    velocity: NDArray[Any],
    vx: float,
    vy: float,
    distance: NDArray[Any],
    outline: NDArray[Any],
    reach: float,
    robot: NDArray[Any],
    time: float,
) -> None:
    """Take the step where it is free, else slide along what is in the way, else step aside, right first, else stand."""
    x, y, radius = people[one, 0], people[one, 1], people[one, 2]
    for attempt in range(5):
        if attempt == 0:
            step_x, step_y = vx, vy
        elif attempt == 1:
            step_x, step_y = vx, 0.0
        elif attempt == 2:
            step_x, step_y = 0.0, vy
        elif attempt == 3:
            step_x, step_y = vx * ASIDE_COSINE + vy * ASIDE_SINE, vy * ASIDE_COSINE - vx * ASIDE_SINE
        else:
            step_x, step_y = vx * ASIDE_COSINE - vy * ASIDE_SINE, vy * ASIDE_COSINE + vx * ASIDE_SINE
        new_x, new_y = x + step_x * time, y + step_y * time
        if fits(distance, outline, reach, robot, x, y, new_x, new_y, radius):
            people[one, 0], people[one, 1] = new_x, new_y
            velocity[one, 0], velocity[one, 1] = step_x, step_y
            return
    velocity[one, 0] = velocity[one, 1] = 0.0


@kernel
def fits(
    distance: NDArray[Any],
    outline: NDArray[Any],
    reach: float,
    robot: NDArray[Any],
    x: float,
    y: float,
    new_x: float,
    new_y: float,
    radius: float,
) -> bool:
    """Whether a step ends clear of walls and of the robot, or at least not deeper in either than it began."""
    wall = value_at(distance, new_x, new_y)
    if wall < radius and wall < value_at(distance, x, y):
        return False
    if abs(new_x - robot[0]) > reach + radius or abs(new_y - robot[1]) > reach + radius:
        return True
    after = gap(outline, robot[0], robot[1], robot[2], new_x, new_y)
    return after >= radius or after > gap(outline, robot[0], robot[1], robot[2], x, y)


@kernel
def keep_together(
    people: NDArray[Any], target: NDArray[Any], wished: NDArray[Any], speeds: NDArray[Any], leader: NDArray[Any]
) -> None:
    """Let those who walk with somebody hurry or dawdle until they are abreast. `leader` is oneself for who is alone."""
    for one in range(people.shape[0]):
        if wished[one] > 0.0:
            wished[one] = speeds[one]
    for one in range(people.shape[0]):
        lead = leader[one]
        if lead == one or wished[one] == 0.0 or wished[lead] == 0.0:
            continue
        to_x, to_y = target[one, 0] - people[one, 0], target[one, 1] - people[one, 1]
        off_x, off_y = people[lead, 0] - people[one, 0], people[lead, 1] - people[one, 1]
        length = math.sqrt(to_x * to_x + to_y * to_y)
        if length < 1e-6 or off_x * off_x + off_y * off_y > APART_M * APART_M:
            continue
        behind = (off_x * to_x + off_y * to_y) / length
        share = min(max(1.0 + CATCH_UP * behind, SLOWEST_SHARE), FASTEST_SHARE)
        wished[one] = share * speeds[one]
        if behind > LAGGING_M:
            wished[lead] = WAITING_SHARE * speeds[lead]
