"""Speed and memory as ratios measured in one run; `python -m pytest benchmarks` prints them."""
