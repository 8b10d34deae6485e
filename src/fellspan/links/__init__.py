"""Links: sites and radios over a PathProfile become a LinkResult.

`clearance.py` holds the one quantity of the house, need = surface + bulge(k) + fraction * F1. Knows nothing of study files,
pages or the command line.
"""
