"""Closed loops for the reference: transformers, two inductors, four switches, interleaved phases.

    python topologies.py OUTPUT.json
"""

import sys

from controlled_results import result
from output import write
from topology_designs import BRIDGED, INDUCTIVE


def main():
    write({
        "about": "made by tests/reference/topologies.py; complex values as [real, imaginary]; nominal input and load; conditions: input "
                 "least, nominal, greatest, and for each the load likewise; switched: against the exact switched stage",
        "designs": [result(design, frequencies=25) for design in [*INDUCTIVE, *BRIDGED]],
    }, sys.argv[1])


if __name__ == "__main__":
    main()
