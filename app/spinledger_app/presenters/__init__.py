"""One presenter a panel: project in, what to show out; no widgets here."""
