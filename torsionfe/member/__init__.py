"""The bar: twist, stiffness, allowables and margins, plastic torque, restrained warping, torsional buckling."""
