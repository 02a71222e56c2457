"""What the compiled kernel is worth: tables of medians, ours beside scipy as a user writes it.

    uv run python tests/benchmarks/kernel_tables.py [--quick]

Nothing is asserted: machines differ, ratios less so. docs/performance.md explains the tables.
"""

import argparse
import gc
import warnings

import numpy as np
import sheets
from kernel_batches import batches
from kernel_book import book
from kernel_floor import floor
from kernel_single import reference_solvers, single_tanks, single_tubes
from kernel_starts import starts
from measure import HEAD

from moletally.kernel.engine import engine_name


def main(quick: bool) -> None:
    """Print the tables."""
    print(f"Kernel: {engine_name()}; numpy {np.__version__}\n\n{HEAD}")
    seconds = 0.05 if quick else 1.5
    single_tanks(seconds)
    tolerances = single_tubes(seconds)
    batches(tolerances["P1"], seconds, 200 if quick else 10_000, 20 if quick else 1_000)
    starts(3 if quick else 21)
    book(60 if quick else 10_000, 1 if quick else 3)
    reference_solvers(tolerances, seconds)
    floor(seconds)
    print()
    gc.set_threshold(200_000, 50, 100)  # as the command does
    sheets.book(100 if quick else 10_000)


if __name__ == "__main__":
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--quick", action="store_true", help="small sizes, to see that it runs")
    # scipy announces what it does not like in warnings; what came of it stands in the remarks.
    warnings.simplefilter("ignore")
    np.seterr(all="ignore")
    main(parser.parse_args().quick)
