"""The physics of cant: pure functions of arrays, knowing nothing of files, limits or plans."""
