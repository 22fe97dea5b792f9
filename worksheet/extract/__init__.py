"""Device parameters from current-voltage data: reading curves, fitting, judging the fit.

The only home of scipy, imported inside functions, since only this command needs an optimiser.
"""
