"""Preferred values of IEC 60063, E3 to E192, from the package eseries.

    python preferred.py OUTPUT.json
"""

import sys

import eseries

from output import write


def main():
    series = {}
    for key in eseries.ESeries:
        values = [int(value) for value in eseries.series(key)]
        scale = 10 if values[0] == 10 else 100
        series[f"E{len(values)}"] = [value / scale for value in values]
    write({"about": "made by tests/reference/preferred.py from eseries", "series": series}, sys.argv[1])


if __name__ == "__main__":
    main()
