"""A rotor of 60 degrees of freedom over 200 speeds against as many plain eigenproblems.

Run: python -m tests.bench.speed_map
"""

import statistics
import time

import numpy as np
from scipy.linalg import eig
from threadpoolctl import threadpool_limits

from service.compute.damped_system import Damping
from service.compute.speed_map import follow, turning

MOTIONS, SPEEDS, ROUNDS = 60, 200, 3


def main() -> None:
    """Print the ratio."""
    random = np.random.default_rng(3)
    values = np.sort(random.uniform(20.0, 4000.0, MOTIONS)) ** 2
    C = random.standard_normal((MOTIONS, MOTIONS))
    C = C @ C.T * 0.4
    G = random.standard_normal((MOTIONS, MOTIONS)) * 0.15
    damping = Damping(C, 0.0 * C, G - G.T)
    problem = turning(values, np.eye(MOTIONS), damping, 0.0)
    speeds = np.linspace(0.0, 6000.0, SPEEDS)
    ours, plain, halvings = [], [], []
    with threadpool_limits(1):
        for _ in range(ROUNDS):
            start = time.perf_counter()
            found = follow(problem, speeds, 12)
            middle = time.perf_counter()
            roots = [eig(problem.matrix(float(rpm)))[0] for rpm in speeds]
            plain.append(time.perf_counter() - middle)
            ours.append(middle - start)
            halvings.append(found.halvings)
            nearest = np.abs(found.roots[-1][:, None] - roots[-1]).min(axis=1)
            if nearest.max() > 1e-8 * np.abs(found.roots[-1]).max():
                raise RuntimeError("the two don't agree")
    ratio = statistics.median(ours) / statistics.median(plain)
    print(
        f"{MOTIONS} degrees of freedom over {SPEEDS} speeds: {statistics.median(ours):.2f} s, "
        f"{ratio:.2f} x the bare eigenproblems ({max(halvings)} speeds added)"
    )


if __name__ == "__main__":
    main()
