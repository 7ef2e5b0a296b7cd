"""An independent reference for the physics: a time-domain simulator that shares no code with the product.

It exists so that the product's figures are judged by something written from the circuit alone, on SciPy's
stiff integrator, and not by their own author's formulas.
"""
