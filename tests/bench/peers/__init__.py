"""General-purpose ODE libraries at their best honest settings, on circular restricted three-body propagation.

Equations, state (x, y, z, vx, vy, vz) in the rotating frame, larger primary at (-mu, 0, 0):

    x'' = 2 y' + x - a (x + mu) - b (x - (1 - mu)),   a = (1 - mu) / r1^3,  b = mu / r2^3
    y'' = -2 x' + (1 - a - b) y
    z'' = -(a + b) z
"""
