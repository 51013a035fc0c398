"""Exposure statistics: from air sample results of one similar exposure group to a hazard ratio.

Results are taken as lognormal, with limits of detection where there are any. Everything works on
many groups at once (see `pack.Batch`), in the caller's unit, and answers NaN with a status where
a figure does not exist: one bad group never stops the others and never yields a silent number.

A decision aid: it does not replace the judgement of a qualified occupational hygienist, the local
regulation or the analytical laboratory.

Modules: `pack` (groups as arrays), `lognormal` and `goodness` (complete data), `likelihood`,
`censored` and `positions` (results below detection), `bayes` (posterior of the 95th percentile),
`decisions` (what enters the hazard ratio), `sampling`, `units`, `limits`, `variance`, `series`.
"""
