"""The tree of cylinders as one linear network, and the sweeps that solve it at every frequency.

A network has n nodes; node 0 is the root and edge i (for i > 0) joins node i to parent[i] < i. In Π form an
edge is one coupling admittance, and every admittance to ground belongs to a node. Blocks of frequencies are
the second axis of every array, so one numpy operation serves many points and frequencies at once.
"""
