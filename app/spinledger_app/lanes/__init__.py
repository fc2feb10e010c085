"""The three lanes on one shift axis: mapping, folds, traces, trees, painting."""
