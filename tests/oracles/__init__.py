"""Slow, plain, independent programs that the tests hold the project against.

Nothing here imports `cable` or `morphology`. One idea a file:

    plain             a cell as a list of cylinders and spheres; inputs as filtered Poisson events
    dense             nodal matrices by naive loops; one cylinder by 40-digit quadrature
    dense_sources     what each cylinder contributes to each voltage, by dense matrices
    cut_cells         a whole cell with zones, tapers and driving forces by dense matrices
    compartments      finite volumes and a Lyapunov equation
    finite_elements   impedance by a general finite-element library, tapering pieces included
    cone              a tapering piece by modified Bessel functions
    laplace_identity  covariances as differences of impedances at real Laplace frequencies
    shot_noise        one isopotential cell (Campbell, Rice)
    infinite_cable    white and Poisson noise on uniform cables
    worked            worked examples to 25 digits (`worked_distal`: one by quadrature)
    worked_typed      their values typed to 12 digits, and their cells

Units: um, ms, mV, nS, pF, pA, GOhm = 1/nS, fC = pA ms. Transforms use e^{+i omega t}, omega in rad/ms.
Voltages are deviations from rest.
"""
