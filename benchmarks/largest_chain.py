"""The steady state of a long driven chain, solved once to the end and recorded.

    python benchmarks/largest_chain.py [--sites 14] [--model xxz-driven] [--out FILE]

Writes time, peak memory, certificate, profile and current as one JSON document.
"""

from __future__ import annotations

import argparse
import json
import sys
import time
from pathlib import Path

from lbwork import load_model, steady_state
from lbwork.provenance import peak_memory, provenance


def main() -> None:
    """Solve, certify, record."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--sites", type=int, default=14)
    parser.add_argument("--model", default="xxz-driven")
    parser.add_argument("--out", type=Path, default=Path(__file__).with_name("largest-chain.json"))
    options = parser.parse_args()
    model = load_model(options.model, sites=options.sites)
    started = last = time.monotonic()

    def tell(words: str) -> None:
        nonlocal last
        now = time.monotonic()
        if now - last > 30:
            last = now
            sys.stderr.write(f"{now - started:7.0f} s  {words}\n")

    state = steady_state(model, tell=tell)
    found = state.to_dict()
    document = {
        "model": str(model),
        "identity": model.identity,
        "seconds": time.monotonic() - started,
        "peak_memory": peak_memory(),
        **{name: value for name, value in found.items() if name != "correlations"},
        "machine": provenance(),
    }
    options.out.write_text(json.dumps(document, indent=1) + "\n", encoding="utf-8")
    print(state)
    print(f"{document['seconds']:.0f} s, peak {document['peak_memory'] / 2**30:.2f} GiB")


if __name__ == "__main__":
    main()
