"""The course: file, track, repair, grid, bends and pieces."""

from pacing.course.course import (
    Bend,
    Course,
    CourseReport,
    CourseSpec,
    Landmark,
    Repair,
    SlowPoint,
)
from pacing.course.load import load_course

__all__ = [
    "Bend",
    "Course",
    "CourseReport",
    "CourseSpec",
    "Landmark",
    "Repair",
    "SlowPoint",
    "load_course",
]
