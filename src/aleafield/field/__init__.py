"""The continuous statement: kernels, firing rates, drive, initial state and the field equation.

No mesh and no step is known here.  Every number of the model is a `Parameter`: a float, an expression of the
study's parameters, or a law.  Binding a batch of inputs turns each into a float (the same for all samples)
or an array of shape (S,).
"""
