"""Long work in the background: what is asked for, who does it, and where its result is kept meanwhile.

The database is the queue. The service asks; workers take one piece after the other, each in a process of its
own that can be stopped. A result follows from a plan's file and decisions and can be made again, so that
nothing is lost with one.
"""
