"""Files in and out, knowing nothing of curves: guard, reading pass, and editing a package in place."""
