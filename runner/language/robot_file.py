"""Robot files: outline, speeds and battery; the rest is read in `senses` and `driving`. The format is in FILES.md."""

from __future__ import annotations

from runner.language.driving import DRIVING_KEYS, parse_part, read_odometry, read_sideways_speed
from runner.language.fields import Fields, Keys, mapping
from runner.language.geometry import Coordinates, polygon_area, read_coordinates, read_points
from runner.language.nodes import Scalar
from runner.language.pages import Page
from runner.language.phrases import parse_size
from runner.language.quantities import (
    ACCELERATION,
    ENERGY,
    LENGTH,
    POWER,
    SHARE,
    SPEED,
    TURN_ACCELERATION,
    TURN_SPEED,
    Amount,
)
from runner.language.senses import parse_unseen_space, read_filters, read_lidar, read_posts, read_sweep
from runner.site.values import Battery, Point, RobotDescription, UnseenSpace

SIDE = Amount("A side of the footprint", LENGTH, "10 cm", "3 m")
MOST_FROM_CENTER = 3.0  # meters
ROBOT_KEYS: Keys = {
    "robot": "Small cart",
    "coordinates": "in meters",
    "footprint": "60 cm x 44 cm",
    "speed": "0.8 m/s",
    "reverse speed": "0.2 m/s",
    "acceleration": "0.6 m/s2",
    "turn speed": "80 deg/s",
    "turn acceleration": "160 deg/s2",
    "lidar": "{field of view: 270 deg, beams: 180, range: 12 m, rate: 8 Hz, noise: 1.5 cm}",
    "battery": "{capacity: 240 Wh, idle: 22 W, driving: 85 W, charging: 300 W}",
    "posts": "[{at: [25 cm, 20 cm], thickness: 3 cm}]",
    "sweep": "{field of view: 90 deg, columns: 60, range: 3.5 m, period: 2 s}",
    "filters": "{shadow points: off}",
    "unseen space": "keep out",
    **DRIVING_KEYS,
}
BATTERY_KEYS: Keys = {
    "capacity": "240 Wh",
    "idle": "22 W",
    "driving": "85 W",
    "charging": "300 W",
    "full power until": "80 %",
}
TAPERS = Amount("What the battery takes full power up to", SHARE, "10 %", "100 %")

NO_BATTERY = Battery(0.0, 0.0, 0.0, 0.0)


def read_robot_page(page: Page) -> RobotDescription | None:
    """The robot of a page; None, or one that must not be used, after a report."""
    if page.root is None:
        return None
    fields = Fields(page, page.root, "a robot", ROBOT_KEYS)
    coordinates = read_coordinates(fields)
    return RobotDescription(
        name=fields.name("robot"),
        footprint=_read_footprint(fields, coordinates),
        speed=fields.number("speed", Amount("The speed", SPEED, "0.05 m/s", "3 m/s")),
        reverse_speed=fields.number("reverse speed", Amount("The reverse speed", SPEED, "0.01 m/s", "3 m/s")),
        acceleration=fields.number("acceleration", Amount("The acceleration", ACCELERATION, "0.05 m/s2", "5 m/s2")),
        turn_speed=fields.number("turn speed", Amount("The turn speed", TURN_SPEED, "5 deg/s", "360 deg/s")),
        turn_acceleration=fields.number(
            "turn acceleration", Amount("The turn acceleration", TURN_ACCELERATION, "5 deg/s2", "2000 deg/s2")
        ),
        lidar=read_lidar(fields),
        battery=_read_battery(fields),
        posts=read_posts(fields, coordinates),
        sweep=read_sweep(fields),
        filters=read_filters(fields),
        unseen_space=fields.phrase("unseen space", parse_unseen_space, UnseenSpace.KEEP_OUT),
        sideways_speed=read_sideways_speed(fields),
        odometry=read_odometry(fields),
        planner=fields.phrase("planner", parse_part, "disc-search"),
        follower=fields.phrase("follower", parse_part, "dynamic-window"),
    )


def _read_footprint(fields: Fields, coordinates: Coordinates) -> tuple[Point, ...]:
    node = fields.need("footprint")
    if node is None:
        return ()
    page = fields.page
    if isinstance(node, Scalar):
        length, width = page.phrase(
            node, lambda text: parse_size(text, SIDE), (1.0, 1.0), "a footprint", ROBOT_KEYS["footprint"]
        )
        x, y = length / 2.0, width / 2.0
        return (x, y), (-x, y), (-x, -y), (x, -y)
    corners = read_points(page, node, coordinates, 3, "a footprint")
    if corners and polygon_area(corners) < 0.01:
        page.report(node, "This footprint encloses next to nothing.", "List its corners in order, around the robot.")
    if any(abs(x) > MOST_FROM_CENTER or abs(y) > MOST_FROM_CENTER for x, y in corners):
        sentence = f"A corner of this footprint is over {MOST_FROM_CENTER:.0f} m from the turning center."
        page.report(node, sentence, "Check the unit: is it in meters?")
    return corners


def _read_battery(fields: Fields) -> Battery:
    node = fields.need("battery")
    body = None if node is None else mapping(fields.page, node, '"battery"', ROBOT_KEYS["battery"])
    if body is None:
        return NO_BATTERY
    inner = Fields(fields.page, body, "a battery", BATTERY_KEYS)
    return Battery(
        capacity=inner.number("capacity", Amount("The capacity", ENERGY, "5 Wh", "100 kWh")),
        idle=inner.number("idle", Amount("The draw at rest", POWER, "0 W", "5 kW")),
        driving=inner.number("driving", Amount("The draw while driving", POWER, "1 W", "20 kW")),
        charging=inner.number("charging", Amount("The charging power", POWER, "1 W", "50 kW")),
        tapers_from=inner.number_or("full power until", TAPERS, NO_BATTERY.tapers_from),
    )
