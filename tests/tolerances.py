"""The one tolerance policy: relative, by what limits the comparison. No test invents its own."""

ROUND_OFF = 1e-13  # closed forms in double precision, a few operations
ALGEBRA = 1e-10  # linear algebra of well-conditioned systems, against a dense inverse
EXACT = 1e-9  # a whole answer at the default tolerance of the frequency integral
IDENTITY = 1e-8  # a whole answer for a real cell, against another route with its own rounding
TYPED = 5e-12  # published values typed in with 12 digits
REFINED = 1e-6  # what division of tapers and driving forces is carried to
COMPARTMENTS = 1e-5  # extrapolated finite volumes
ELEMENTS = 1e-7  # finite elements on a fine mesh
HOSTILE_ROUND_OFF = 1e-9  # answers to spoiled input, whose values may span many decades
HOSTILE_PEAK = 1e-6  # height of a kernel's peak, found by search
NEXT_ORDER = 5e-3  # a change by the next order, whose local terms are taken at the ends of short pieces
BENT_PATH = 2e-7  # spectra known at few frequencies, transformed along a bent path
SINGLE = 1e-6  # numbers kept in single precision, as in a report
ROUNDED = 3e-5  # curves of a report, whose values and frequencies are kept with six digits
LOGARITHMIC = 6e-4  # spectra of points in a report, kept in steps of their logarithm
FIVE_DIGITS, FOUR_DIGITS = 1e-4, 1e-3  # numbers as a report writes them
SPLIT_RATES = 1e-5  # equal rates of a kernel moved apart a little
ON_A_PATH = 1e-4  # impedances from a bent path, and what is extrapolated from them
