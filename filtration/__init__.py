"""Particle filters and vapour cartridges: physics, face seal, loading, protection, schedules.

Pure functions over numpy arrays in SI units; names end in their unit and everything broadcasts.
Decision aid only: a model cannot approve a filter, replace a fit test, or override the approval of
the equipment, the local code or the judgement of a qualified person. Where an input is missing the
answer is "not known", never a pass.
"""
