"""Claims against evidence: match, refine, judge, contenders, advice."""
