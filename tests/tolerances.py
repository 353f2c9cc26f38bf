"""The one tolerance policy: relative, by what limits the comparison. No test invents its own."""

ROUND_OFF = 1e-13  # closed forms in double precision, a few operations
ALGEBRA = 1e-10  # linear algebra of well-conditioned systems, against a dense inverse
EXACT = 1e-9  # a whole answer at the default tolerance of the frequency integral
IDENTITY = 1e-8  # a whole answer for a real cell, against another route with its own rounding
TYPED = 5e-12  # published values typed in with 12 digits
REFINED = 1e-6  # what division of tapers and driving forces is carried to
COMPARTMENTS = 1e-5  # extrapolated finite volumes
ELEMENTS = 1e-7  # finite elements on a fine mesh
