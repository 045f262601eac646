"""Compares freshly made reference results with the committed ones: python compare.py COMMITTED.json FRESH.json

Numbers may differ by 1e-8 of their own size, or of the greatest number of the list they stand in (a step response starts at
zero), or of the step's extreme (a final value may be what two large ones leave); another processor's rounding moves them by far
less.  Everything else must be the same.
"""

import json
import sys

RELATIVE = 1e-8


def is_number(value):
    return isinstance(value, (int, float)) and not isinstance(value, bool)


def differences(old, new, place="", scale=0.0):
    if is_number(old) and is_number(new):
        if abs(old - new) > RELATIVE * max(abs(old), abs(new), scale):
            yield f"{place}: {old} became {new}"
    elif isinstance(old, dict) and isinstance(new, dict) and old.keys() == new.keys():
        extreme = old.get("deviation_v", 0.0)
        for key in old:
            own = abs(extreme) if key.endswith("_v") else 0.0
            yield from differences(old[key], new[key], f"{place}/{key}", own)
    elif isinstance(old, list) and isinstance(new, list) and len(old) == len(new):
        own = max((abs(item) for item in old if is_number(item)), default=0.0)
        for k, (one, other) in enumerate(zip(old, new)):
            yield from differences(one, other, f"{place}/{k}", own)
    elif old != new:
        yield f"{place}: {str(old)[:80]} became {str(new)[:80]}"


def main():
    with open(sys.argv[1], encoding="utf-8") as file:
        old = json.load(file)
    with open(sys.argv[2], encoding="utf-8") as file:
        new = json.load(file)
    found = list(differences(old, new))
    for line in found[:20]:
        print(line)
    if found:
        print(f"{len(found)} differences between {sys.argv[1]} and a fresh calculation")
        sys.exit(1)


if __name__ == "__main__":
    main()
