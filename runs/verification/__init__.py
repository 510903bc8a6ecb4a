"""What ``verify`` does with one design of a run: a second physics path, scatter of tolerances, wrong assembly."""
