# %% [markdown]
# # The lever of a sluice gear, step by step
#
# Every `# %%` begins a cell: editors and notebook tools run them one after the other, and so does plain Python.
# All sizes in mm, forces in N; every number is invented.

# %%
import torsionfe as tf

# %% [markdown]
# ## The section
# A stubby angle. Without its root fillet the stress in the corner would have no limit, and the result says so.

# %%
sharp = tf.solve_torsion(tf.shapes.angle(62.0, 46.0, 13.0))
print(sharp)

# %%
lever = tf.shapes.angle(62.0, 46.0, 13.0, root_radius=7.0, toe_radius=4.0)
lever.plot(unit="mm")

# %% [markdown]
# ## Torsion constant and peak stress
# The torsion constant lies between two proven bounds; the peak stress has an estimated error.

# %%
solution = tf.solve_torsion(lever, rel_tol=1e-4)
print(solution)
solution.plot(torque=260e3, unit="mm", stress_unit="MPa")

# %% [markdown]
# ## By hand
# Two thin rectangles: too soft by a sixth, and the peak stress is a fifth too low, since plates have no fillet.

# %%
hand = tf.plate_sum(lever.plates())
print(hand)
print(f"J by hand / J = {hand.torsion_constant_twist / solution.torsion_constant.value:.3f}")
print(f"peak by hand / peak = {solution.section_modulus / hand.section_modulus:.3f}")

# %% [markdown]
# ## The bar
# Each margin is taken at the unfavourable end of what is not known exactly.

# %%
bar = tf.Bar(solution, length=250.0, shear_modulus=40e3, name="lever")
bronze = tf.Allowables.from_tension(190.0, 330.0, criterion="von Mises", twist=0.052)
print(bar)
print(bar.margins([tf.TorqueCase("lifting", 260e3), tf.TorqueCase("jammed", 340e3, 1.1, 1.25)], bronze))

# %%
print(tf.plastic_torque(lever, shear_yield=bronze.shear_yield, solution=solution))
