"""A second planner, slow and literal, that the tests hold against the real one."""
