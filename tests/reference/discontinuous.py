"""Closed loops for the reference: discontinuous conduction.

    python discontinuous.py OUTPUT.json
"""

import sys

from controlled_designs import DISCONTINUOUS
from controlled_results import result
from output import write


def main():
    write({
        "about": "made by tests/reference/discontinuous.py; complex values as [real, imaginary]; nominal input and load; conditions: input "
                 "least, nominal, greatest, and for each the load likewise; switched: against the exact switched stage",
        "designs": [result(design) for design in DISCONTINUOUS],
    }, sys.argv[1])


if __name__ == "__main__":
    main()
