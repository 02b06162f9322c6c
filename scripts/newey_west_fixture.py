"""Makes fixtures/reference/uptake/newey_west.toml: slopes with Newey-West standard errors by statsmodels.

Run with numpy and statsmodels installed:

    python3 scripts/newey_west_fixture.py > fixtures/reference/uptake/newey_west.toml

The series are made here from a fixed seed and printed with the digits that are used. Bartlett's weights 1 - l/S are
handed to statsmodels' own sandwich; the automatic bandwidth S is Andrews' (Econometrica 59 (1991) 817, eq. 6.2 and
6.4) for a first-order autoregression of the scores, computed here with numpy. statsmodels' maxlags = m is S = m + 1.
"""

import numpy as np
import statsmodels
import statsmodels.api as sm
from statsmodels.stats import sandwich_covariance as sandwich

SERIES = [("white", 60, 0.0, 0.002), ("like", 120, 0.8, 0.002), ("alternating", 80, -0.5, 0.003)]


def series(rng, n, rho, sd):
    noise = np.empty(n)
    noise[0] = rng.normal()
    for i in range(1, n):
        noise[i] = rho * noise[i - 1] + np.sqrt(1 - rho**2) * rng.normal()
    t = np.arange(n) * 5.0 / 60.0
    return t, np.round(0.75 - 0.006 * t + sd * noise, 5)


def andrews(scores):
    rho = scores[1:] @ scores[:-1] / (scores[:-1] @ scores[:-1])
    alpha = 4 * rho**2 / ((1 - rho) ** 2 * (1 + rho) ** 2)
    return max(1.0, 1.1447 * np.cbrt(alpha * len(scores)))


def standard_error(fit, bandwidth):
    lags = max(int(np.ceil(bandwidth)) - 1, 0)
    weights = 1 - np.arange(lags + 1) / bandwidth
    cov = sandwich.cov_hac_simple(fit, nlags=lags, weights_func=lambda _: weights, use_correction=True)
    return np.sqrt(cov[1, 1])


def main():
    rng = np.random.default_rng(20261120)
    print("[source]")
    print(f'document = "statsmodels {statsmodels.__version__}, OLS and cov_hac_simple with use_correction"')
    print('edition = "as installed"')
    print('place = "scripts/newey_west_fixture.py makes the series and the figures"')
    print('digits = "computed, 13 digits"')
    print('remark = "Compared to 1e-9 relative: what two ways of summing in double precision keep."')
    for name, n, rho, sd in SERIES:
        t, y = series(rng, n, rho, sd)
        fit = sm.OLS(y, sm.add_constant(t)).fit()
        automatic = andrews((t - t.mean()) * fit.resid)
        three = fit.get_robustcov_results("HAC", maxlags=3, use_correction=True).bse[1]
        assert abs(three / standard_error(fit, 4.0) - 1) < 1e-12
        print(f"\n[{name}]")
        print("y = [" + ", ".join(f"{v:.5f}" for v in y) + "]")
        for key, value in [
            ("slope", fit.params[1]),
            ("ordinary", fit.bse[1]),
            ("three_lags", three),
            ("bandwidth", automatic),
            ("automatic", standard_error(fit, automatic)),
        ]:
            print(f'{key} = "{value:.12e}"')


if __name__ == "__main__":
    main()
