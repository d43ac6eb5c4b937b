"""Trials per second of vectorised NumPy on the cases of monte_carlo.rs, at its best chunk size; prints one number."""
import sys
import time

import numpy as np


def mass_calibration(generator, n):
    m = generator.normal(0.1, 50e-9, n)
    dm = generator.normal(1.234e-6, 20e-9, n)
    air = generator.uniform(1.1, 1.3, n)
    w = generator.uniform(7000.0, 9000.0, n)
    r = generator.uniform(7950.0, 8050.0, n)
    return (m + dm) * (1.0 + (air - 1.2) * (1.0 / w - 1.0 / r)) - 0.1


def arithmetic(generator, n):
    row = [generator.uniform(1.0 + 0.01 * i - 0.01, 1.0 + 0.01 * i + 0.01, n) for i in range(20)]
    for round_ in range(24):
        after = []
        for i in range(20):
            a, b = row[i], row[(i + 1) % 20]
            after.append(a * b if (round_ + i) % 4 == 0 else
                         a + b * 0.5 if (round_ + i) % 4 == 1 else
                         a / b if (round_ + i) % 4 == 2 else
                         a - b * 0.25)
        row = after
    return sum(row)


def main():
    model = {"mass_calibration": mass_calibration, "arithmetic": arithmetic}[sys.argv[1]]
    trials = 1 << 20
    best = 0.0
    for chunk in (512, 1024, 2048, 4096, 8192, 16384, 65536):
        generator = np.random.default_rng(1)
        for _ in range(2):
            start = time.perf_counter()
            for _ in range(trials // chunk):
                model(generator, chunk)
            best = max(best, trials / (time.perf_counter() - start))
    print(best)


main()
