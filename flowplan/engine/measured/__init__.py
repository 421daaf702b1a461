"""Measured overlay: sums that stream, the linear fit, the nested variances, and the plan beside them.

Everything here works on arrays. Rows come in batches of whole wafers; of each batch only sums are kept,
so memory does not grow with the number of rows. Lengths are nm, positions mm, so the coefficients of the
fit come out in urad and ppm.
"""
