"""What a building floor and a robot are: plain values, in meters, seconds and radians.

This is the lowest room: every other room, and every backend, may import it; it imports none of them.
The frame of a site: x to the right, y up, origin at the lower left corner of the floor; headings are
counterclockwise from +x. Nothing here reads a file (that is `runner.language`) or allocates a raster
(`runner.site.floor`).
"""

from __future__ import annotations

from dataclasses import dataclass, field
from enum import StrEnum

Point = tuple[float, float]
"""x, y in the site frame, meters."""

CELL_M = 0.05
"""Side of a raster cell. 5 cm resolves a door frame and keeps a 45 x 25 m floor under half a million cells."""

DAY_S = 86_400.0


@dataclass(frozen=True, slots=True)
class Pose:
    """Where something stands on the floor: meters, and radians counterclockwise from +x."""

    x: float
    y: float
    heading: float


@dataclass(frozen=True, slots=True)
class Wall:
    """A wall: a polyline with a thickness, solid along its whole length."""

    points: tuple[Point, ...]
    thickness: float


@dataclass(frozen=True, slots=True)
class Solid:
    """A filled polygon nobody drives through: a pillar, a counter, fixed furniture."""

    corners: tuple[Point, ...]


@dataclass(frozen=True, slots=True)
class Door:
    """A gap in a wall that can be shut: the segment the leaf covers when it is.

    `shut` lists the daily spans, in seconds since midnight, during which the door is known to be shut.
    A span may run over midnight (start after end).
    """

    name: str
    start: Point
    end: Point
    thickness: float
    shut: tuple[tuple[float, float], ...] = ()


@dataclass(frozen=True, slots=True)
class Place:
    """A named pose a mission may send the robot to."""

    name: str
    pose: Pose


@dataclass(frozen=True, slots=True)
class Site:
    """One building floor of `width` x `height` meters.

    `time_zone` is a name of the IANA time zone database; None for the zone of the computer that runs the mission.
    """

    name: str
    width: float
    height: float
    walls: tuple[Wall, ...]
    solids: tuple[Solid, ...]
    doors: tuple[Door, ...]
    places: tuple[Place, ...]
    time_zone: str | None = None

    def place(self, name: str) -> Place | None:
        """The place of that name, or None."""
        return next((place for place in self.places if place.name == name), None)


@dataclass(frozen=True, slots=True)
class Lidar:
    """A planar range scanner. Angles in radians in the robot frame, ranges in meters."""

    field_of_view: float
    beams: int
    range_max: float
    rate: float
    """Scans per second."""
    noise: float
    """Standard deviation of one range, meters."""
    forward: float = 0.0
    """How far ahead of the robot's turning center it is mounted, meters."""
    dropouts: float = 0.0
    """Share of the beams that do not come back although they should."""
    latency: float = 0.0
    """Seconds from a scan to its use."""
    beam_width: float = 0.0
    """Angle that a beam's light fills; a beam with no width sees no mixture of two surfaces."""
    height: float = 0.0
    """Of the scanning plane above the floor, meters; 0 where the floor is never met."""


@dataclass(frozen=True, slots=True)
class Sweep:
    """A slow sensor that looks at one column after the other, each from the floor up to the height of the lidar.

    It sees low things too. Once in `period` seconds it has looked at all of `field_of_view` radians ahead.
    """

    field_of_view: float
    columns: int
    range_max: float
    period: float = 2.0
    noise: float = 0.0
    """Standard deviation of one range, meters."""
    forward: float = 0.0
    """How far ahead of the robot's turning center it is mounted, meters."""


@dataclass(frozen=True, slots=True)
class Post:
    """An upright part of the robot itself that stands in the lidar's view: where, in the robot frame, and how thick."""

    at: Point
    thickness: float


@dataclass(frozen=True, slots=True)
class Filters:
    """Which false returns of the lidar the robot takes out before it believes them."""

    shadow_points: bool = True
    own_body: bool = True
    floor_returns: bool = True


class UnseenSpace(StrEnum):
    """What the robot does about space that it has not seen since it cleared its memory there."""

    KEEP_OUT = "keep out"
    DRIVE_SLOWLY = "drive slowly"


@dataclass(frozen=True, slots=True)
class Battery:
    """Energy store: capacity in watt-hours, draws and charging in watts."""

    capacity: float
    idle: float
    driving: float
    charging: float


@dataclass(frozen=True, slots=True)
class RobotDescription:
    """What the robot is: its outline and what its drive, eyes and battery can do.

    `footprint` is a polygon in the robot frame (x ahead, y to the left, origin at the turning center).
    Speeds in m/s and rad/s, accelerations in m/s^2 and rad/s^2.
    """

    name: str
    footprint: tuple[Point, ...]
    speed: float
    reverse_speed: float
    acceleration: float
    turn_speed: float
    turn_acceleration: float
    lidar: Lidar
    battery: Battery
    posts: tuple[Post, ...] = ()
    sweep: Sweep | None = None
    filters: Filters = Filters()
    unseen_space: UnseenSpace = UnseenSpace.KEEP_OUT


@dataclass(frozen=True, slots=True)
class Carton:
    """Something left on the floor that the map does not know: an upright box, `size` by `size` meters or a rectangle.

    It stands from `from_s` until `until_s` (None: for good), seconds since the run began. With
    `when_near` it is put down, instead, at the first moment after `from_s` at which the robot's center
    comes within that many meters of it, and stays for `stays_s`.
    """

    at: Point
    size: Point
    from_s: float = 0.0
    until_s: float | None = None
    when_near: float | None = None
    stays_s: float | None = None


@dataclass(frozen=True, slots=True)
class DoorChange:
    """At `at_s` seconds since the run began, the door is opened or shut, whatever its hours say."""

    door: str
    at_s: float
    open: bool


@dataclass(frozen=True, slots=True)
class Walkers:
    """People who walk between places, `count` of them at once, at a preferred speed drawn from a normal distribution.

    The default speed is Helbing and Molnar (1995): mean 1.34 m/s, standard deviation 0.26 m/s.
    `between` names the places they come from and go to; empty means any.
    """

    count: int
    speed_mean: float = 1.34
    speed_deviation: float = 0.26
    between: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class Conditions:
    """What the simulated world does to the robot during a run."""

    name: str = "quiet"
    begins_at: float = 18.0 * 3600.0
    """Time of day at which a simulated run begins, seconds since midnight."""
    cartons: tuple[Carton, ...] = ()
    doors: tuple[DoorChange, ...] = ()
    walkers: tuple[Walkers, ...] = field(default=())
    uneven_floor: float = 0.0
    """Standard deviation of the floor's height from one spot to the next, meters."""
