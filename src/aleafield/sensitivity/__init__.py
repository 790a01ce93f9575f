"""Which input causes it: indices of sensitivity with intervals, on plain arrays.

First-order indices come from the samples at hand (`given_data`), first, total and second ones from designs that
exchange inputs (`exchange`), those of dependent inputs are Shapley effects (`shapley`); many inputs are screened
first (`screening`).  `next_measurement` turns them into what to measure next.
"""
