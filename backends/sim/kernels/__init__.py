"""The arithmetic of the simulator, compiled: numbers and arrays in, numbers out, no state of their own.

Lengths are meters, angles radians, times seconds, in the frame of the site. Rasters are indexed (row, column) as in
`runner.site.floor`. One file a topic; a kernel that calls one of another file names that file to the compiler, so
that a change there is noticed.
"""
