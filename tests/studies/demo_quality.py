"""Check the quality of a finished run, such as that of ``decayinfer demo``.

    python tests/studies/demo_quality.py decayinfer-demo

Every posterior run that is called ok must have R-hat of at most 1.01, bulk ESS of at least 400, divergences of at most
0.5 % of its draws and evidences to 0.05; none may have failed; and the truths, where the input has them, must lie in
their 90 % intervals as often as they should (binomial tail probability above 1e-3).
"""

import sys
from pathlib import Path

from scipy.stats import binomtest

from decayinfer.results import read_run
from decayinfer.results.truths import coverage


def main(folder):
    run = read_run(Path(folder))
    channels = run.channels
    ok = channels[channels["status"] == "ok"]
    failed = channels[channels["status"] == "failed"]
    draws = 2 * 1000
    print(channels["status"].value_counts().to_string())
    print("ok runs: R-hat at most", ok["r_hat_max"].max(), "bulk ESS at least", ok["ess_bulk_min"].min())
    print(
        "divergences at most",
        ok["divergences"].max(),
        "ln evidence error at most",
        ok["ln_evidence_err"].max(),
    )
    assert failed.empty, failed[["object", "scenario", "channel", "reason"]].to_string()
    assert ok["r_hat_max"].max() <= 1.01
    assert ok["ess_bulk_min"].min() >= 400
    assert ok["divergences"].max() <= 0.005 * draws
    assert max(ok["ln_evidence_err"].max(), ok["ln_evidence_joint_err"].max()) <= 0.05
    covered = coverage(run)
    if covered is not None:
        print(covered.inside, "of", covered.total, "truths inside their 90 % intervals")
        assert binomtest(covered.inside, covered.total, 0.9).pvalue > 1e-3


if __name__ == "__main__":
    main(sys.argv[1])
