"""Time of all validation schemes and the bootstrap against general-purpose calls, as ratios in one run.

    python tests/benchmarks/resampling.py

The reference does the same work by scikit-learn's ``cross_val_score`` with a polynomial pipeline and by a loop of
``numpy.polyfit`` over the draws. One process, one thread. Ratios are what to read; times depend on the machine.
"""

import os

for name in ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS"):
    os.environ[name] = "1"

import resource  # noqa: E402
import subprocess  # noqa: E402
import sys  # noqa: E402
import time  # noqa: E402
import warnings  # noqa: E402

import numpy as np  # noqa: E402

from fitlib.analysis.streams import draw_counts, permutations  # noqa: E402
from fitlib.numerics.bootstrap import bootstrap_errors  # noqa: E402
from fitlib.numerics.families.polynomial import Polynomials  # noqa: E402
from fitlib.numerics.validation import scheme_errors, shuffled_folds, summarise, unit_folds  # noqa: E402

DEGREES, FOLDS, REPEATS, DRAWS = 8, 5, 20, 2000


def observations(levels, series, seed=1):
    """An invented sensor: stimulus, response, level and series of each observation."""
    rng = np.random.default_rng(seed)
    level = np.tile(np.arange(levels), series)
    x = np.linspace(0, 10, levels)[level]
    return x, 4 + 1.6 * x - 0.02 * x**2 + rng.normal(0, 0.01, x.size), level, np.repeat(np.arange(series), levels)


def by_fitlib(x, y, level, series, degrees=DEGREES, draws=DRAWS, repeats=REPEATS):
    """All schemes for degrees 0 to ``degrees``."""
    ones, count = np.ones(x.size), int(level.max()) + 1
    family = Polynomials(x, range(degrees + 1), probes=False)
    problem, parameters = family.problem(x, y, ones), [member.parameters for member in family.members]
    schemes = [
        unit_folds(np.arange(x.size), [str(k) for k in range(x.size)]),
        unit_folds(level, [str(k) for k in range(count)]),
        unit_folds(series, [str(k) for k in range(int(series.max()) + 1)]),
        shuffled_folds(level, count, FOLDS, permutations(1, ("k_fold",), count, repeats)),
    ]
    losses = []
    for folds in schemes:
        squared = scheme_errors(problem, parameters, folds, ones, level).squared
        losses.append(summarise(squared, ones, level, count).loss)
    squared = bootstrap_errors(problem, parameters, draw_counts(1, ("bootstrap",), count, draws), level, level).squared
    return [*losses, summarise(squared, ones, level, count).loss]


def by_general_calls(x, y, level, series):
    """The same losses by scikit-learn and numpy."""
    from sklearn.linear_model import LinearRegression
    from sklearn.model_selection import LeaveOneGroupOut, LeaveOneOut, PredefinedSplit, cross_val_score
    from sklearn.pipeline import make_pipeline
    from sklearn.preprocessing import PolynomialFeatures

    table, count = x[:, None] / 10, int(level.max()) + 1
    splits = [(LeaveOneOut(), None), (LeaveOneGroupOut(), level), (LeaveOneGroupOut(), series)]
    for order in permutations(1, ("k_fold",), count, REPEATS):
        place = np.empty(count, dtype=int)
        place[order] = np.arange(count) % FOLDS
        splits.append((PredefinedSplit(place[level]), None))
    for degree in range(DEGREES + 1):
        pipeline = make_pipeline(PolynomialFeatures(degree), LinearRegression(fit_intercept=False))
        for split, groups in splits:
            cross_val_score(pipeline, table, y, cv=split, groups=groups, scoring="neg_mean_squared_error")
    for (counts,) in [list(draw_counts(1, ("bootstrap",), count, DRAWS))]:
        for draw in counts:
            weights = draw[level]
            drawn = weights > 0
            for degree in range(DEGREES + 1):
                fit = np.polyfit(x[drawn], y[drawn], degree, w=np.sqrt(weights[drawn]))
                np.sum((y[~drawn] - np.polyval(fit, x[~drawn])) ** 2)


def seconds(function, *arguments, times=5, **keywords):
    """Shortest time of some calls."""
    best = np.inf
    for _ in range(times):
        start = time.perf_counter()
        function(*arguments, **keywords)
        best = min(best, time.perf_counter() - start)
    return best


def growth(title, sizes, times):
    """Time against size, with the ratio of growth to that of the size (1 is linear)."""
    print(f"\n{title}")
    for k, (size, value) in enumerate(zip(sizes, times, strict=True)):
        note = "" if not k else f"  growth / growth of size {value / times[k - 1] / (size / sizes[k - 1]):.2f}"
        print(f"  {size:>8}  {value * 1e3:10.1f} ms{note}")


def peak_of(levels, series, draws):
    """Peak memory in MB of one bootstrap in a process of its own."""
    code = (
        "import sys; sys.path.insert(0, sys.argv[1]); import resampling, resource, numpy;"
        "print(resampling.bootstrap_peak(*map(int, sys.argv[2:])))"
    )
    place = os.path.dirname(os.path.abspath(__file__))
    command = [sys.executable, "-c", code, place, str(levels), str(series), str(draws)]
    return float(subprocess.run(command, capture_output=True, text=True, check=True).stdout)


def bootstrap_peak(levels, series, draws):
    """Peak memory in MB after leave-one-out and a bootstrap by level."""
    by_fitlib(*observations(levels, series), draws=draws, repeats=1)
    return resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024


def main():
    """Print everything."""
    warnings.simplefilter("ignore")
    data = observations(11, 3)
    by_fitlib(*data)
    ours, theirs = seconds(by_fitlib, *data, times=20), seconds(by_general_calls, *data, times=2)
    print("33 observations (11 levels x 3 series), degrees 0 to 8; leave-one-out, leave-one-level-out,")
    print("leave-one-series-out, 20 x 5-fold, 2000 bootstrap draws; one thread:")
    print(f"  general-purpose calls {theirs:.3f} s, fitlib {ours * 1e3:.1f} ms: ratio {theirs / ours:.0f}")
    shapes = [(11, 3), (100, 3), (100, 33), (333, 100), (1000, 100)]
    draws = 40
    times = [seconds(by_fitlib, *observations(*shape), draws=draws, repeats=1, times=2) for shape in shapes]
    growth(f"time against observations ({draws} draws)", [a * b for a, b in shapes], times)
    sizes = [500, 2000, 8000]
    growth("time against draws (33 observations)", sizes, [seconds(by_fitlib, *data, draws=n) for n in sizes])
    sizes = [2, 4, 8]
    large = observations(40, 3)
    growth("time against degrees (120 observations)", sizes, [seconds(by_fitlib, *large, degrees=n) for n in sizes])
    if "--memory" in sys.argv:
        print(f"\npeak memory, 100 000 observations, 2000 draws: {peak_of(1000, 100, 2000):.0f} MB")


if __name__ == "__main__":
    main()
