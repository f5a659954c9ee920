"""The cautions that every output carries, in one place so that no face says less than another."""

from __future__ import annotations

CAUTIONS: tuple[str, ...] = (
    "This is a planning aid. It gives no authority to change track, cant or speed: the railway's own "
    "standard, local codes and the approval of a competent, licensed engineer decide.",
    "The limits are those of the named limit set or table, as stated there. Compare them with the edition in "
    "force before anything is built on them.",
    "Cant alone does not permit a speed: signalling and braking distance, level crossings, structures, "
    "overhead line, turnouts, track quality and vehicle approval are not examined.",
    "Where cant comes down, reduce the speed before the track is changed; where it goes up, change the track "
    "before the speed. Clearances, platforms and overhead line move with the cant.",
    "Slow and standing freight trains, uneven loads and twist in the ramps can derail on canted curves of "
    "small radius; wind and shifting loads are not examined.",
    "Check rows that were not assessed, every assumption about units, and every exceptional value by hand.",
)

UNVERIFIED = (
    "UNVERIFIED LIMITS: these are typical values for trying things out, no railway's standard. "
    "Do not use the result for work on track."
)
