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
    """Energy store: capacity in watt-hours, draws and charging in watts.

    It takes the whole charging power up to the fraction `tapers_from`, then less and less.
    """

    capacity: float
    idle: float
    driving: float
    charging: float
    tapers_from: float = 0.8


@dataclass(frozen=True, slots=True)
class Odometry:
    """How far off the wheels' account of a motion is: the six parameters of the velocity motion model.

    Thrun, Burgard and Fox, Probabilistic Robotics, 2005, table 5.3, each as its square root. Standard deviations within
    one step of 0.1 s, of the way made (meters), of the turn (radians) and of a last turn on the spot after both; each
    grows with the way and with the turn of the step.
    """

    way_by_way: float = 0.05
    """Meters a meter."""
    way_by_turn: float = 0.01
    """Meters a radian."""
    turn_by_way: float = 0.02
    """Radians a meter."""
    turn_by_turn: float = 0.03
    """Radians a radian."""
    last_turn_by_way: float = 0.005
    last_turn_by_turn: float = 0.01


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
    sideways_speed: float = 0.0
    """0 for a drive that cannot go sideways."""
    odometry: Odometry = Odometry()
    planner: str = "disc-search"
    """Name of an entry point in the group `trundle.planners`."""
    follower: str = "dynamic-window"
    """Name of an entry point in the group `trundle.followers`."""


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
    low: bool = False
    """It is lower than the lidar, which looks over it."""


@dataclass(frozen=True, slots=True)
class Clutter:
    """Things that people leave on the floor at random times and places, each for a while.

    `per_hour` is the mean number an hour within `hours` (daily spans, seconds since midnight; none for always),
    `stays_s` the mean of the exponential time each stays, `sides` the shortest and the longest side, `low` the share
    that is lower than the lidar, `moved` the share that somebody moves elsewhere in between.
    """

    per_hour: float
    stays_s: float = 600.0
    sides: tuple[float, float] = (0.3, 0.6)
    low: float = 0.0
    moved: float = 0.0
    hours: tuple[tuple[float, float], ...] = ()


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
    together: int = 1
    """How many of them walk side by side, as one group."""


@dataclass(frozen=True, slots=True)
class Bystander:
    """Somebody who stands still at a spot for a while, then walks off to a place. The times are those of a carton."""

    at: Point
    from_s: float = 0.0
    until_s: float | None = None
    when_near: float | None = None
    stays_s: float | None = None


@dataclass(frozen=True, slots=True)
class Crowd:
    """`count` people who come from the places around, gather round the robot, look at it, and walk off again.

    They come at `at_s` seconds since the run began, or, where `per_hour` is given, so many times an hour at random.
    They stay for `stays_s` seconds from when the first of them stands there.
    """

    count: int
    stays_s: float
    at_s: float | None = None
    per_hour: float | None = None


@dataclass(frozen=True, slots=True)
class AboutShare:
    """Of all the people, the share that is about during a daily span of hours, seconds since midnight."""

    start: float
    end: float
    share: float


class FaultKind(StrEnum):
    """What can be made to go wrong with the robot."""

    WHEELS_STUCK = "wheels stuck"
    SLIP = "slip"
    LIDAR_BLIND = "lidar blind"
    CARRIED = "carried"
    EMERGENCY_STOP = "emergency stop"
    SILENT = "silent"


@dataclass(frozen=True, slots=True)
class Fault:
    """Something goes wrong with the robot for `for_s` seconds: once at `at_s`, or `per_hour` times an hour at random.

    `slip` is the share of the way that the floor does not give. `to` is where the robot is carried; None for a spot
    somewhere on the floor, drawn at random.
    """

    kind: FaultKind
    for_s: float = 0.0
    at_s: float | None = None
    per_hour: float | None = None
    slip: float = 0.0
    to: Pose | None = None


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
    clutter: tuple[Clutter, ...] = ()
    missing: tuple[Solid, ...] = ()
    """Solids of the site that are not really there."""
    extra: tuple[Solid, ...] = ()
    """Solids that are really there and not on the map."""
    bystanders: tuple[Bystander, ...] = ()
    crowds: tuple[Crowd, ...] = ()
    about: tuple[AboutShare, ...] = ()
    """How many of the walkers are about at which hours; all of them at all others."""
    doors_shut_by_people: float = 0.0
    """Probability that somebody who walks through a door shuts it behind them. Whoever comes to it opens it again."""
    faults: tuple[Fault, ...] = ()
    battery: float = 1.0
    """What the battery holds when the run begins, as a fraction."""
